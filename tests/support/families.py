"""Small ensembles of every family, regions to read on them, and the largest ones that a test can afford."""

import random
from typing import Any

from sweepmill.ensemble import Ensemble

Region = tuple[int, ...]

_SMALL: list[tuple[str, dict[str, Any]]] = [
    *(
        ("hybrid-clifford", {"sites": sites, "measurement_rate": 0.2, "boundary": boundary, "initial_state": state})
        for sites, boundary in ((2, "open"), (5, "open"), (6, "periodic"))
        for state in ("zeros", "mixed")
    ),
    ("hybrid-clifford", {"sites": 8, "measurement_rate": 0.3, "references": 1}),
    ("hybrid-clifford", {"sites": 6, "measurement_rate": 0.1, "references": 6, "scrambling_layers": 5}),
    (
        "hybrid-clifford",
        {"sites": 5, "measurement_rate": 0.2, "boundary": "open", "references": 2, "initial_state": "mixed"},
    ),
    ("hybrid-clifford-square", {"width": 4, "height": 2, "measurement_rate": 0.3}),
    ("hybrid-clifford-square", {"width": 3, "height": 3, "measurement_rate": 0.2, "boundary": "open"}),
    ("hybrid-clifford-square", {"width": 2, "height": 4, "measurement_rate": 0.3, "initial_state": "mixed"}),
    *(
        (
            "hybrid-clifford-long-range",
            {"sites": 10, "exponent": exponent, "measurement_rate": 0.25, "boundary": boundary},
        )
        for exponent in (0, 1.5, 3)
        for boundary in ("periodic", "open")
    ),
    ("hybrid-clifford-long-range", {"sites": 8, "exponent": 2, "measurement_rate": 0.2, "initial_state": "mixed"}),
    *(("edge-bath", {"sites": sites}) for sites in (2, 7, 12)),
    *(("rotated-clifford", {"sites": 10, "ends": ends}) for ends in ("open", "product", "ring")),
    *(("projective-ising", {"sites": 8, "bond_rate": 0.5, "boundary": b}) for b in ("periodic", "open")),
    ("projective-ising", {"sites": 5, "bond_rate": 0.3}),
]
SMALL = [Ensemble.of(family, layers=9, **parameters) for family, parameters in _SMALL]
_LARGE: list[tuple[str, dict[str, Any]]] = [
    (
        "hybrid-clifford",
        {"sites": 70, "measurement_rate": 0.12, "references": 20, "scrambling_layers": 6, "layers": 12},
    ),
    ("hybrid-clifford-square", {"width": 8, "height": 16, "measurement_rate": 0.2, "layers": 8}),
    ("hybrid-clifford-long-range", {"sites": 100, "exponent": 2.5, "measurement_rate": 0.2, "layers": 10}),
    ("edge-bath", {"sites": 60, "layers": 30}),
    ("rotated-clifford", {"sites": 80, "ends": "open", "layers": 12}),
    ("rotated-clifford", {"sites": 40, "ends": "product", "layers": 20}),
    ("rotated-clifford", {"sites": 40, "ends": "ring", "layers": 9}),
    ("projective-ising", {"sites": 130, "bond_rate": 0.5, "layers": 20}),
]
LARGE = [Ensemble.of(family, **parameters) for family, parameters in _LARGE]


def label(ensemble: Ensemble) -> str:
    """A name for a test."""
    form = ensemble.normal_form().items()
    values = [str(value) for name, value in form if name not in ("family", "revision") and not isinstance(value, list)]
    return "-".join([ensemble.family, *values])


def regions_of(sites: int, total: int, seed: int) -> list[Region]:
    """Cuts, everything with and without references, references alone, arcs of the ring, arbitrary sets."""
    draw = random.Random(seed)
    step = max(1, sites // 8)
    cuts = [tuple(range(x)) for x in [*range(0, sites, step), sites, total]] + [tuple(range(sites, total))]
    arcs = [
        tuple(sorted((first + i) % sites for i in range(draw.randint(1, sites))))
        for first in (draw.randrange(sites) for _ in range(4))
    ]
    sets = [tuple(sorted(draw.sample(range(total), draw.randint(1, total)))) for _ in range(6)]
    return [*dict.fromkeys([*cuts, *arcs, *sets])]
