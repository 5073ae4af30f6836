"""The work of one trajectory: what its cost depends on, read off the circuit."""

from collections.abc import Mapping, Sequence
from typing import Any, Final, NamedTuple

from sweepmill.ensemble import LAYERED, Ensemble
from sweepmill.language.geometry import number_of_places
from sweepmill.language.rates import bounds


class Work(NamedTuple):
    """What the cost of one trajectory depends on."""

    kind: str
    sites: int
    layers: int
    rate: float = 0.16
    """Measurements per site and layer; of clusters those of bonds."""
    gates: float = 0.5
    """Gates on two sites per site and layer, as many as in brickwork."""
    drawn: float = 0.0
    """Places per site and layer that are drawn at random."""


WEIGHED: Final = 4.0
"""How many plain draws a draw by distance costs."""
ROTATED: Final = 3.0
"""How many draws a gate read sideways costs on top."""
NOISE: Final = 3.0
"""How many measurements it costs to make a site mixed."""
SINGLE: Final = 0.5
"""How many gates on two sites a gate on one costs."""
FAMILY_KINDS: Final[Mapping[str, str]] = {
    "hybrid-clifford": "local",
    "hybrid-clifford-square": "lattice",
    "hybrid-clifford-long-range": "spread",
    "projective-ising": "clusters",
    "edge-bath": "channels",
    "rotated-clifford": "channels",
}


def work_of(ensemble: Ensemble) -> Work:
    """The work of one trajectory. Reference qubits count as sites, layers that prepare the state as layers."""
    sites, layers = ensemble.sites + ensemble.references, ensemble.layers + _prepared(ensemble)
    if ensemble.family == LAYERED:
        return _layered(ensemble, sites, layers)
    values, kind = ensemble.parameters, FAMILY_KINDS[ensemble.family]
    if kind == "local" and values["initial_state"] == "mixed":
        kind = "channels"
    rate = float(values.get("measurement_rate", values.get("bond_rate", 0.0)))
    drawn = BRICKWORK * WEIGHED if values.get("exponent") else 0.0
    if ensemble.family == "rotated-clifford":
        drawn = BRICKWORK * ROTATED
    return Work("signed" if values["engine"] == "reference" else kind, sites, layers, rate, drawn=drawn)


BRICKWORK: Final = Work("", 1, 1).gates


def _prepared(ensemble: Ensemble) -> int:
    """Layers before those that are numbered."""
    return len(ensemble.parameters.get("before", ())) + int(ensemble.parameters.get("scrambling_layers", 0))


class _Counts(NamedTuple):
    """Gates, measurements and draws."""

    gates: float = 0.0
    measured: float = 0.0
    drawn: float = 0.0

    def times(self, factor: float) -> "_Counts":
        return _Counts(*(factor * value for value in self))

    def plus(self, other: "_Counts") -> "_Counts":
        return _Counts(*(a + b for a, b in zip(self, other, strict=True)))


def _layered(ensemble: Ensemble, sites: int, layers: int) -> Work:
    """Of a circuit written as data: means over all its layers."""
    values = ensemble.parameters
    cycles, rest = divmod(int(values["layers"]), len(values["repeat"]))
    total = _of_layers(ensemble, values["repeat"]).times(cycles).plus(_of_layers(ensemble, values["repeat"][:rest]))
    total = total.plus(_of_layers(ensemble, values["before"])).plus(_of_layers(ensemble, values["after"]))
    mean = total.times(1 / layers / ensemble.sites)
    return Work(_layered_kind(ensemble), sites, layers, mean.measured, mean.gates, mean.drawn)


def _of_layers(ensemble: Ensemble, layers: Sequence[Any]) -> _Counts:
    total = _Counts()
    for layer in layers:
        for step in layer:
            total = total.plus(_at_place(step).times(number_of_places(step["on"], ensemble.sites, ensemble.periodic)))
    return total


def _at_place(step: Mapping[str, Any]) -> _Counts:
    """Of one place of a step, on average."""
    drawn = _draws(step.get("on"))
    if "choose" in step:
        weights = [_mean(branch["weight"]) for branch in step["choose"]]
        whole = sum(weights) or 1.0
        total = _Counts(drawn=drawn + 1)
        for weight, branch in zip(weights, step["choose"], strict=True):
            for inner in branch["steps"]:
                total = total.plus(_at_place(inner).times(weight / whole))
        return total
    often = _mean(step.get("rate", 1))
    if "apply" in step:
        sideways = often * ROTATED if step.get("rotated") else 0.0
        return _Counts(gates=often * (SINGLE if _single(step.get("on")) else 1.0), drawn=drawn + sideways)
    if "measure" in step:
        return _Counts(measured=often, drawn=drawn)
    return _Counts(measured=0.0 if "swap_in" in step else NOISE * often, drawn=drawn)


def _mean(rate: Any) -> float:
    low, high = bounds(rate)
    return (low + high) / 2


def _draws(on: Any) -> float:
    if isinstance(on, Mapping) and "random_pairs" in on:
        return WEIGHED if on["random_pairs"].get("exponent") else 0.0
    return 1.0 if isinstance(on, Mapping) and "random_sequential" in on else 0.0


def _single(on: Any) -> bool:
    """Whether places are single sites."""
    if not isinstance(on, Mapping):
        return bool(on == "sites")
    places: Sequence[Any] = on.get("places", ((0, 1),))
    return bool("sublattice" in on) or len(places[0]) == 1


def _layered_kind(ensemble: Ensemble) -> str:
    if ensemble.parameters["engine"] == "reference":
        return "signed"
    steps = [step for layer in ensemble.parameters["repeat"] for step in layer]
    if any(_far(step["on"], ensemble.sites) for step in steps):
        return "spread" if any("random_pairs" in step["on"] for step in steps) else "lattice"
    return "channels" if any(map(_loses, steps)) or ensemble.parameters["initial_state"] == "mixed" else "local"


def _far(on: Any, sites: int) -> bool:
    """Does it couple sites that are not neighbors?"""
    if isinstance(on, str) or "places" not in on:
        return not isinstance(on, str) and "random_pairs" in on
    return any(max(place) - min(place) not in (len(place) - 1, sites - 1) for place in on["places"])


def _loses(step: Any) -> bool:
    """Does it turn pure states into mixed ones?"""
    if "choose" in step:
        return any(_loses(inner) for branch in step["choose"] for inner in branch["steps"])
    return "depolarise" in step or "reset" in step or step.get("recorded", True) is False
