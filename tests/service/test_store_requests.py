"""Submitting, joining, withdrawing, amending, finding and listing."""

import json

import pytest
from sqlalchemy import Engine, insert, select

from support.batches import result
from support.databases import Statements
from support.sweeps import keys_of, small_sweep
from sweepmill.sweep import Sweep
from sweepmill_service import schema
from sweepmill_service.store import AmbiguousKey, ShortKey, Store, UnknownKey


def test_a_new_sweep_waits_with_all_its_ensembles(store: Store) -> None:
    sweep = small_sweep(rates=3)
    assert store.submit(sweep, "ada") == (sweep.key, True, False)
    status = store.sweep_status(sweep.key)
    assert (status.state, status.ensembles, status.trajectories_cap) == ("waiting", 3, 1200)
    assert (status.families, status.axes, status.names) == (
        ["hybrid-clifford"],
        ["measurement_rate"],
        ["bits", "entropy"],
    )
    assert Sweep.parse(json.loads(store.specification(sweep.key))).key == sweep.key
    page = store.progress(sweep.key)
    assert [one.ensemble for one in page.ensembles] == keys_of(sweep)[0]
    assert [one.parameters["measurement_rate"] for one in page.ensembles] == [0.1, 0.25, 0.4]


def test_the_same_sweep_from_another_owner_joins(store: Store) -> None:
    sweep = small_sweep()
    store.submit(sweep, "ada")
    assert store.submit(sweep, "bob") == (sweep.key, False, True)
    assert store.submit(sweep, "bob") == (sweep.key, False, False)
    assert [request.owner for request in store.sweep_status(sweep.key).requests] == ["ada", "bob"]


def test_a_sweep_lives_while_somebody_requests_it(store: Store) -> None:
    sweep = small_sweep()
    store.submit(sweep, "ada")
    store.submit(sweep, "bob")
    assert store.withdraw(sweep.key, "ada")
    assert not store.withdraw(sweep.key, "ada")
    assert store.sweep_status(sweep.key).state == "waiting"
    assert store.withdraw(sweep.key, "bob")
    assert store.sweep_status(sweep.key).state == "withdrawn"
    store.submit(sweep, "carol")
    assert store.sweep_status(sweep.key).state == "waiting"


def test_label_and_priority_belong_to_the_request(store: Store) -> None:
    sweep = small_sweep()
    store.submit(sweep, "ada")
    assert store.amend(sweep.key, "ada", label="first look", priority=5)
    assert store.amend(sweep.key, "ada", priority=7)
    assert not store.amend(sweep.key, "bob", priority=7)
    (request,) = store.sweep_status(sweep.key).requests
    assert (request.label, request.priority) == ("first look", 7)
    assert store.amend(sweep.key, "ada", label=None)
    assert store.sweep_status(sweep.key).requests[0].label is None


def test_every_change_of_requests_moves_the_counter_a_dispatcher_polls(store: Store) -> None:
    sweep = small_sweep()
    counters = [store.change_counter()]
    store.submit(sweep, "ada")
    counters.append(store.change_counter())
    store.amend(sweep.key, "ada", priority=1)
    counters.append(store.change_counter())
    store.withdraw(sweep.key, "ada")
    counters.append(store.change_counter())
    assert counters == sorted(set(counters))


def test_keys_may_be_shortened_to_an_unambiguous_prefix(store: Store, engine: Engine) -> None:
    sweep = small_sweep()
    store.submit(sweep, "ada")
    ensemble = keys_of(sweep)[0][0]
    assert store.find_sweep(sweep.key[:8]) == store.find_sweep(sweep.key) == sweep.key
    assert store.find_ensemble(ensemble[:12]) == ensemble
    twin = ensemble[:10] + ("0" if ensemble[10] != "0" else "1") + ensemble[11:]
    with engine.begin() as connection:
        row = dict(
            connection.execute(select(schema.ensemble).where(schema.ensemble.c.key == ensemble)).mappings().one()
        )
        connection.execute(insert(schema.ensemble), row | {"key": twin})
    with pytest.raises(AmbiguousKey) as caught:
        store.find_ensemble(ensemble[:10])
    assert caught.value.candidates == sorted([ensemble, twin])
    with pytest.raises(ShortKey):
        store.find_sweep(sweep.key[:7])
    with pytest.raises(ShortKey):
        store.find_sweep("%" * 10)
    with pytest.raises(UnknownKey):
        store.find_sweep("0" * 12)


def test_lists_are_paged_newest_first_and_filtered(store: Store) -> None:
    sweeps = [small_sweep(cap=cap) for cap in (10, 20, 30)]
    for owner, sweep in zip(("ada", "bob", "ada"), sweeps, strict=True):
        store.submit(sweep, owner)
    newest = [sweep.key for sweep in reversed(sweeps)]
    page = store.list_sweeps(limit=2)
    assert [one.key for one in page.sweeps] == newest[:2]
    rest = store.list_sweeps(limit=2, after=page.next)
    assert ([one.key for one in rest.sweeps], rest.next) == (newest[2:], None)
    assert [one.key for one in store.list_sweeps(owner="ada").sweeps] == [newest[0], newest[2]]
    assert [one.key for one in store.list_sweeps(family="hybrid-clifford", state="waiting").sweeps] == newest
    assert store.list_sweeps(family="hybrid").sweeps == store.list_sweeps(state="settled").sweeps == []


def test_progress_since_a_commit_shows_only_what_changed(store: Store) -> None:
    sweep = small_sweep(rates=4)
    store.submit(sweep, "ada")
    ensembles, observations = keys_of(sweep)
    before = store.commit_counter(sweep.key)
    store.commit([result(ensembles[2], observations, 0, 10, sweep.key)])
    changed = store.progress(sweep.key, since=before)
    assert [one.ordinal for one in changed.ensembles] == [2]
    assert changed.commit == store.commit_counter(sweep.key) > before
    assert store.progress(sweep.key, since=changed.commit).ensembles == []
    first = store.progress(sweep.key, limit=3)
    assert first.next == 2
    assert [one.ordinal for one in store.progress(sweep.key, limit=3, after=first.next).ensembles] == [3]


def test_requests_take_as_many_statements_for_many_ensembles_as_for_few(store: Store, statements: Statements) -> None:
    counts = []
    for rates in (2, 200):
        sweep = small_sweep(rates=rates)
        observations = keys_of(sweep)[1]
        calls = [
            lambda sweep=sweep: store.submit(sweep, "ada"),
            lambda sweep=sweep: store.submit(sweep, "bob"),
            lambda sweep=sweep: store.sweep_status(sweep.key),
            lambda: store.list_sweeps(),
            lambda sweep=sweep: store.progress(sweep.key),
            lambda sweep=sweep, observations=observations: store.already_sampled(keys_of(sweep)[0], observations),
            lambda sweep=sweep: store.table_version(sweep.key),
            lambda sweep=sweep: store.withdraw(sweep.key, "ada"),
        ]
        counts.append([_count(call, statements) for call in calls])
    assert counts[0] == counts[1]
    assert sum(counts[0]) <= 50


def _count(call: object, statements: Statements) -> int:
    statements.clear()
    call()  # type: ignore[operator]
    return len(statements)


def test_a_table_is_read_in_pages(store: Store, statements: Statements) -> None:
    sweep = small_sweep(rates=300)
    store.submit(sweep, "ada")
    ensembles, observations = keys_of(sweep)
    store.commit([result(one, observations, 0, 2, sweep.key) for one in ensembles])
    statements.clear()
    entries = list(store.table_entries(sweep.key))
    assert [entry.ensemble_key for entry in entries[::2]] == ensembles
    assert [entry.observation_key for entry in entries[:2]] == observations
    assert len(statements) <= 3 * (600 // 250 + 1) + 2  # SQLite's BEGIN counts


def test_an_ensemble_record_names_what_is_stored(store: Store) -> None:
    sweep = small_sweep(rates=1)
    store.submit(sweep, "ada")
    (one,), observations = keys_of(sweep)
    store.commit([result(one, observations, 0, 10, sweep.key, seconds=4.0)])
    record = store.ensemble_record(one)
    assert {item.key: item.trajectories for item in record.observations} == dict.fromkeys(observations, 10)
    assert (record.batches, record.core_seconds, record.family) == (2, 4.0, "hybrid-clifford")
    assert [(item.first, item.count, item.seconds) for item in record.latest] == [(0, 10, 2.0)] * 2
    assert store.seconds_per_trajectory([one]) == {one: 0.4}
    form, observed = store.normal_forms(one)
    assert form["sites"] == 8
    assert sorted(observed) == sorted(observations)


def test_unknown_keys_are_named(store: Store) -> None:
    for call in (
        store.sweep_status,
        store.specification,
        store.commit_counter,
        store.ensemble_record,
        store.table_entries,
    ):
        with pytest.raises(UnknownKey, match="0" * 64):
            call("0" * 64)
