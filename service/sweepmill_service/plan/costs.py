"""Predicted cost of a trajectory before anything of its ensemble was measured."""

from collections.abc import Callable, Mapping, Sequence
from typing import Any, Final, NamedTuple

from sweepmill.ensemble import LAYERED, Ensemble
from sweepmill.language.geometry import number_of_places


class Work(NamedTuple):
    """What the cost of one trajectory depends on, all else being a small factor."""

    kind: str
    sites: int
    layers: int
    density: float = 1.0
    """Places of a layer per site, in units of brickwork with one round of measurements."""


def _local(work: Work) -> float:
    """Columns of bits: per place a constant and a part that grows with the length of the columns."""
    return work.sites * work.layers * (2.5e-8 + 1.5e-11 * work.sites)


def _channels(work: Work) -> float:
    """The same with paired logical rows, twice as many, most of them short."""
    return 1.3 * _local(work)


def _spread(work: Work) -> float:
    """Gates between distant sites: rows have no short windows, and a measurement visits every column."""
    return work.sites * work.layers * (6e-8 + 4e-10 * work.sites + 6e-13 * work.sites**2)


def _clusters(work: Work) -> float:
    return 1.2e-8 * work.sites * work.layers


def _signed(work: Work) -> float:
    """The signed simulation: a part per layer, a part per operation."""
    return work.layers * (5e-4 + 2e-5 * work.sites)


# Core-seconds on one core of a server processor, within a small factor from 8 sites to 1024 and rates from 0.02 to 0.5.
PER_TRAJECTORY: Final = 5e-6
KINDS: Final[Mapping[str, Callable[[Work], float]]] = {
    "local": _local,
    "channels": _channels,
    "spread": _spread,
    "clusters": _clusters,
    "signed": _signed,
}
FAMILY_KINDS: Final[Mapping[str, str]] = {
    "hybrid-clifford": "local",
    "hybrid-clifford-square": "spread",
    "hybrid-clifford-long-range": "spread",
    "projective-ising": "clusters",
    "edge-bath": "channels",
    "rotated-clifford": "channels",
}
BRICKWORK: Final = 1.5
"""Places per site of brickwork with one round of measurements."""


def work_of(ensemble: Ensemble) -> Work:
    """The work of one trajectory. Reference qubits count as sites, layers that prepare the state as layers."""
    sites, layers = ensemble.sites + ensemble.references, ensemble.layers + _prepared(ensemble)
    if ensemble.family == LAYERED:
        return Work(_layered_kind(ensemble), sites, layers, _density(ensemble, layers))
    kind = FAMILY_KINDS[ensemble.family]
    if kind == "local" and ensemble.parameters["initial_state"] == "mixed":
        kind = "channels"
    return Work("signed" if ensemble.parameters["engine"] == "reference" else kind, sites, layers)


def _prepared(ensemble: Ensemble) -> int:
    """Layers before those that are numbered."""
    return len(ensemble.parameters.get("before", ())) + int(ensemble.parameters.get("scrambling_layers", 0))


def _density(ensemble: Ensemble, layers: int) -> float:
    """Of a circuit written as data: places of all its layers, over those of as many layers of brickwork."""
    values = ensemble.parameters
    cycles, rest = divmod(int(values["layers"]), len(values["repeat"]))
    places = cycles * _places(ensemble, values["repeat"]) + _places(ensemble, values["repeat"][:rest])
    places += _places(ensemble, values["before"]) + _places(ensemble, values["after"])
    return places / layers / ensemble.sites / BRICKWORK


def _places(ensemble: Ensemble, layers: Sequence[Any]) -> int:
    return sum(number_of_places(step["on"], ensemble.sites, ensemble.periodic) for layer in layers for step in layer)


def _layered_kind(ensemble: Ensemble) -> str:
    if ensemble.parameters["engine"] == "reference":
        return "signed"
    steps = [step for layer in ensemble.parameters["repeat"] for step in layer]
    if any(_far(step["on"], ensemble.sites) for step in steps):
        return "spread"
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


def seconds_of(work: Work) -> float:
    """Core-seconds of one trajectory, to within a small factor."""
    return PER_TRAJECTORY + work.density * KINDS[work.kind](work)


def default_seconds_per_trajectory(ensemble: Ensemble) -> float:
    """Core-seconds of one trajectory of an ensemble, to within a small factor."""
    return seconds_of(work_of(ensemble))


def what_would_pass(work: Work, factor: float, limit: float) -> tuple[int, int]:
    """Most layers at these sites, and most sites at as many layers per site, within ``limit`` seconds.

    ``factor``: what trajectories take over the default cost. Zero where nothing passes.
    """

    def passes(sites: int, layers: int) -> bool:
        return factor * seconds_of(work._replace(sites=sites, layers=layers)) <= limit

    layers = _largest(work.layers, lambda n: passes(work.sites, n))
    return layers, _largest(work.sites, lambda n: passes(n, max(1, round(n * work.layers / work.sites))))


def _largest(upper: int, passes: Callable[[int], bool]) -> int:
    """The largest number up to ``upper`` that passes, 0 if none does; whoever passes, so do the smaller ones."""
    low, high = 0, upper
    while low < high:
        middle = (low + high + 1) // 2
        low, high = (middle, high) if passes(middle) else (low, middle - 1)
    return low


class Calibration:
    """What this machine and these observations really take over the default, learned from first batches."""

    def __init__(self) -> None:
        self.factor = 1.0

    def note(self, default: float, measured: float) -> None:
        """Follow half of the way, in logarithms, from one batch of an ensemble not measured before."""
        if default > 0 and measured > 0:
            self.factor = (self.factor * measured / default) ** 0.5
