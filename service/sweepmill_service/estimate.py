"""What of a sweep is sampled already, and what the rest would cost, take and tell."""

from collections.abc import Iterator, Mapping, Sequence
from typing import Any, Literal, NamedTuple

import numpy as np

from sweepmill.coordinates import accumulator_bytes
from sweepmill.limits import kept_values_bytes
from sweepmill.messages import Estimate, ExpectedError, Range
from sweepmill.sweep import NamedObservation, Point, Sweep
from sweepmill_service.cost import Costs
from sweepmill_service.expected import (
    Floats,
    Goal,
    Uncertain,
    expected_error,
    expected_seconds,
    needed,
    reachable,
    total_seconds,
)
from sweepmill_service.finish import DEVIATION, Share, seconds_to_finish
from sweepmill_service.learning.scatter import Scatter, ScatterModel
from sweepmill_service.memory import largest
from sweepmill_service.store import Store

ROUNDS = "a goal is sampled in rounds: how many there will be is known once the first is judged"
OWN_TOTALS = 64  # ensembles whose own totals are read: of more, some spread over all


class Sampled(NamedTuple):
    """What is there of one point, with every observation of the sweep, and what is missing up to the cap."""

    trajectories: int
    missing: int


def sampled(sweep: Sweep, store: Store) -> list[Sampled]:
    """What is there of every point of a sweep, in its order."""
    return sampled_points(sweep.points, sweep.observations, store)


def sampled_points(points: Sequence[Point], named: Sequence[NamedObservation], store: Store) -> list[Sampled]:
    """What is there of some points, in their order."""
    observations = list(dict.fromkeys(item.observation.key for item in named))
    there = store.already_sampled([point.ensemble.key for point in points], observations)
    return [_sampled(point, [there.get((point.ensemble.key, key), 0) for key in observations]) for point in points]


def _sampled(point: Point, numbers: list[int]) -> Sampled:
    """One pass samples every observation that lacks a trajectory, so the shortest prefix decides."""
    least = min(min(numbers), point.cap)
    return Sampled(least, point.cap - least)


def goal_of(sweep: Sweep) -> Goal:
    """Where the ensembles of a sweep stop."""
    return Goal(sweep.stop.first_rung, {rule.of: rule.below for rule in sweep.stop.standard_error})


def first_round(sweep: Sweep) -> tuple[Point, ...]:
    """What is sure to be sampled: all of it, or the places of the first round where a goal decides what follows."""
    if sweep.goal is None:
        return sweep.points
    return tuple(
        Point(point.ensemble, min(sweep.stop.first_rung, point.cap))
        for point in sweep.points
        if point.ensemble.key in sweep.starting
    )


def scatters_of(points: Sequence[Point], named: Sequence[NamedObservation], store: Store) -> dict[str, Scatter]:
    """How much each observation scatters on some points, by its name."""
    ensembles = [point.ensemble for point in points]
    families = sorted({ensemble.family for ensemble in ensembles})
    some = ensembles[:: max(1, len(ensembles) // OWN_TOTALS)]
    keys = list(dict.fromkeys(item.observation.key for item in named))
    totals = store.recent_totals(families, keys) + store.totals_of([ensemble.key for ensemble in some], keys)
    distinct = {(total.ensemble_key, total.observation_key): total for total in totals}
    return {
        item.name: ScatterModel(
            item.observation, [total for total in distinct.values() if total.observation_key == item.observation.key]
        ).predict(ensembles)
        for item in named
    }


def estimate(sweep: Sweep, costs: Costs, store: Store, share: Share, idle: str | None) -> Estimate:
    """Cost, time and standard errors of a sweep; ``idle`` says why no pool would sample it, if so."""
    points, goal = first_round(sweep), goal_of(sweep)
    there = sampled_points(points, sweep.observations, store)
    done = np.array([item.trajectories for item in there], dtype=float)
    scatters = scatters_of(points, sweep.observations, store)
    numbers = np.maximum(needed(points, goal, scatters), done)
    at_most = total_seconds(sweep.points, np.array([item.missing for item in sampled(sweep, store)], float), costs)
    expected = expected_seconds(points, done, goal, scatters, costs)
    idle = idle or (None if sweep.goal is None else ROUNDS)
    time = None if idle is not None else _time(points, expected, there, costs, share)
    return Estimate(
        key=sweep.key,
        ensembles=len(points),
        trajectories_cap=sum(point.cap for point in points),
        trajectories_expected=round(float(numbers.sum())),
        sampled_ensembles=sum(item.missing == 0 for item in there),
        sampled_trajectories=sum(item.trajectories for item in there),
        core_seconds=at_most.value,
        core_seconds_range=_range(at_most),
        core_seconds_expected=expected.value,
        core_seconds_expected_range=_range(expected),
        core_seconds_from=_source(costs, points, there),
        cores=share.cores,
        seconds=None if time is None else time.value,
        seconds_range=None if time is None else _range(time),
        seconds_unknown=idle,
        queued_core_seconds=share.before + sum(share.others),
        accumulator_bytes=sum(_sizes(sweep)),
        kept_bytes=kept_values_bytes(sweep),
        worker_bytes=largest(sweep).bytes,
        standard_errors=_errors(sweep.observations, points, goal, numbers, scatters),
        rounds=None if sweep.goal is None else ROUNDS,
    )


def _time(
    points: Sequence[Point], expected: Uncertain, there: Sequence[Sampled], costs: Costs, share: Share
) -> Uncertain:
    open_points = [point for item, point in zip(there, points, strict=True) if item.missing]
    longest = max((costs[point.ensemble.key].seconds for point in open_points), default=0.0)
    seconds = seconds_to_finish(expected.value, longest, share)
    return Uncertain(seconds, float(np.hypot(expected.deviation, DEVIATION)))


def _range(value: Uncertain) -> Range:
    low, high = value.range
    return Range(low=low, high=high)


def _errors(
    named: Sequence[NamedObservation],
    points: Sequence[Point],
    goal: Goal,
    numbers: Floats,
    scatters: Mapping[str, Scatter],
) -> list[ExpectedError]:
    found = []
    for item in named:
        below = goal.below.get(item.name)
        one = expected_error(item.name, numbers, scatters[item.name])
        found.append(
            ExpectedError(
                name=item.name,
                largest=None if one.largest is None else one.largest.value,
                largest_range=None if one.largest is None else _range(one.largest),
                median=one.median,
                below=below,
                met=None if below is None or one.largest is None else reachable(points, scatters[item.name], below),
                source="mixed" if len(one.sources) > 1 else next(iter(one.sources)),
            )
        )
    return found


def _source(
    costs: Costs, points: Sequence[Point], there: list[Sampled]
) -> Literal["measured", "learned", "default", "mixed"]:
    open_points = (point for item, point in zip(there, points, strict=True) if item.missing)
    origins = {costs[point.ensemble.key].origin for point in open_points}
    if len(origins) > 1:
        return "mixed"
    return next(iter(origins), "measured")


def _sizes(sweep: Sweep) -> Iterator[int]:
    known: dict[tuple[Any, ...], int] = {}
    for point in sweep.points:
        for item in sweep.observations:
            shape = (item.name, *point.ensemble.shape)
            if shape not in known:
                known[shape] = accumulator_bytes(point.ensemble, item.observation)
            yield known[shape]
