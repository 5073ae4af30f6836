"""Rules judged at rungs, frozen totals, ensembles shared by sweeps."""

import hashlib
from typing import Any

import pytest
from sqlalchemy import select

from support.batches import accumulator, result
from support.databases import Statements
from support.sweeps import keys_of, small_sweep
from sweepmill.accumulate import Accumulator
from sweepmill.ladder import rungs
from sweepmill.sweep import Sweep
from sweepmill_service import schema
from sweepmill_service.store import Store

# The invented values are uniform on 0 … 6 over a scale of two layers: variance 1, standard error 1 / sqrt(N).
RULE: dict[str, Any] = {"standard_error": [{"of": "bits", "below": 0.095}]}


def sample_to(store: Store, sweep: Sweep, *ends: int, start: int = 0) -> None:
    """Commit batches of the first ensemble that end at the given N."""
    (one, *_), observations = keys_of(sweep)
    for end in ends:
        store.commit([result(one, observations, start, end - start, sweep.key)])
        start = end


def marks(store: Store, ensemble: str) -> list[int]:
    with store.engine.connect() as connection:
        where = schema.mark.c.ensemble == ensemble
        return sorted(set(connection.scalars(select(schema.mark.c.trajectories).where(where))))


def test_an_ensemble_without_rules_settles_at_its_cap(store: Store) -> None:
    sweep = small_sweep(rates=2, cap=30)
    store.submit(sweep, "ada")
    sample_to(store, sweep, 29)
    assert store.progress(sweep.key).ensembles[0].met_by is None
    sample_to(store, sweep, 30, start=29)
    first, second = store.progress(sweep.key).ensembles
    assert (first.met_by, first.trajectories, second.met_by) == ("cap", 30, None)
    assert store.sweep_status(sweep.key).state == "sampling"
    _, observations = keys_of(sweep)
    store.commit([result(second.ensemble, observations, 0, 30, sweep.key)])
    status = store.sweep_status(sweep.key)
    assert (status.state, status.settled, status.trajectories) == ("settled", 2, 60)


def test_the_rule_is_judged_at_rungs_only(store: Store) -> None:
    sweep = small_sweep(rates=1, cap=400, at_least=50, **RULE)
    store.submit(sweep, "ada")
    ladder = rungs(50, 400)
    assert ladder[:6] == (50, 59, 70, 84, 100, 118)
    (one,), observations = keys_of(sweep)
    verdicts = []
    ends = (49, 50, 55, 59, 70, 84, 99, 100, 118)
    for start, end in zip((0, *ends), ends, strict=False):
        outcome = store.commit([result(one, observations, start, end - start, sweep.key)])
        verdicts += [(verdict.judged, verdict.met_by) for verdict in outcome.verdicts]
    # Judged once per rung, at the commit that reaches it; settled by error near N = (1 / 0.095)^2 = 111.
    assert [number for number, _ in verdicts] == [50, 59, 70, 84, 100, 118]
    assert [by for _, by in verdicts] == [None, None, None, None, None, "error"]


def test_a_batch_beyond_a_rung_that_folds_in_one_commit_is_judged_at_the_rung(store: Store) -> None:
    sweep = small_sweep(rates=1, cap=400, at_least=118, **RULE)
    store.submit(sweep, "ada")
    (one,), observations = keys_of(sweep)
    batches = [(0, 100), (100, 18), (118, 22), (140, 260)]
    outcome = store.commit([result(one, observations, *place, sweep.key) for place in reversed(batches)])
    assert [(verdict.judged, verdict.met_by) for verdict in outcome.verdicts] == [(118, "error")]
    entries = list(store.table_entries(sweep.key))
    assert {entry.trajectories for entry in entries} == {118}
    for entry in entries:
        whole = accumulator(one, entry.observation_key, 0, 118)
        assert entry.accumulator == whole.to_bytes()
        assert entry.digest == whole.digest


def test_small_totals_at_rungs_that_were_not_met_are_kept_for_later_sweeps(store: Store) -> None:
    strict = small_sweep(rates=1, cap=400, at_least=50, standard_error=[{"of": "bits", "below": 0.001}])
    store.submit(strict, "ada")
    (one,), _ = keys_of(strict)
    sample_to(store, strict, *rungs(50, 400))
    assert marks(store, one) == list(rungs(50, 400))
    assert store.progress(strict.key).ensembles[0].met_by == "cap"
    lax = small_sweep(rates=1, cap=400, at_least=50, **RULE)
    store.submit(lax, "bob")
    store.judge(store.due_ensembles(lax.key))
    (settled,) = store.progress(lax.key).ensembles
    assert (settled.trajectories, settled.met_by) == (118, "error")  # as if it had come first


def test_large_totals_at_rungs_that_were_not_met_are_not_kept(store: Store, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("sweepmill_service.store.judging.KEPT_BYTES", 100)
    sweep = small_sweep(rates=1, cap=400, at_least=50, standard_error=[{"of": "bits", "below": 0.001}])
    store.submit(sweep, "ada")
    (one,), _ = keys_of(sweep)
    sample_to(store, sweep, *rungs(50, 400)[:8])
    assert marks(store, one) == []  # 168 so far
    sample_to(store, sweep, *rungs(50, 400)[8:], start=rungs(50, 400)[7])
    assert marks(store, one) == [200, 400]  # a common mark, and the N it settled at
    assert store.progress(sweep.key).ensembles[0].met_by == "cap"


def test_a_settled_table_is_the_same_when_another_sweep_goes_further(store: Store) -> None:
    short, long = small_sweep(rates=1, cap=30), small_sweep(rates=1, cap=90)
    store.submit(short, "ada")
    sample_to(store, short, 30)
    version, entries = store.table_version(short.key), list(store.table_entries(short.key))
    digests = store.frozen_digests(short.key)
    store.submit(long, "bob")
    assert store.sweep_status(long.key).trajectories == 30
    sample_to(store, long, 90, start=30)
    assert store.sweep_status(long.key).state == "settled"
    assert list(store.table_entries(short.key)) == entries
    assert store.table_version(short.key) == version
    assert store.frozen_digests(short.key) == digests
    assert {entry.trajectories for entry in store.table_entries(long.key)} == {90}


def test_the_frozen_digest_names_observations_numbers_and_totals(store: Store) -> None:
    sweep = small_sweep(rates=1, cap=30)
    store.submit(sweep, "ada")
    sample_to(store, sweep, 30)
    (one,), observations = keys_of(sweep)
    lines = sorted(f"{key}:30:{accumulator(one, key, 0, 30).digest}" for key in observations)
    assert store.frozen_digests(sweep.key) == {one: hashlib.sha256("\n".join(lines).encode()).hexdigest()}


def test_a_sweep_submitted_after_its_trajectories_were_sampled_settles_without_sampling(store: Store) -> None:
    long, short = small_sweep(rates=1, cap=90), small_sweep(rates=1, cap=40)
    store.submit(long, "ada")
    sample_to(store, long, 30, 90)
    store.submit(short, "ada")
    assert store.sweep_status(short.key).trajectories == 40
    store.judge(store.due_ensembles(short.key))
    # No total was kept at 40, so the smallest N at which the totals are known serves.
    assert store.progress(short.key).ensembles[0].trajectories == 90
    assert store.sweep_status(short.key).state == "settled"


def test_a_smaller_cap_asked_for_later_is_met_at_a_common_mark_near_it(store: Store) -> None:
    long, short = small_sweep(rates=1, cap=900), small_sweep(rates=1, cap=150)
    store.submit(long, "ada")
    sample_to(store, long, 200, 800, 900)
    (one,), _ = keys_of(long)
    assert marks(store, one) == [200, 800, 900]
    store.submit(short, "bob")
    store.judge(store.due_ensembles(short.key))
    assert store.progress(short.key).ensembles[0].trajectories == 200


def test_an_observation_added_later_waits_for_the_common_number(store: Store) -> None:
    sweep = small_sweep(rates=1, cap=40)
    store.submit(sweep, "ada")
    (one,), (first, second) = keys_of(sweep)
    store.commit([result(one, [first], 0, 50, sweep.key)])
    store.commit([result(one, [second], 0, 40, sweep.key)])
    assert store.progress(sweep.key).ensembles[0].met_by is None
    store.commit([result(one, [first], 50, 10, sweep.key)])
    assert marks(store, one) == [50]
    store.commit([result(one, [second], 40, 10, sweep.key)])
    assert store.progress(sweep.key).ensembles[0].met_by == "cap"
    for entry in store.table_entries(sweep.key):
        assert entry.accumulator is not None
        assert entry.trajectories == Accumulator.from_bytes(entry.accumulator).count == 50


def test_a_withdrawn_sweep_keeps_what_was_sampled_and_comes_back(store: Store) -> None:
    sweep = small_sweep(rates=1, cap=40)
    store.submit(sweep, "ada")
    sample_to(store, sweep, 20)
    assert store.withdraw(sweep.key, "ada")
    assert store.sweep_status(sweep.key).state == "withdrawn"
    assert store.live_sweeps() == []
    sample_to(store, sweep, 40, start=20)  # what was in flight is stored
    again = store.submit(sweep, "ada")
    assert (again.created, again.joined) == (False, True)
    store.judge(store.due_ensembles(sweep.key))
    assert store.sweep_status(sweep.key).state == "settled"


def test_a_cap_raised_by_another_sweep_needs_only_what_is_missing(store: Store) -> None:
    short, long = small_sweep(rates=1, cap=30), small_sweep(rates=1, cap=90)
    store.submit(short, "ada")
    sample_to(store, short, 30)
    store.submit(long, "ada")
    (open_ensemble,) = store.open_ensembles(long.key)
    assert {reach.prefix for reach in open_ensemble.reaches.values()} == {30}
    assert store.already_sampled(*keys_of(long)) == {(open_ensemble.key, key): 30 for key in keys_of(long)[1]}


def test_judging_many_ensembles_takes_the_same_number_of_statements_as_few(
    store: Store, statements: Statements
) -> None:
    counts = []
    for rates in (2, 60):
        sweep = small_sweep(rates=rates, cap=100, at_least=20, standard_error=[{"of": "bits", "below": 0.001}])
        store.submit(sweep, "ada")
        ensembles, observations = keys_of(sweep)
        statements.clear()
        store.commit([result(one, observations, 0, 20, sweep.key) for one in ensembles])
        counts.append(len(statements))
    assert counts[0] == counts[1] <= 40
