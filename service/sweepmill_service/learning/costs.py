"""What one trajectory costs: a shipped default, corrected by what batches of like ensembles took over theirs."""

import json
import math
from collections.abc import Iterable, Sequence
from typing import Any, Final, NamedTuple

import numpy as np

from sweepmill.ensemble import LAYERED, Ensemble
from sweepmill.observation import observation_from_normal_form
from sweepmill_service.learning.cases import DIMENSIONS, place, variant
from sweepmill_service.learning.neighbors import Cases, Floats, Law, Neighbors
from sweepmill_service.learning.readings import reading_seconds, signature
from sweepmill_service.plan.costs import seconds_of
from sweepmill_service.plan.work import Work, work_of
from sweepmill_service.store.evidence import Timed

LAW: Final = Law(shared=(0.35, 0.15, 0.2, 0.5), local=0.25, together=1)
"""In logarithms of seconds: the machine, the kind of work, the law of the circuit, what is read (by its share)."""
DRIFT: Final = 0.12
"""By how much one machine's pace differs from hour to hour: processors heat up, and neighbors share caches."""
BATCH_NOISE: Final = 0.08
SHORT: Final = 0.02
"""Seconds that a batch may take beside its trajectories."""
MOST_CASES: Final = 300
UNLIKE: Final = 2.5
"""How much further circuits written as data may be from the default than families are."""


class Load(NamedTuple):
    """One ensemble with what is read of it, as a case; ``seconds`` by default."""

    seconds: float
    names: tuple[str, ...]
    shares: tuple[float, ...]
    place: tuple[float, ...]


def load_of(ensemble: Ensemble, observations: Sequence[Any]) -> Load:
    """What a trajectory of an ensemble with these observations does; what a worker refuses to read costs nothing."""
    work = work_of(ensemble)
    evolution, reading = seconds_of(work), _reading(ensemble, work, observations)
    share = reading / (evolution + reading)
    own = UNLIKE if ensemble.family == LAYERED else 1.0
    return Load(
        evolution + reading,
        ("", work.kind, variant(ensemble), signature(observations)),
        (1.0, 1.0, own, share),
        (*place(ensemble, work), 2 * share),
    )


def _reading(ensemble: Ensemble, work: Work, observations: Sequence[Any]) -> float:
    try:
        return reading_seconds(ensemble, work, observations)
    except ValueError:
        return 0.0


def cases_of(loads: Sequence[Load]) -> Cases:
    """The same as arrays."""
    return Cases(
        [load.names for load in loads],
        np.array([load.shares for load in loads], dtype=float).reshape(len(loads), len(LAW.shared)),
        np.array([load.place for load in loads], dtype=float).reshape(len(loads), DIMENSIONS + 1),
    )


class Known(NamedTuple):
    """A load that was measured: logarithm of seconds over the default, and its variance."""

    load: Load
    residual: float
    variance: float


def known_of(batch: Timed) -> Known | None:
    """What a batch says; nothing where this code no longer knows its observations."""
    try:
        observations = [observation_from_normal_form(json.loads(text)) for text in batch.observations]
        load = load_of(Ensemble.from_normal_form(json.loads(batch.ensemble)), observations)
    except ValueError:
        return None
    seconds = max(batch.seconds, 1e-6)
    return Known(load, math.log(seconds / batch.trajectories / load.seconds), BATCH_NOISE**2 + (SHORT / seconds) ** 2)


def grouped(known: Iterable[Known]) -> list[Known]:
    """One for all of the same kind and place: the median, which an outlier does not move."""
    groups: dict[tuple[Any, ...], list[Known]] = {}
    for one in known:
        corner = tuple(round(4 * x) for x in one.load.place)
        groups.setdefault((one.load.names, corner), []).append(one)
    return [_merged(group) for group in groups.values()]


def _merged(group: list[Known]) -> Known:
    middle = sorted(group, key=lambda one: one.residual)[len(group) // 2]
    variance = float(np.median([one.variance for one in group]))
    return middle._replace(variance=variance / len(group) + (BATCH_NOISE / 2) ** 2)


class CostModel:
    """Costs learned from batches, nearest ones first; with no batch at all they are the defaults."""

    def __init__(self, known: Sequence[Known]) -> None:
        self.kinds = {one.load.names[1] for one in known}
        self._near = Neighbors(
            LAW,
            cases_of([one.load for one in known]),
            np.array([one.residual for one in known], dtype=float),
            np.array([one.variance for one in known], dtype=float),
        )

    def predict(self, loads: Sequence[Load]) -> tuple[Floats, Floats]:
        """Seconds [n] of a trajectory of each, and the standard deviation [n] of their logarithms."""
        cases = cases_of(loads)
        seconds = np.array([load.seconds for load in loads]) * np.exp(self._near.means(cases))
        return seconds, np.hypot(self._near.deviations(cases), DRIFT)

    def deviation_of_sum(self, loads: Sequence[Load], seconds: Floats) -> float:
        """Standard deviation of the logarithm of a sum of so many seconds each."""
        if not seconds.sum() > 0:
            return 0.0
        few, weights = _condensed(loads, seconds / seconds.sum())
        return float(np.hypot(self._near.deviation_of_mean(cases_of(few), weights), DRIFT))


def _condensed(loads: Sequence[Load], weights: Floats) -> tuple[list[Load], Floats]:
    """Loads that are hardly told apart taken together: thousands of ensembles become some hundred."""
    groups: dict[tuple[Any, ...], list[Any]] = {}
    for load, weight in zip(loads, weights.tolist(), strict=True):
        corner = tuple(round(2 * x) for x in load.place)
        group = groups.setdefault((load.names, corner), [load, 0.0])
        group[1] += weight
    heaviest = sorted(groups.values(), key=lambda group: -group[1])[:500]
    kept = np.array([weight for _, weight in heaviest])
    return [load for load, _ in heaviest], kept / kept.sum()


def nearest(known: Sequence[Known], wanted: Sequence[Load]) -> list[Known]:
    """At most so many known loads as a regression bears: those of the kinds that are wanted, near ones first."""
    if len(known) <= MOST_CASES or not wanted:
        return list(known[:MOST_CASES])
    kinds = {load.names[1] for load in wanted}
    places = np.array(list({load.place for load in wanted})[:200])
    distances = [float(((places - np.array(one.load.place)) ** 2).sum(axis=1).min()) for one in known]
    order = sorted(range(len(known)), key=lambda i: (known[i].load.names[1] not in kinds, distances[i]))
    return [known[i] for i in order[:MOST_CASES]]


def learned(batches: Iterable[Timed], wanted: Sequence[Load]) -> CostModel:
    """A model of the batches, as far as they tell of the loads that are wanted."""
    known = [one for batch in batches if (one := known_of(batch)) is not None]
    return CostModel(nearest(grouped(known), wanted))
