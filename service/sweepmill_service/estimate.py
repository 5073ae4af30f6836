"""What of a sweep is sampled already, and what the rest would cost."""

from collections.abc import Iterator
from typing import Any, Literal, NamedTuple

from sweepmill.coordinates import accumulator_bytes
from sweepmill.messages import Estimate
from sweepmill.sweep import Point, Sweep
from sweepmill_service.cost import Costs
from sweepmill_service.memory import largest
from sweepmill_service.store import Store


class Sampled(NamedTuple):
    """What is there of one point, with every observation of the sweep, and what is missing up to the cap."""

    trajectories: int
    missing: int


def sampled(sweep: Sweep, store: Store) -> list[Sampled]:
    """What is there of every point of a sweep, in its order."""
    observations = list(dict.fromkeys(item.observation.key for item in sweep.observations))
    there = store.already_sampled([point.ensemble.key for point in sweep.points], observations)
    return [
        _sampled(point, [there.get((point.ensemble.key, key), 0) for key in observations]) for point in sweep.points
    ]


def _sampled(point: Point, numbers: list[int]) -> Sampled:
    """One pass samples every observation that lacks a trajectory, so the shortest prefix decides."""
    least = min(min(numbers), point.cap)
    return Sampled(least, point.cap - least)


def estimate(sweep: Sweep, costs: Costs, store: Store, cores: int) -> Estimate:
    """Predicted cost if every ensemble runs to its cap, which a standard-error rule may spare."""
    there = sampled(sweep, store)
    seconds = sum(
        item.missing * costs[point.ensemble.key].seconds for item, point in zip(there, sweep.points, strict=True)
    )
    return Estimate(
        key=sweep.key,
        ensembles=len(sweep.points),
        trajectories_cap=sum(point.cap for point in sweep.points),
        sampled_ensembles=sum(item.missing == 0 for item in there),
        sampled_trajectories=sum(item.trajectories for item in there),
        core_seconds=seconds,
        core_seconds_from=_source(costs, sweep, there),
        cores=cores,
        seconds=seconds / cores if cores else None,
        accumulator_bytes=sum(_sizes(sweep)),
        worker_bytes=largest(sweep).bytes,
    )


def _source(costs: Costs, sweep: Sweep, there: list[Sampled]) -> Literal["measured", "default", "mixed"]:
    open_points = (point for item, point in zip(there, sweep.points, strict=True) if item.missing)
    kinds = {costs[point.ensemble.key].measured for point in open_points}
    if len(kinds) == 2:
        return "mixed"
    return "default" if kinds == {False} else "measured"


def _sizes(sweep: Sweep) -> Iterator[int]:
    known: dict[tuple[Any, ...], int] = {}
    for point in sweep.points:
        for item in sweep.observations:
            shape = (item.name, *point.ensemble.shape)
            if shape not in known:
                known[shape] = accumulator_bytes(point.ensemble, item.observation)
            yield known[shape]
