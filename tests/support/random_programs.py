"""Random circuits written as data, with every kind of step, place, rate and gate that the language has."""

import random
import re
from collections.abc import Callable
from typing import Any

from sweepmill.ensemble import Ensemble
from sweepmill.errors import SpecificationError
from sweepmill.language.gates import GATES, ONE_SITE, RANDOM_GATES
from sweepmill.sweep import Sweep

Step = dict[str, Any]
TWO_SITES = [name for name, sizes in GATES.items() if 2 in sizes and name not in RANDOM_GATES]


def random_ensemble(seed: int, sites: int, layers: int) -> Ensemble:
    """A layered ensemble, checked and normalized as a user's is."""
    writer = Writer(random.Random(seed), sites)
    circuit = {
        "family": "layered",
        "sites": sites,
        "layers": layers,
        "boundary": writer.boundary,
        "initial_state": writer.draw.choice(["zeros", "plus", "mixed"]),
        "before": [writer.layer("before") for _ in range(writer.draw.randint(0, 2))],
        "repeat": [writer.framed(), *(writer.layer("repeat") for _ in range(writer.draw.randint(0, 2)))],
        "after": [writer.layer("after") for _ in range(writer.draw.randint(0, 2))],
    }
    return _parsed(circuit).points[0].ensemble


def _parsed(circuit: dict[str, Any]) -> Sweep:
    """Outcomes that may not be forced are left to chance."""
    observed = [{"quantity": "global-entropy", "at": "end"}]
    spec = {"circuit": circuit, "observe": observed, "stop": {"trajectories": 1}}
    try:
        return Sweep.parse(spec)
    except SpecificationError as error:
        refused = [path for path, _ in error.faults if path.endswith(".forced")]
        if len(refused) < len(error.faults):
            raise
    for path in refused:
        del _step_at(spec, path)["forced"]
    return Sweep.parse(spec)


def _step_at(spec: Any, path: str) -> Step:
    """The step that a path such as circuit.repeat[0][1].forced leads to."""
    for name in re.findall(r"\w+", path.removesuffix(".forced")):
        spec = spec[int(name) if name.isdigit() else name]
    step: Step = spec
    return step


class Writer:
    """Writes steps for a chain of some size."""

    def __init__(self, draw: random.Random, sites: int) -> None:
        self.draw, self.sites = draw, sites
        self.boundary = draw.choice(["periodic", "open"])
        self.swaps = 0

    def layer(self, part: str) -> list[Step]:
        """Up to five steps."""
        steps = [self._step() for _ in range(self.draw.randint(1, 5))]
        if part != "repeat" and self.swaps < 2 and self.draw.random() < 0.5:
            self.swaps += 1
            place = [[self.draw.randrange(self.sites)]]
            steps.insert(self.draw.randint(0, len(steps)), {"swap_in": "reference", "on": {"places": place}})
        return steps

    def framed(self) -> list[Step]:
        """A layer with a random gate on every site, so that outcomes may be forced anywhere."""
        return [{"apply": "uniform-clifford", "on": "sites"}, *self.layer("repeat")]

    def _step(self) -> Step:
        if self.draw.random() < 0.2:
            width = self.draw.choice([1, 2])
            branches = [self._branch(width) for _ in range(self.draw.randint(1, 3))]
            return {"choose": branches, "on": self._on(width)[0]}
        kind = self.draw.choice([self._gate, self._gate, self._measurement, self._measurement, self._loss])
        width = self.draw.choice([1, 2]) if kind == self._gate else self.draw.randint(1, min(4, self.sites))
        on, definite = self._on(width)
        return kind(width, definite) | {"on": on} | self._rate(definite)

    def _branch(self, width: int) -> Step:
        kinds: list[Callable[[int, bool], Step]] = [self._gate, self._measurement, self._loss]
        steps = [self.draw.choice(kinds)(width, False) for _ in range(self.draw.randint(0, 2))]
        return {"weight": self.draw.choice([1, 2, 0.3]), "steps": steps}

    def _gate(self, width: int, definite: bool) -> Step:
        random_names = [name for name, sizes in RANDOM_GATES.items() if width in sizes]
        if self.draw.random() < 0.4:
            return {"apply": self.draw.choice(ONE_SITE if width == 1 else TWO_SITES)}
        step: Step = {"apply": self.draw.choice(["uniform-clifford", *random_names])}
        if definite and self.draw.random() < 0.3:
            step["fixed"] = self.draw.choice(["trajectory", "ensemble"])
        if width == 2 and step.get("fixed") != "ensemble" and self.draw.random() < 0.3:
            step["rotated"] = True
        return step

    def _measurement(self, width: int, definite: bool) -> Step:
        options: list[Step] = [{}, {}, {}, {"recorded": False}, {"forced": True}]
        return {"measure": "".join(self.draw.choices("XYZ", k=width))} | self.draw.choice(options)

    def _loss(self, width: int, definite: bool) -> Step:
        return self.draw.choice([{"depolarise": True}, {"reset": True}])

    def _on(self, width: int) -> tuple[Any, bool]:
        """Places, and whether they are the same in every layer."""
        count = self.draw.randint(1, 3)
        listed = [self.draw.sample(range(self.sites), width) for _ in range(count)]
        first = self.draw.randrange(self.sites)
        odd_ring = self.boundary == "periodic" and self.sites % 2
        choices: list[tuple[Any, bool]] = [
            ({"places": listed}, True),
            ({"blocks": {"width": width, "from": first, "every": self.draw.randint(1, 3)}}, True),
        ]
        if width == 1:
            choices += [("sites", True), ({"sublattice": {"from": first, "every": 2}}, True)]
            choices += [({"random_sequential": {"count": count, "of": "sites"}}, False)]
        if width == 2:
            choices += [("bonds", True), ("bonds-from-0", True)] + ([] if odd_ring else [("bonds-from-1", True)])
            choices += [({"random_sequential": {"count": count, "of": "bonds"}}, False)]
            pairs = {"count": self.draw.randint(1, self.sites // 2), "exponent": self.draw.choice([0, 1, 2.5])}
            choices += [({"random_pairs": pairs}, False)]
        return self.draw.choice(choices)

    def _rate(self, definite: bool) -> Step:
        rates: list[Any] = [0.5, 0.9, {"profile": "list", "by": "site", "values": [0.2, 1, 0]}]
        rates += [{"profile": "stripe", "by": "layer", "period": 3, "width": 1, "inside": 0.8, "outside": 0.1}]
        quasi = {"mean": 0.5, "amplitude": 0.4, "wavelength": 1.618, "phase": 0.1}
        rates += [{"profile": "quasi-periodic", "by": "site", **quasi}]
        if definite:
            rates += [{"disorder": "uniform", "from": 0.1, "to": 0.9}]
            rates += [{"disorder": "two-valued", "values": [0.1, 0.9], "weight": 0.5}]
            rates += [{"disorder": "power-law", "exponent": -0.5, "largest": 1}]
        return {} if self.draw.random() < 0.5 else {"rate": self.draw.choice(rates)}
