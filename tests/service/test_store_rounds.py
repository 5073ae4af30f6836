"""Rounds of a goal in the store: what is placed, judged, frozen, and never shown before it is placed."""

from dataclasses import replace
from typing import Any, Literal

import pytest
from sqlalchemy import select

from support.batches import accumulator, result
from support.sweeps import keys_of
from sweepmill.sweep import Sweep
from sweepmill_service import schema
from sweepmill_service.store import Store
from sweepmill_service.store.rounds import Decision

ANSWER: dict[str, Any] = {"quantity": "p_c", "of": "i3", "round": 1, "value": 0.16, "below": 0.01, "met": False}
STARTING = (1, 3, 6, 8)  # of 5 values of the rate at each of two sizes


def goal_sweep(cap: int = 400) -> Sweep:
    return Sweep.parse(
        {
            "circuit": {"family": "hybrid-clifford", "sites": [8, 16], "layers": 8, "measurement_rate": [0.14, 0.18]},
            "observe": [
                {"name": "i3", "quantity": "tripartite-information"},
                {"name": "bits", "quantity": "record-bits"},
            ],
            "stop": {
                "trajectories": cap,
                "critical_point": {"of": "i3", "below": 0.01, "within": [0.12, 0.2], "step": 0.02},
            },
        }
    )


def sample_placed(store: Store, sweep: Sweep, number: int, start: int = 0) -> None:
    """Bring every open ensemble from ``start`` to ``number`` trajectories."""
    _, observations = keys_of(sweep)
    for one in store.open_ensembles(sweep.key):
        if one.cap >= number:
            first = max((reach.prefix for reach in one.reaches.values()), default=start)
            store.commit([result(one.key, observations, first, number - first, sweep.key)])


def decision(targets: dict[int, int] | None = None, by: Literal["error", "cap"] = "error") -> Decision:
    """Go on to these N, or settle."""
    met_by = {} if targets else dict.fromkeys(range(10), by)
    return Decision((ANSWER,), targets or {}, {}, met_by)


@pytest.fixture
def first_round(store: Store) -> Sweep:
    """A sweep whose places have their first 200 trajectories."""
    sweep = goal_sweep()
    store.submit(sweep, "ada")
    sample_placed(store, sweep, 200)
    return sweep


def test_only_the_values_that_are_written_are_sampled_first(store: Store) -> None:
    sweep = goal_sweep()
    store.submit(sweep, "ada")
    status = store.sweep_status(sweep.key)
    assert (status.ensembles, status.trajectories_cap) == (4, 800)
    assert [one.ordinal for one in store.progress(sweep.key).ensembles] == list(STARTING)
    assert {one.cap for one in store.open_ensembles(sweep.key)} == {200}


def test_the_evidence_is_the_total_at_the_number_of_the_round(store: Store, first_round: Sweep) -> None:
    known = store.evidence(first_round.key)
    assert [place.ordinal for place in known.places if place.judged] == list(STARTING)
    keys, (_, i3) = keys_of(first_round)
    for place in known.places:
        wanted = accumulator(keys[place.ordinal], i3, 0, 200).to_bytes() if place.judged else None
        assert place.accumulator == wanted


def test_a_round_raises_numbers_and_fills_empty_places(store: Store, first_round: Sweep) -> None:
    known = store.evidence(first_round.key)
    assert store.close_round(known, decision({1: 200, 3: 200, 6: 282, 8: 400, 2: 200})) is not None
    caps = {one.key: one.cap for one in store.open_ensembles(first_round.key)}
    keys, _ = keys_of(first_round)
    assert caps == {keys[1]: 200, keys[2]: 200, keys[3]: 200, keys[6]: 282, keys[8]: 400}
    status = store.sweep_status(first_round.key)
    assert (status.ensembles, status.settled, status.trajectories_cap) == (5, 0, 1282)
    assert [answer.value for answer in status.answers] == [0.16]
    (noted,) = store.rounds(first_round.key)
    assert (noted.number, noted.trajectories, noted.settled) == (1, 800, False)
    assert {place.ordinal: (place.judged, place.target) for place in noted.places}[2] == (0, 200)


def test_the_sweep_settles_at_the_numbers_it_was_judged_at(store: Store, first_round: Sweep) -> None:
    keys, observations = keys_of(first_round)
    # somebody else goes further on one of the ensembles
    store.commit([result(keys[1], observations, 200, 300, first_round.key)])
    outcome = store.close_round(store.evidence(first_round.key), decision())
    assert outcome is not None
    assert outcome.settled_sweeps == {first_round.key}
    assert store.sweep_status(first_round.key).state == "settled"
    entries = list(store.table_entries(first_round.key))
    assert [entry.ordinal for entry in entries] == [ordinal for ordinal in STARTING for _ in range(2)]
    for entry in entries:
        whole = accumulator(entry.ensemble_key, entry.observation_key, 0, 200)
        assert (entry.trajectories, entry.met_by, entry.frozen) == (200, "error", True)
        assert entry.accumulator == whole.to_bytes()


def test_a_place_that_another_sweep_samples_is_not_in_the_table_before_it_is_placed(
    store: Store, first_round: Sweep
) -> None:
    version = store.table_version(first_round.key)
    keys, observations = keys_of(first_round)
    store.commit([result(keys[2], observations, 0, 50, first_round.key)])
    assert store.table_version(first_round.key) == version
    assert {entry.ordinal for entry in store.table_entries(first_round.key)} == set(STARTING)


def test_totals_of_a_round_stay_until_it_is_judged(
    store: Store, first_round: Sweep, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr("sweepmill_service.store.judging.KEPT_BYTES", 10)
    store.close_round(store.evidence(first_round.key), decision(dict.fromkeys(STARTING, 282)))
    sample_placed(store, first_round, 282)
    keys, observations = keys_of(first_round)
    store.commit([result(keys[1], observations, 282, 100, first_round.key)])
    (place,) = (one for one in store.evidence(first_round.key).places if one.ordinal == 1)
    assert place.judged == 282
    assert place.accumulator == accumulator(keys[1], keys_of(first_round)[1][1], 0, 282).to_bytes()


def test_a_decision_on_old_evidence_changes_nothing(store: Store, first_round: Sweep) -> None:
    known = store.evidence(first_round.key)
    assert store.close_round(known, decision({1: 282})) is not None
    assert store.close_round(known, decision({1: 400})) is None
    assert len(store.rounds(first_round.key)) == 1
    store.withdraw(first_round.key, "ada")
    assert store.close_round(replace(known, rounds=1), decision({1: 400})) is None


def test_what_is_stuck_does_not_settle_and_the_rest_does(store: Store, first_round: Sweep) -> None:
    keys, _ = keys_of(first_round)
    with store.engine.begin() as connection:
        broken = schema.ensemble.update().where(schema.ensemble.c.key == keys[3])
        connection.execute(broken.values(stuck="broken", stuck_kind="failed"))
    assert store.close_round(store.evidence(first_round.key), decision()) is not None
    with store.engine.connect() as connection:
        members = schema.sweep_ensemble.c
        rows = connection.execute(select(members.ordinal, members.met_by).where(members.cap > 0))
        assert {row.ordinal: row.met_by for row in rows} == {1: "error", 3: None, 6: "error", 8: "error"}
    assert store.stick_sweeps([first_round.key]) == [first_round.key]


def test_a_sweep_that_comes_back_is_judged_from_where_it_was(store: Store, first_round: Sweep) -> None:
    store.close_round(store.evidence(first_round.key), decision(dict.fromkeys(STARTING, 282)))
    store.withdraw(first_round.key, "ada")
    store.submit(first_round, "ada")
    assert {one.cap for one in store.open_ensembles(first_round.key)} == {282}
    assert store.evidence(first_round.key).rounds == 1


def test_a_spent_budget_settles_at_the_last_round_and_leaves_out_what_was_placed_since(
    store: Store, first_round: Sweep
) -> None:
    assert not store.end_rounds(first_round.key, "spent")
    store.close_round(store.evidence(first_round.key), decision({1: 282, 3: 200, 6: 200, 8: 200, 2: 200}))
    keys, observations = keys_of(first_round)
    store.commit([result(keys[2], observations, 0, 150, first_round.key)])
    assert store.end_rounds(first_round.key, "spent")
    status = store.sweep_status(first_round.key)
    assert (status.state, status.ensembles, status.settled) == ("settled", 4, 4)
    assert [answer.reason for answer in status.answers] == ["spent"]
    assert {(entry.ordinal, entry.trajectories) for entry in store.table_entries(first_round.key)} == {
        (ordinal, 200) for ordinal in STARTING
    }
    assert [one.settled for one in store.rounds(first_round.key)] == [False, True]
