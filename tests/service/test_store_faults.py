"""Faults, starts, sweeps that cannot proceed, and what a dispatcher reads at start."""

from sqlalchemy import select, update

from support.batches import result
from support.sweeps import keys_of, small_sweep
from sweepmill_service import schema
from sweepmill_service.plan.marks import Reach
from sweepmill_service.store import Store
from sweepmill_service.store.results import BatchFault, Start


def failed(ensemble: str, message: str = "no memory") -> BatchFault:
    return BatchFault(ensemble, 0, 10, "MemoryError", message, "line 1", "worker-1")


def test_the_last_attempt_makes_the_ensemble_stuck_and_then_the_sweep(store: Store) -> None:
    sweep = small_sweep(rates=2)
    store.submit(sweep, "ada")
    (one, other), _ = keys_of(sweep)
    assert [store.record_fault(failed(one), 3) for _ in range(3)] == [1, 2, 3]
    reason = "trajectories 0 to 9 failed 3 times, the last time with MemoryError: no memory"
    assert store.progress(sweep.key).ensembles[0].reason == reason
    assert [fault.attempt for fault in store.ensemble_record(one).faults] == [3, 2, 1]
    assert store.stick_sweeps([sweep.key]) == []
    for _ in range(3):
        store.record_fault(failed(other), 3)
    assert store.stick_sweeps([sweep.key]) == [sweep.key]
    status = store.sweep_status(sweep.key)
    assert (status.state, status.reason) == ("stuck", f"2 ensembles cannot proceed: {reason}")


def test_submitting_a_stuck_sweep_again_tries_its_failed_ensembles_again(store: Store) -> None:
    sweep = small_sweep(rates=1)
    store.submit(sweep, "ada")
    (one,), _ = keys_of(sweep)
    for _ in range(2):
        store.record_fault(failed(one), 2)
    store.stick_sweeps([sweep.key])
    store.submit(sweep, "ada")
    assert store.sweep_status(sweep.key).state == "waiting"
    (again,) = store.open_ensembles(sweep.key)
    assert (again.stuck, again.faults) == (False, {})
    assert store.record_fault(failed(one), 2) == 1
    assert store.open_ensembles(sweep.key)[0].faults == {0: 1}


def test_starts_are_logged_with_what_they_were_for(store: Store) -> None:
    sweep = small_sweep(rates=1)
    store.submit(sweep, "ada")
    (one,), observations = keys_of(sweep)
    store.log_starts([Start(one, 0, 10, tuple(observations), 1, sweep.key, "ada")], "run")
    store.log_starts([], "run")
    with store.engine.connect() as connection:
        (row,) = connection.execute(select(schema.start)).mappings().all()
    assert [row[name] for name in ("ensemble", "first", "count", "owner", "run")] == [one, 0, 10, "ada", "run"]


def test_a_dispatcher_reads_prefixes_marks_and_islands(store: Store) -> None:
    sweep = small_sweep(rates=2, cap=100)
    store.submit(sweep, "ada")
    (one, _), (first, second) = keys_of(sweep)
    store.commit([result(one, [first, second], 0, 10, sweep.key), result(one, [second], 20, 5, sweep.key)])
    loaded = store.open_ensembles(sweep.key)
    assert [item.key for item in loaded] == keys_of(sweep)[0]
    assert loaded[0].reaches == {first: Reach(10, frozenset()), second: Reach(10, frozenset())}
    assert loaded[0].islands == {second: {20: 5}}
    assert store.ranges(one) == (loaded[0].reaches, loaded[0].islands)
    (live,) = store.live_sweeps()
    assert (live.key, set(live.observations), live.requests[0].owner) == (sweep.key, {first, second}, "ada")


def test_a_superseded_revision_is_noticed(store: Store) -> None:
    sweep = small_sweep(rates=2)
    store.submit(sweep, "ada")
    assert not store.superseded(sweep.key)
    with store.engine.begin() as connection:
        connection.execute(update(schema.ensemble).values(revision=0))
    assert store.superseded(sweep.key)


def test_a_stuck_sweep_settles_if_another_one_samples_its_ensembles(store: Store) -> None:
    poor, rich = small_sweep(rates=1, cap=30, budget=1), small_sweep(rates=1, cap=60)
    store.submit(poor, "ada")
    store.submit(rich, "bob")
    assert store.stick_sweep(poor.key, "budget of 1 core-seconds spent")
    (one,), observations = keys_of(rich)
    store.commit([result(one, observations, 0, 30, rich.key, owner="bob")])
    status = store.sweep_status(poor.key)
    assert (status.state, status.reason, status.core_seconds) == ("settled", None, 0.0)
