"""The dispatcher with a real pool, on both databases."""

import json
import os
import signal
import threading
from collections.abc import Iterator
from contextlib import contextmanager
from functools import partial
from typing import Any

import pytest
from sqlalchemy import Engine, func, select, update
from sqlalchemy.exc import OperationalError

from support.databases import DatabaseMaker
from support.pools import Borrowed, QuickSettings, until, worker_pids
from support.sweeps import keys_of, small_sweep
from sweepmill.sweep import Sweep
from sweepmill_service import schema
from sweepmill_service.database import open_database
from sweepmill_service.dispatcher import AlreadyServed, Dispatcher
from sweepmill_service.pool import LocalPool
from sweepmill_service.store import Store
from sweepmill_worker.sample import sample


@contextmanager
def dispatching(store: Store, pool: LocalPool, **changes: Any) -> Iterator[Dispatcher]:
    """A dispatcher at work."""
    dispatcher = Dispatcher(store, Borrowed(pool), QuickSettings(**changes))
    dispatcher.start()
    try:
        yield dispatcher
    finally:
        dispatcher.stop(10)


def state(store: Store, sweep: Sweep) -> str:
    return store.sweep_status(sweep.key).state


def settle(store: Store, *sweeps: Sweep) -> None:
    for sweep in sweeps:
        until(partial(settled, store, sweep), f"sweep {sweep.key} settles")


def settled(store: Store, sweep: Sweep) -> bool:
    return state(store, sweep) == "settled"


def sampled_beyond(store: Store, sweep: Sweep, number: int) -> bool:
    return store.sweep_status(sweep.key).trajectories > number


def started(store: Store, ensemble: str) -> list[tuple[int, int]]:
    """Ranges handed to the pool, in order."""
    statement = select(schema.start.c.first, schema.start.c.count).where(schema.start.c.ensemble == ensemble)
    with store.engine.connect() as connection:
        return sorted((int(first), int(count)) for first, count in connection.execute(statement))


def check_exact(store: Store, sweep: Sweep) -> None:
    """Every total of a settled sweep is the one that sampling its first N trajectories at once gives."""
    for entry in store.table_entries(sweep.key):
        point = sweep.points[entry.ordinal]
        observation = next(o.observation for o in sweep.observations if o.observation.key == entry.observation_key)
        direct = sample(point.ensemble, [observation], 0, entry.trajectories).accumulators[entry.observation_key]
        assert entry.accumulator == direct.to_bytes()


def test_a_sweep_is_sampled_to_its_cap_exactly(store: Store, local_pool: LocalPool) -> None:
    sweep = small_sweep(rates=4, cap=3000)
    with dispatching(store, local_pool) as dispatcher:
        store.submit(sweep, "ada")
        settle(store, sweep)
        status = dispatcher.status()
        assert (status.ready, status.cores, status.window) == (True, 2, 4)
        assert status.batches_committed >= 4
    assert {entry.trajectories for entry in store.table_entries(sweep.key)} == {3000}
    check_exact(store, sweep)
    done = store.sweep_status(sweep.key)
    assert done.core_seconds == pytest.approx(done.requests[0].core_seconds)
    assert done.core_seconds > 0


def test_an_ensemble_of_two_sweeps_is_sampled_once(store: Store, local_pool: LocalPool) -> None:
    first, second = small_sweep(rates=1, cap=2000), small_sweep(rates=1, cap=3000)
    store.submit(first, "ada")
    store.submit(second, "bob")
    with dispatching(store, local_pool):
        settle(store, first, second)
    (ensemble,), _ = keys_of(first)
    ranges = started(store, ensemble)
    assert [start for start, _ in ranges] == [0, *(start + count for start, count in ranges)][:-1]
    assert sum(count for _, count in ranges) == 3000
    check_exact(store, first)
    check_exact(store, second)


def test_raising_the_cap_samples_only_what_is_missing_and_leaves_the_settled_table_alone(
    store: Store, local_pool: LocalPool
) -> None:
    low, high = small_sweep(rates=1, cap=500), small_sweep(rates=1, cap=1500)
    with dispatching(store, local_pool):
        store.submit(low, "ada")
        settle(store, low)
        table, digests = list(store.table_entries(low.key)), store.frozen_digests(low.key)
        store.submit(high, "ada")
        settle(store, high)
    assert sum(count for _, count in started(store, keys_of(low)[0][0])) == 1500
    assert list(store.table_entries(low.key)) == table
    assert store.frozen_digests(low.key) == digests


def test_a_standard_error_rule_is_met_at_a_rung(store: Store, local_pool: LocalPool) -> None:
    sweep = small_sweep(rates=2, cap=100_000, at_least=100, standard_error=[{"of": "bits", "below": 0.05}])
    with dispatching(store, local_pool):
        store.submit(sweep, "ada")
        settle(store, sweep)
    ladder = sweep.stop.ladder(100_000)
    for one in store.progress(sweep.key).ensembles:
        assert one.met_by == "error"
        assert one.trajectories in ladder
        assert one.trajectories < 10_000
    check_exact(store, sweep)


def test_a_sweep_whose_budget_is_spent_is_stuck_with_a_reason(store: Store, local_pool: LocalPool) -> None:
    sweep = small_sweep(rates=2, cap=10_000_000, budget=0.5)
    with dispatching(store, local_pool):
        store.submit(sweep, "ada")
        until(lambda: state(store, sweep) == "stuck", "the budget is spent")
    status = store.sweep_status(sweep.key)
    assert (status.reason or "").startswith("budget of 0.5 core-seconds spent")
    assert status.core_seconds >= 0.5
    assert 0 < status.trajectories < status.trajectories_cap


def searching(below: float = 0.03) -> Sweep:
    """A search for the crossing of two small sizes, with room for more values."""
    goal = {"of": "i3", "below": below, "within": [0.06, 0.3], "step": 0.02}
    return Sweep.parse(
        {
            "circuit": {
                "family": "hybrid-clifford",
                "sites": [8, 16],
                "layers": 16,
                "measurement_rate": [0.08, 0.14, 0.2, 0.26],
            },
            "observe": [{"name": "i3", "quantity": "tripartite-information"}],
            "stop": {"trajectories": 20_000, "critical_point": goal},
        }
    )


def test_a_goal_is_reached_in_rounds_and_its_table_is_exact(store: Store, local_pool: LocalPool) -> None:
    sweep = searching()
    with dispatching(store, local_pool):
        store.submit(sweep, "ada")
        settle(store, sweep)
    status, rounds = store.sweep_status(sweep.key), store.rounds(sweep.key)
    (answer,) = status.answers
    assert [one.number for one in rounds] == list(range(1, len(rounds) + 1))
    assert [one.settled for one in rounds] == [False] * (len(rounds) - 1) + [True]
    assert answer.met
    assert answer.error is not None
    assert answer.error <= 0.03
    ladder = sweep.stop.ladder(20_000)
    placed = store.progress(sweep.key).ensembles
    assert {one.trajectories for one in placed} <= set(ladder)
    assert {one.ordinal for one in placed} == {entry.ordinal for entry in store.table_entries(sweep.key)}
    assert len(placed) == status.ensembles == status.settled
    check_exact(store, sweep)


def test_a_dispatcher_that_starts_anew_goes_on_from_the_last_round(store: Store, local_pool: LocalPool) -> None:
    sweep = searching(below=0.02)
    with dispatching(store, local_pool):
        store.submit(sweep, "ada")
        until(lambda: len(store.rounds(sweep.key)) > 0, "a round is judged")
    before = store.rounds(sweep.key)
    with dispatching(store, local_pool):
        settle(store, sweep)
    assert store.rounds(sweep.key)[: len(before)] == before
    check_exact(store, sweep)


def test_a_law_is_judged_for_every_group_of_sizes(store: Store, local_pool: LocalPool) -> None:
    law = {"of": "half", "law": "logarithm", "coefficient": "a", "below": 0.15}
    circuit = {"family": "hybrid-clifford", "sites": [8, 12, 16, 24], "layers": 16, "measurement_rate": [0.16, 0.3]}
    sweep = Sweep.parse(
        {
            "circuit": circuit,
            "observe": [{"name": "half", "quantity": "entropy"}],
            "stop": {"trajectories": 2000, "law": law},
        }
    )
    with dispatching(store, local_pool):
        store.submit(sweep, "ada")
        settle(store, sweep)
    answers = store.sweep_status(sweep.key).answers
    assert [answer.where for answer in answers] == [{"measurement_rate": 0.16}, {"measurement_rate": 0.3}]
    for one in store.progress(sweep.key).ensembles:
        met = answers[0 if one.parameters["measurement_rate"] == 0.16 else 1].met
        assert one.met_by == ("error" if met else "cap")
    check_exact(store, sweep)


def test_withdrawing_stops_feeding_and_keeps_what_was_sampled(store: Store, local_pool: LocalPool) -> None:
    sweep = small_sweep(rates=1, cap=10_000_000)
    with dispatching(store, local_pool) as dispatcher:
        store.submit(sweep, "ada")
        until(lambda: store.sweep_status(sweep.key).trajectories > 0, "sampling began")
        store.withdraw(sweep.key, "ada")
        dispatcher.wake()
        until(lambda: dispatcher.status().in_flight == 0, "what was in flight ended")
        kept = store.sweep_status(sweep.key)
        assert (kept.state, dispatcher.seconds_left(sweep.key)) == ("withdrawn", None)
        assert kept.trajectories < kept.trajectories_cap
        sampled = store.already_sampled(*keys_of(sweep))
        assert min(sampled.values()) > 0


def test_a_batch_that_always_fails_leaves_its_ensemble_stuck_and_the_rest_goes_on(
    store: Store, local_pool: LocalPool
) -> None:
    sweep = small_sweep(rates=2, cap=100)
    store.submit(sweep, "ada")
    (broken, _), _ = keys_of(sweep)
    with store.engine.begin() as connection:
        where = schema.ensemble.c.key == broken
        form = json.loads(connection.scalar(select(schema.ensemble.c.normal_form).where(where)) or "")
        changed = json.dumps(form | {"layers": 1})  # less than a unit cell: refused by the worker
        connection.execute(update(schema.ensemble).where(where).values(normal_form=changed))
    with dispatching(store, local_pool, attempts=2):
        until(lambda: state(store, sweep) == "stuck", "the sweep is stuck")
    first, second = store.progress(sweep.key).ensembles
    assert "failed 2 times, the last time with ValueError: " in (first.reason or "")
    assert (second.met_by, second.trajectories) == ("cap", 100)
    assert [fault.attempt for fault in store.ensemble_record(broken).faults] == [2, 1]
    assert store.ensemble_record(broken).faults[0].traceback


def test_a_worker_killed_while_computing_is_a_fault_of_its_batch_which_is_tried_again(
    store: Store, local_pool: LocalPool
) -> None:
    sweep = small_sweep(rates=1, cap=800_000)
    with dispatching(store, local_pool, first_batch_seconds=1.0, batch_seconds=1.0) as dispatcher:
        store.submit(sweep, "ada")
        until(lambda: sum(bool(w.computing) for w in dispatcher.status().workers) == 2, "both workers compute")
        before = worker_pids(local_pool)
        os.kill(next(iter(before.values())), signal.SIGKILL)
        settle(store, sweep)
    faults = store.ensemble_record(keys_of(sweep)[0][0]).faults
    assert [fault.kind for fault in faults] == ["worker lost"]
    assert sum(count for _, count in started(store, keys_of(sweep)[0][0])) > 800_000
    until(lambda: len(local_pool.workers()) == 2, "the worker is replaced")


def test_a_result_of_other_versions_is_refused_by_name(
    store: Store, local_pool: LocalPool, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr("sweepmill_service.flights.difference", lambda _: "has numpy 1.0, the service 2.0")
    sweep = small_sweep(rates=1, cap=100)
    with dispatching(store, local_pool):
        store.submit(sweep, "ada")
        until(lambda: state(store, sweep) == "stuck", "the sweep is stuck")
    assert "versions differ: the worker has numpy 1.0, the service 2.0" in (store.sweep_status(sweep.key).reason or "")


def test_a_superseded_sweep_is_stuck_at_start(store: Store, local_pool: LocalPool) -> None:
    sweep = small_sweep(rates=1)
    store.submit(sweep, "ada")
    with store.engine.begin() as connection:
        connection.execute(update(schema.ensemble).values(revision=0))
    with dispatching(store, local_pool):
        until(lambda: state(store, sweep) == "stuck", "the sweep is stuck")
    assert store.sweep_status(sweep.key).reason == "revision superseded, submit again"


def test_a_dispatcher_that_stops_and_one_that_starts_sample_nothing_twice(store: Store, local_pool: LocalPool) -> None:
    sweep = small_sweep(rates=3, cap=30_000)
    store.submit(sweep, "ada")
    for _ in range(2):
        before = store.sweep_status(sweep.key).trajectories
        with dispatching(store, local_pool, first_batch_seconds=0.005, batch_seconds=0.005):
            until(partial(sampled_beyond, store, sweep, before), "sampling goes on")
    with dispatching(store, local_pool):
        settle(store, sweep)
    for ensemble in keys_of(sweep)[0]:
        assert sum(count for _, count in started(store, ensemble)) == 30_000
    check_exact(store, sweep)


def test_a_lost_database_pauses_the_dispatcher_which_goes_on_by_itself(
    store: Store, local_pool: LocalPool, monkeypatch: pytest.MonkeyPatch
) -> None:
    sweep = small_sweep(rates=2, cap=20_000)
    full = threading.Event()
    commit = store.commit

    def commit_or_fail(results: Any) -> Any:
        if full.is_set():
            raise OperationalError("INSERT", {}, Exception("database or disk is full"))
        return commit(results)

    monkeypatch.setattr(store, "commit", commit_or_fail)
    with dispatching(store, local_pool) as dispatcher:
        full.set()
        store.submit(sweep, "ada")
        until(lambda: "database or disk is full" in (dispatcher.status().reason or ""), "the dispatcher pauses")
        assert not dispatcher.status().ready
        full.clear()
        settle(store, sweep)
        until(lambda: dispatcher.status().ready, "the dispatcher works again")
    for ensemble in keys_of(sweep)[0]:
        assert sum(count for _, count in started(store, ensemble)) == 20_000


def test_a_second_dispatcher_is_refused_on_sqlite_and_waits_on_postgres(
    make_database: DatabaseMaker, local_pool: LocalPool, backend: str
) -> None:
    with make_database() as url:
        engines: list[Engine] = [open_database(url), open_database(url)]
        first, second = map(Store, engines)
        with dispatching(first, local_pool) as active:
            until(lambda: active.status().ready, "the first is active")
            waiting = Dispatcher(second, Borrowed(local_pool), QuickSettings())
            if backend == "sqlite":
                with pytest.raises(AlreadyServed):
                    waiting.start()
            else:
                waiting.start()
                until(lambda: waiting.status().reason == "standby: another dispatcher is active", "it waits")
                active.stop(5)
                until(lambda: waiting.status().ready, "the standby takes over")
            waiting.stop(5)
        for engine in engines:
            engine.dispose()


def test_more_starts_than_batches_are_at_most_a_window(store: Store, local_pool: LocalPool) -> None:
    sweep = small_sweep(rates=2, cap=10_000_000)
    with dispatching(store, local_pool) as dispatcher:
        store.submit(sweep, "ada")
        until(lambda: dispatcher.status().batches_committed >= 3, "some batches are stored")
        dispatcher.stop(0)
    with store.engine.connect() as connection:
        starts = connection.scalar(select(func.count()).select_from(schema.start)) or 0
        batches = connection.scalar(select(func.count()).select_from(schema.batch)) or 0
    assert 0 <= starts - batches // 2 <= 4
