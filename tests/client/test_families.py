"""The families of the catalogue: fields, axes, ensembles."""

import json
from typing import Any

import pytest

from support.circuits import REST, ensembles, faults, specification
from sweepmill.ensemble import FAMILY_PARAMETERS, Ensemble
from sweepmill.identity import canonical
from sweepmill.revisions import FAMILY_REVISIONS
from sweepmill.sweep import Sweep

BLOCKS: dict[str, dict[str, Any]] = {
    "hybrid-clifford": {"sites": 8, "measurement_rate": 0.1},
    "hybrid-clifford-square": {"width": 4, "measurement_rate": 0.1},
    "hybrid-clifford-long-range": {"sites": 8, "exponent": 1.5, "measurement_rate": 0.1},
    "projective-ising": {"sites": 9, "bond_rate": 0.4},
    "edge-bath": {"sites": 7},
    "rotated-clifford": {"sites": 8, "layers": 5},
    "layered": {"sites": 8, "repeat": [[{"measure": "Z", "on": "sites"}]]},
}


def block(family: str, **changes: Any) -> dict[str, Any]:
    return specification(**{"family": family, **BLOCKS[family], **changes})


def test_every_family_has_a_model_parameters_and_a_revision() -> None:
    assert BLOCKS.keys() == FAMILY_PARAMETERS.keys() == FAMILY_REVISIONS.keys()


@pytest.mark.parametrize("family", BLOCKS)
def test_an_ensemble_is_restored_from_its_normal_form(family: str) -> None:
    for ensemble in ensembles(block(family, replicate=[0, 3], engine=["auto", "reference"])):
        again = Ensemble.from_normal_form(json.loads(canonical(ensemble.normal_form())))
        assert (again, again.key, again.shape) == (ensemble, ensemble.key, ensemble.shape)


@pytest.mark.parametrize("family", BLOCKS)
def test_the_normal_form_is_a_specification_of_the_same_sweep(family: str) -> None:
    sweep = Sweep.parse(block(family, replicate=[0, 3]))
    again = Sweep.parse(json.loads(sweep.canonical()))
    assert again.canonical() == sweep.canonical()
    assert [p.ensemble for p in again.points] == [p.ensemble for p in sweep.points]


@pytest.mark.parametrize("family", BLOCKS)
def test_defaults_do_not_change_the_key(family: str) -> None:
    (plain,) = ensembles(block(family))
    defaults = {
        name: value
        for name, value in FAMILY_PARAMETERS[family].items()
        if value not in (None, ()) and name not in BLOCKS[family]
    }
    (spelled,) = ensembles(block(family, **defaults))
    assert spelled.key == plain.key
    assert set(plain.normal_form()) >= {"family", "revision"}
    assert not set(plain.normal_form()) & defaults.keys()


@pytest.mark.parametrize("family", BLOCKS)
def test_every_scalar_field_may_be_an_axis(family: str) -> None:
    values = {"sites": [8, 16], "width": [4, 8], "layers": [4, 6], "replicate": [0, 1], "engine": ["auto", "reference"]}
    values |= {"measurement_rate": {"from": 0.1, "to": 0.3, "step": 0.1}, "bond_rate": [0, 1], "exponent": [0, 2.5]}
    values |= {
        "boundary": ["periodic", "open"],
        "initial_state": ["zeros", "mixed"],
        "ends": ["open", "product", "ring"],
    }
    values |= {"height": [4, 6], "references": [0, 2], "scrambling_layers": [0, 3]}
    fields = [name for name in FAMILY_PARAMETERS[family] if name in values]
    sweep = Sweep.parse(block(family, **{name: values[name] for name in fields}))
    assert set(sweep.axes) == set(fields)
    assert len(sweep.points) == len({point.ensemble.key for point in sweep.points})


def test_sizes_cells_boundaries_and_references() -> None:
    shapes = {family: ensembles(block(family))[0].shape[2:8] for family in BLOCKS}
    assert shapes == {  # sites, references, layers, those repeated, cell, periodic
        "hybrid-clifford": (8, 0, 32, 32, 2, True),
        "hybrid-clifford-square": (16, 0, 16, 16, 4, True),
        "hybrid-clifford-long-range": (8, 0, 32, 32, 2, True),
        "projective-ising": (9, 0, 36, 36, 2, True),
        "edge-bath": (7, 0, 28, 28, 2, False),
        "rotated-clifford": (8, 0, 5, 5, 2, False),
        "layered": (8, 0, 32, 32, 1, True),
    }
    assert ensembles(block("rotated-clifford", ends="ring"))[0].periodic
    assert ensembles(block("hybrid-clifford", references=3))[0].references == 3


def test_a_lattice_is_square_unless_it_has_a_height_and_layers_follow_the_longer_side() -> None:
    shapes = [
        (e.parameters["width"], e.parameters["height"], e.layers)
        for e in ensembles(block("hybrid-clifford-square", width=[4, 6], layers={"per_side": 2}))
    ]
    assert shapes == [(4, 4, 8), (6, 6, 12)]
    (long,) = ensembles(block("hybrid-clifford-square", height=10, layers={"per_side": 0.5}))
    assert (long.sites, long.layers) == (40, 5)
    assert (
        Sweep.parse(block("hybrid-clifford-square", height=4)).key == Sweep.parse(block("hybrid-clifford-square")).key
    )


def test_families_form_a_union_with_the_family_as_an_axis() -> None:
    some = [{"family": family, **BLOCKS[family]} for family in ("hybrid-clifford", "edge-bath")]
    sweep = Sweep.parse({"circuit": some, **REST})
    assert sweep.axes[0] == "family"
    assert [point.ensemble.family for point in sweep.points] == ["hybrid-clifford", "edge-bath"]


@pytest.mark.parametrize(
    ("family", "change", "path", "words"),
    [
        ("hybrid-clifford", {"references": [0, 9]}, "circuit.references[1]", "8 sites take at most 8 reference qubits"),
        ("hybrid-clifford", {"references": -1}, "circuit.references", "at least 0"),
        ("hybrid-clifford", {"scrambling_layers": 1.5}, "circuit.scrambling_layers", "must be an integer"),
        ("hybrid-clifford", {"engine": "fast"}, "circuit.engine", "must be 'auto' or 'reference'"),
        ("hybrid-clifford", {"initial_state": "plus"}, "circuit.initial_state", "must be 'zeros' or 'mixed'"),
        ("hybrid-clifford", {"layers": {"per_side": 2}}, "circuit.layers.per_side", "unknown field"),
        ("hybrid-clifford-square", {"width": 1}, "circuit.width", "at least 2"),
        ("hybrid-clifford-square", {"width": [4, 5]}, "circuit.width[1]", "a periodic lattice needs even sides, got 5"),
        ("hybrid-clifford-square", {"height": 7}, "circuit.height", "a periodic lattice needs even sides, got 7"),
        ("hybrid-clifford-square", {"layers": {"per_side": 0.3}}, "circuit.layers", "at side 4: must be an integer"),
        ("hybrid-clifford-square", {"sites": 16}, "circuit.sites", "unknown field"),
        ("hybrid-clifford-long-range", {"exponent": -1}, "circuit.exponent", "exponent 0 to 64"),
        ("hybrid-clifford-long-range", {"exponent": 1e7}, "circuit.exponent", "exponent 0 to 64"),
        ("hybrid-clifford-long-range", {"sites": 7}, "circuit.sites", "even number of sites, got 7"),
        ("projective-ising", {"bond_rate": 1.1}, "circuit.bond_rate", "between 0 and 1"),
        ("projective-ising", {"measurement_rate": 0.1}, "circuit.measurement_rate", "unknown field"),
        ("edge-bath", {"boundary": "open"}, "circuit.boundary", "unknown field"),
        ("rotated-clifford", {"sites": [8, 9]}, "circuit.sites[1]", "even number of sites, got 9"),
        ("rotated-clifford", {"ends": "closed"}, "circuit.ends", "must be 'open', 'product' or 'ring'"),
    ],
)
def test_a_bad_value_is_refused_with_its_path(family: str, change: dict[str, Any], path: str, words: str) -> None:
    found = faults(block(family, **change))
    assert path in found
    assert words in found[path]


def test_a_missing_family_is_said_so() -> None:
    assert faults(specification(sites=8)) == {"circuit.family": "is missing"}


def test_an_open_lattice_may_have_odd_sides() -> None:
    (ensemble,) = ensembles(block("hybrid-clifford-square", width=3, height=5, boundary="open"))
    assert ensemble.sites == 15
