"""Every family as a circuit written as data: the form that one executor samples.

The steps of a layer stand in the order in which their random words are numbered, so it is part of the revision of
each family.
"""

from collections.abc import Callable
from typing import Any

from sweepmill.ensemble import FAMILY_PARAMETERS, LAYERED, Ensemble
from sweepmill.language.numbers import Parameter
from sweepmill.language.rates import value_of
from sweepmill.revisions import FAMILY_REVISIONS

Form = dict[str, Any]
Layer = list[Form]
BRICKS = ("bonds-from-0", "bonds-from-1")


def layered_form(ensemble: Ensemble) -> Form:
    """The normal form of the layered ensemble with the same law; that of a layered one is its own.

    Plain data of lists and tables. It is another ensemble by key; sampled with the words of the key of the preset it
    gives the preset's trajectories.
    """
    if ensemble.family == LAYERED:
        return ensemble.normal_form()
    head = {"family": LAYERED, "revision": FAMILY_REVISIONS[LAYERED], "sites": ensemble.sites}
    common = {name: ensemble.parameters[name] for name in ("layers", "replicate", "engine")}
    form: Form = {**head, **common, **_PRESETS[ensemble.family](ensemble)}
    defaults = FAMILY_PARAMETERS[LAYERED] | {"before": [], "after": []}
    return {name: value for name, value in form.items() if name not in defaults or value != defaults[name]}


def _hybrid_clifford(ensemble: Ensemble) -> Form:
    values = ensemble.parameters
    measured = _measured("Z", "sites", values["measurement_rate"])
    return _boundary_and_state(ensemble) | {
        "before": [*_references(ensemble), *([_gates(BRICKS[n % 2])] for n in range(values["scrambling_layers"]))],
        "repeat": [[_gates(bricks), measured] for bricks in BRICKS],
    }


def _references(ensemble: Ensemble) -> list[Layer]:
    """One layer that swaps in the reference qubits at equal spacings, if there are any."""
    number = ensemble.references
    places = [[i * ensemble.sites // number] for i in range(number)]
    return [[{"swap_in": "reference", "on": {"places": places}}]] if places else []


def _square(ensemble: Ensemble) -> Form:
    values = ensemble.parameters
    measured = _measured("Z", "sites", values["measurement_rate"])
    classes = [
        lattice_bonds(values["width"], values["height"], ensemble.periodic, vertical, first)
        for vertical in (False, True)
        for first in (0, 1)
    ]
    return _boundary_and_state(ensemble) | {
        "repeat": [[_gates({"places": bonds}), measured] for bonds in classes],
    }


def lattice_bonds(width: int, height: int, periodic: bool, vertical: bool, first: int) -> list[list[int]]:
    """Bonds of one of the four classes, row by row: in one direction, from the even or the odd rows or columns."""
    lines = height if vertical else width
    starts = range(first, lines if periodic else lines - 1, 2)
    if vertical:
        return [[y * width + x, (y + 1) % height * width + x] for y in starts for x in range(width)]
    return [[y * width + x, y * width + (x + 1) % width] for y in range(height) for x in starts]


def _long_range(ensemble: Ensemble) -> Form:
    values = ensemble.parameters
    rule = {"exponent": values["exponent"]} if values["exponent"] else {}
    layer = [_gates({"random_pairs": rule}), _measured("Z", "sites", values["measurement_rate"])]
    return _boundary_and_state(ensemble) | {"repeat": [layer, layer]}


def _projective_ising(ensemble: Ensemble) -> Form:
    given = {"bond_rate": ensemble.parameters["bond_rate"]}
    bonds, fields = (value_of(Parameter(parameter="bond_rate", complement=c), given) for c in (False, True))
    layer = [_measured("ZZ", "bonds", bonds), _measured("X", "sites", fields)]
    return {"boundary": ensemble.parameters["boundary"], "initial_state": "plus", "repeat": [layer, layer]}


def _edge_bath(ensemble: Ensemble) -> Form:
    bath = {"depolarise": True, "on": {"places": [[0]]}}
    return {"boundary": "open", "repeat": [[_gates(bricks), bath] for bricks in BRICKS]}


def _rotated_clifford(ensemble: Ensemble) -> Form:
    """The last column acts on (0, 1), (2, 3), …: on (n - 1, n) for odd slices n."""
    first, second = BRICKS if ensemble.layers % 2 else BRICKS[::-1]
    return {
        "boundary": "periodic" if ensemble.periodic else "open",
        "before": [_bell_pairs(second, ensemble.sites, ensemble.periodic)],
        "repeat": [_column(bricks, ensemble) for bricks in (first, second)],
    }


def _bell_pairs(bricks: str, sites: int, periodic: bool) -> Layer:
    """Fresh pairs on the offset opposite to the first column's; a slice left alone stays |0>."""
    start = int(bricks[-1])
    left = [[site] for site in range(start, sites if periodic else sites - 1, 2)]
    return [{"apply": "h", "on": {"places": left}}, {"apply": "cx", "on": bricks}]


def _column(bricks: str, ensemble: Ensemble) -> Layer:
    gates = _gates(bricks) | {"rotated": True}
    ends, top = ensemble.parameters["ends"], [ensemble.sites - 1]
    if bricks == "bonds-from-1" or ends == "ring":
        return [gates]
    if ends == "open":
        return [{"depolarise": True, "on": {"places": [[0], top]}}, gates]
    fresh = [{"reset": True, "on": {"places": [[0]]}}, {"depolarise": True, "on": {"places": [top]}}]
    return [*fresh, gates, {"measure": "Z", "on": {"places": [[0]]}, "forced": True}]


def _boundary_and_state(ensemble: Ensemble) -> Form:
    return {name: ensemble.parameters[name] for name in ("boundary", "initial_state")}


def _gates(on: Any) -> Form:
    return {"apply": "uniform-clifford", "on": on}


def _measured(product: str, on: Any, rate: float) -> Form:
    step = {"measure": product, "on": on}
    return step if rate == 1 else step | {"rate": rate}


_PRESETS: dict[str, Callable[[Ensemble], Form]] = {
    "hybrid-clifford": _hybrid_clifford,
    "hybrid-clifford-square": _square,
    "hybrid-clifford-long-range": _long_range,
    "projective-ising": _projective_ising,
    "edge-bath": _edge_bath,
    "rotated-clifford": _rotated_clifford,
}
