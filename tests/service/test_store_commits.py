"""Storing results, against a model that merges the values themselves."""

from typing import Any

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from sqlalchemy import Engine, func, select

from support.batches import accumulator, result
from support.databases import Statements
from support.sweeps import keys_of, small_sweep
from sweepmill_service import schema
from sweepmill_service.store import Store
from sweepmill_service.store.results import BatchResult


def totals(store: Store, ensemble: str) -> dict[str, tuple[int, bytes]]:
    with store.engine.connect() as connection:
        rows = connection.execute(select(schema.total).where(schema.total.c.ensemble == ensemble))
        return {row.observation: (row.trajectories, row.accumulator) for row in rows}


def test_a_batch_extends_the_prefix_and_drops_its_accumulators(store: Store) -> None:
    sweep = small_sweep()
    store.submit(sweep, "ada")
    (one, *_), observations = keys_of(sweep)
    outcome = store.commit([result(one, observations, 0, 10, sweep.key)])
    assert {pair: reach.prefix for pair, reach in outcome.reaches.items()} == {(one, key): 10 for key in observations}
    for key in observations:
        assert totals(store, one)[key] == (10, accumulator(one, key, 0, 10).to_bytes())
    with store.engine.connect() as connection:
        assert connection.scalars(select(schema.batch.c.accumulator)).all() == [None, None]


def test_a_gap_waits_and_closing_it_folds_everything(store: Store) -> None:
    sweep = small_sweep()
    store.submit(sweep, "ada")
    (one, *_), observations = keys_of(sweep)
    store.commit([result(one, observations, 10, 5, sweep.key), result(one, observations, 15, 7, sweep.key)])
    assert totals(store, one) == {}
    assert store.progress(sweep.key).ensembles[0].trajectories == 0
    store.commit([result(one, observations, 0, 10, sweep.key)])
    for key in observations:
        assert totals(store, one)[key] == (22, accumulator(one, key, 0, 22).to_bytes())
    with store.engine.connect() as connection:
        kept = select(func.count()).where(schema.batch.c.accumulator.is_not(None))
        assert connection.scalar(kept) == 0
    assert store.progress(sweep.key).ensembles[0].trajectories == 22


def test_a_duplicate_changes_nothing_and_is_charged_once(store: Store) -> None:
    sweep = small_sweep()
    store.submit(sweep, "ada")
    (one, *_), observations = keys_of(sweep)
    batch = result(one, observations, 0, 10, sweep.key, seconds=3.0)
    store.commit([batch, result(one, observations, 20, 5, sweep.key, seconds=2.0)])
    before = store.sweep_status(sweep.key)
    again = store.commit([batch, result(one, observations, 20, 5, sweep.key)])
    assert {refused.why for refused in again.refused} == {"duplicate"}
    assert store.sweep_status(sweep.key) == before
    assert before.core_seconds == before.requests[0].core_seconds == 5.0


def test_an_overlapping_batch_is_discarded(store: Store) -> None:
    sweep = small_sweep()
    store.submit(sweep, "ada")
    (one, *_), observations = keys_of(sweep)
    store.commit([result(one, observations, 0, 10, sweep.key), result(one, observations, 20, 10, sweep.key)])
    overlaps = [(5, 10), (0, 7), (15, 6), (22, 2), (29, 4), (10, 40)]
    outcome = store.commit([result(one, observations, *place, sweep.key) for place in overlaps])
    assert [refused.why for refused in outcome.refused] == ["overlap"] * 12
    assert totals(store, one)[observations[0]][0] == 10


def test_other_values_for_the_same_batch_stop_the_ensemble_loudly(store: Store) -> None:
    sweep = small_sweep(rates=1)
    store.submit(sweep, "ada")
    (one,), observations = keys_of(sweep)
    store.commit([result(one, observations, 0, 10, sweep.key)])
    other = result("0" * 64, observations, 0, 10, sweep.key)
    forged = BatchResult(**(vars(other) | {"ensemble": one}))
    outcome = store.commit([forged])
    assert outcome.stuck[one].startswith("determinism fault: trajectories 0 to 9 gave other values on worker-1")
    assert totals(store, one)[observations[0]] == (10, accumulator(one, observations[0], 0, 10).to_bytes())
    assert store.stick_sweeps([sweep.key]) == [sweep.key]
    status = store.sweep_status(sweep.key)
    assert status.state == "stuck"
    assert "determinism fault" in (status.reason or "")
    store.submit(sweep, "ada")
    assert "determinism fault" in (store.ensemble_record(one).reason or "")


def test_progress_is_the_shortest_prefix_of_the_observations(store: Store) -> None:
    sweep = small_sweep(cap=50)
    store.submit(sweep, "ada")
    (one, *_), (first, second) = keys_of(sweep)
    store.commit([result(one, [first], 0, 60, sweep.key)])
    assert store.sweep_status(sweep.key).trajectories == 0
    store.commit([result(one, [second], 0, 20, sweep.key)])
    assert store.sweep_status(sweep.key).trajectories == 20
    assert store.sweep_status(sweep.key).state == "sampling"


def test_a_commit_takes_the_same_number_of_statements_for_one_result_and_for_many(
    store: Store, statements: Statements
) -> None:
    sweep = small_sweep(rates=100)
    store.submit(sweep, "ada")
    ensembles, observations = keys_of(sweep)
    counts = []
    for chosen in (ensembles[:1], ensembles[1:]):
        statements.clear()
        store.commit([result(one, observations, 0, 4, sweep.key) for one in chosen])
        counts.append(len(statements))
    assert counts[0] == counts[1] <= 30


Task = tuple[int, int, tuple[int, ...], bool, bool]
# One task: (first, count, which observations, whether a kill comes before the commit of its group)
TASKS = st.lists(
    st.tuples(
        st.integers(0, 12), st.integers(1, 5), st.sampled_from([(0,), (1,), (0, 1)]), st.booleans(), st.booleans()
    ),
    max_size=25,
)


class Model:
    """Ranges accepted so far, and what must have been folded."""

    def __init__(self) -> None:
        self.ranges: set[tuple[int, int]] = set()

    def offer(self, first: int, count: int) -> None:
        """Accept unless it overlaps."""
        if all(first + count <= start or first >= start + length for start, length in self.ranges):
            self.ranges.add((first, count))

    @property
    def prefix(self) -> int:
        """Trajectories covered from 0 without a gap."""
        end = 0
        for first, count in sorted(self.ranges):
            end = first + count if first == end else end
        return end


@pytest.fixture
def examples(backend: str) -> int:
    return 60 if backend == "sqlite" else 15


def test_totals_are_those_of_the_covered_prefix_whatever_the_order_gaps_overlaps_and_kills(
    engine: Engine, examples: int
) -> None:
    number = iter(range(10_000))

    @settings(max_examples=examples, deadline=None, suppress_health_check=[HealthCheck.too_slow], derandomize=True)
    @given(TASKS)
    def check(tasks: list[Task]) -> None:
        _check_prefixes(Store(engine), next(number), tasks)

    check()


def _check_prefixes(store: Store, replicate: int, tasks: list[Task]) -> None:
    sweep = small_sweep(rates=1, cap=100_000 + replicate, sites=8)
    sweep = type(sweep).parse(_replicated(sweep.normalized(), replicate))
    store.submit(sweep, "ada")
    (one,), observations = keys_of(sweep)
    models = {key: Model() for key in observations}
    group: list[BatchResult] = []
    for first, count, which, killed, flush in tasks:
        chosen = [observations[index] for index in which]
        group.append(result(one, chosen, first, count, sweep.key))
        if killed:
            group.clear()
        elif flush:
            _commit(store, group, models)
    _commit(store, group, models)
    found = totals(store, one)
    for key, model in models.items():
        if model.prefix:
            assert found[key] == (model.prefix, accumulator(one, key, 0, model.prefix).to_bytes())
        else:
            assert key not in found
    assert store.sweep_status(sweep.key).trajectories == min(model.prefix for model in models.values())


def _replicated(form: dict[str, Any], replicate: int) -> dict[str, Any]:
    return form | {"circuit": [block | {"replicate": replicate} for block in form["circuit"]]}


def _commit(store: Store, group: list[BatchResult], models: dict[str, Model]) -> None:
    for one in group:
        for key in one.accumulators:
            models[key].offer(one.first, one.count)
    if group:
        store.commit(group)
    group.clear()
