"""What a sweep is expected to come to: scatters, trajectories, core-seconds and time, each with its range."""

import math
from typing import Any

import numpy as np
import pytest

from support.batches import result
from support.specs import small
from sweepmill.ensemble import Ensemble
from sweepmill.sweep import Point, Sweep
from sweepmill_service.cost import Costs
from sweepmill_service.expected import (
    Goal,
    Uncertain,
    expected_error,
    expected_seconds,
    needed,
    reachable,
    total_seconds,
)
from sweepmill_service.finish import EFFICIENCY, LATENCY, Share, seconds_to_finish, share_of
from sweepmill_service.learning.scatter import Scatter, ScatterModel
from sweepmill_service.meter import Meter
from sweepmill_service.plan.sweeps import Waiting
from sweepmill_service.store import Store

CAP = 10_000
POINTS = [
    Point(Ensemble.of("hybrid-clifford", sites=sites, measurement_rate=0.1, layers=32), CAP) for sites in (16, 32, 64)
]
COSTS = Costs([point.ensemble for point in POINTS], [])
PLAIN = Goal(200, {})
RULED = Goal(200, {"s": 0.02})


def scatter(*values: float, deviation: float = 0.0, source: Any = "sampled") -> dict[str, Scatter]:
    return {"s": Scatter(np.array(values), np.full(len(values), deviation), (source,) * len(values))}


def test_without_rules_every_cap_is_expected() -> None:
    assert needed(POINTS, PLAIN, {}).tolist() == [CAP] * 3
    at_most = total_seconds(POINTS, np.full(3, float(CAP)), COSTS)
    assert expected_seconds(POINTS, np.zeros(3), PLAIN, {}, COSTS) == at_most
    assert at_most.value == pytest.approx(CAP * sum(COSTS[point.ensemble.key].seconds for point in POINTS))


def test_rules_are_expected_to_hold_at_the_next_rung_and_caps_end_all() -> None:
    """(1 / 0.02)^2 = 2500 trajectories for a scatter of 1; rungs are 200 times powers of the fourth root of two."""
    numbers = needed(POINTS, RULED, scatter(1.0, 0.1, 5.0))
    assert numbers[0] == pytest.approx(200 * 2 ** (15 / 4), abs=1)
    assert numbers.tolist()[1:] == [200, CAP]
    assert reachable(POINTS, scatter(1.0, 0.1, 5.0)["s"], 0.02) == 2


def test_uncertain_scatters_make_numbers_and_costs_uncertain() -> None:
    sure = expected_seconds(POINTS, np.zeros(3), RULED, scatter(1.0, 1.0, 1.0), COSTS)
    vague = expected_seconds(POINTS, np.zeros(3), RULED, scatter(1.0, 1.0, 1.0, deviation=0.3), COSTS)
    assert vague.deviation > sure.deviation + 0.1
    assert vague.value == sure.value
    low, high = vague.range
    assert low < sure.value < high


def test_what_is_sampled_already_costs_nothing_more() -> None:
    done = np.array([CAP, CAP, CAP], dtype=float)
    assert expected_seconds(POINTS, done, RULED, scatter(1.0, 1.0, 1.0), COSTS) == Uncertain(0.0, 0.0)


def test_errors_fall_with_the_square_root_and_the_largest_is_told() -> None:
    error = expected_error("s", np.array([100.0, 400.0, 10_000.0]), scatter(1.0, 3.0, 5.0, deviation=0.1)["s"])
    assert error.largest is not None
    assert error.largest.value == pytest.approx(0.15)
    assert error.median == pytest.approx(0.1)
    assert list(error.largest.range) == pytest.approx([0.15 * math.exp(-0.1), 0.15 * math.exp(0.1)])
    unknown = expected_error("s", np.ones(3), scatter(1.0, 1.0, 1.0, source="unknown")["s"])
    assert (unknown.largest, unknown.median) == (None, None)


# --- scatters from totals


def sampled_sweep(store: Store) -> tuple[Sweep, Any]:
    sweep = Sweep.parse(small(stop={"trajectories": 400}))
    store.submit(sweep, "ada")
    keys = [item.observation.key for item in sweep.observations]
    store.commit([result(point.ensemble.key, keys, 0, 300, sweep.key) for point in sweep.points])
    return sweep, sweep.observations[0].observation


def test_scatter_is_that_of_the_ensemble_and_then_that_of_its_neighbors(store: Store) -> None:
    sweep, observation = sampled_sweep(store)
    ensembles = [point.ensemble for point in sweep.points]
    found = store.totals_of([ensemble.key for ensemble in ensembles], [observation.key])
    model = ScatterModel(observation, found)
    own = model.predict(ensembles)
    assert set(own.sources) == {"sampled"}
    near = model.predict([Ensemble.of("hybrid-clifford", sites=12, measurement_rate=0.15, layers=48)])
    assert near.sources == ("learned",)
    assert near.values[0] == pytest.approx(float(np.median(own.values)), rel=0.3)
    cold = ScatterModel(observation, []).predict(ensembles)
    assert set(cold.sources) == {"default"}
    assert own.deviations.max() < near.deviations[0] < cold.deviations.min()
    recent = store.recent_totals(["hybrid-clifford"], [observation.key])
    assert {total.ensemble_key for total in recent} == {ensemble.key for ensemble in ensembles}


# --- the pool


def waiting(owner: str, sweep: str, seconds: float, priority: int = 0, at: float = 1.0) -> Waiting:
    return Waiting(owner, sweep, priority, at, seconds)


def test_owners_share_the_pool_and_one_with_little_work_does_not_hold_it() -> None:
    """100 core-seconds alone take 50 s on two cores, beside plenty twice that; 10 core-seconds of others delay by 5."""

    def seconds(*others: float) -> float:
        return (seconds_to_finish(100.0, 0.0, Share(0.0, others, 2)) - LATENCY) * EFFICIENCY

    assert seconds() == pytest.approx(50)
    assert seconds(1e6) == pytest.approx(100)
    assert seconds(10.0) == pytest.approx(55)
    assert seconds(1e6, 1e6, 10.0) == pytest.approx(155)


def test_own_sweeps_come_first_if_they_are_older_or_more_urgent() -> None:
    queue = [waiting("ada", "old", 10.0), waiting("ada", "urgent", 20.0, priority=5), waiting("ben", "other", 40.0)]
    assert share_of(queue, "new", "ada", 0, 2) == Share(30.0, (40.0,), 2)
    assert share_of(queue, "new", "ada", 3, 2) == Share(20.0, (40.0,), 2)
    assert share_of(queue, "old", "ada", 0, 2) == Share(20.0, (40.0,), 2)
    assert share_of(queue, "new", "eve", 0, 2) == Share(0.0, (30.0, 40.0), 2)


def test_a_pool_that_gives_its_cores_to_others_as_well_takes_longer() -> None:
    half = seconds_to_finish(100.0, 0.0, Share(0.0, (), 2, pace=0.5))
    assert half == LATENCY + 100.0


def test_the_pace_is_that_of_the_time_with_enough_work() -> None:
    now = 0.0
    meter = Meter(lambda: now)
    for second in range(100):
        now = float(second)
        busy = second < 60
        meter.watch(2, busy)
        if busy and second % 5 == 4:
            meter.note(6.0, 10)  # 12 of them, 72 core-seconds in 60 s of two cores
    assert meter.pace(2) == pytest.approx(0.6, rel=0.02)
    assert Meter().pace(2) is None


def test_nothing_ends_before_its_longest_trajectory() -> None:
    assert seconds_to_finish(100.0, 80.0, Share(0.0, (), 50)) == LATENCY + 80.0
    assert seconds_to_finish(0.0, 80.0, Share(100.0, (), 2)) == 0.0
