"""Kept values in the store: with their batch or not at all, never twice, never changed."""

from dataclasses import replace

import numpy as np
import pytest
from alembic import command
from sqlalchemy import Engine, MetaData, delete, func, select
from sqlalchemy.exc import IntegrityError

from support.batches import result, values
from support.databases import DatabaseMaker
from support.sweeps import keys_of, small_sweep
from sweepmill.sweep import Sweep
from sweepmill_service import schema
from sweepmill_service.database import open_database, writing
from sweepmill_service.migrations import migrate, schema_is_current
from sweepmill_service.migrations.run import _configuration
from sweepmill_service.store import Store
from sweepmill_service.store.results import Kept
from sweepmill_service.store.values import MissingValues
from sweepmill_worker.kept import pack, unpack


def keeping(cap: int = 400) -> Sweep:
    """The small sweep with the values of both observations."""
    form = small_sweep(cap=cap).normalized()
    return Sweep.parse(form | {"observe": [{**item, "keep_values": True} for item in form["observe"]]})


def stored(store: Store, ensemble: str, observation: str, number: int) -> list[list[int]]:
    """Values [trajectories, coordinates] as they are served."""
    chunks = store.kept_chunks(ensemble, observation, number)
    return [row for chunk in chunks for row in unpack(chunk.data)[:, :, 0].tolist()]


def test_values_come_back_in_order_however_their_batches_arrived(store: Store) -> None:
    sweep = keeping()
    store.submit(sweep, "ada")
    (one, *_), observations = keys_of(sweep)
    for first, count in ((25, 5), (0, 10), (10, 15)):
        store.commit([result(one, observations, first, count, sweep.key, kept=True)])
    for key in observations:
        (entry, *others) = store.kept_entries(sweep.key, key)
        assert (entry.ensemble_key, entry.trajectories, entry.met_by) == (one, 30, None)
        assert [other.trajectories for other in others] == [0, 0]
        assert stored(store, one, key, 30) == values(one, key, 0, 30).tolist()


def test_values_beyond_a_gap_wait_until_it_closes(store: Store) -> None:
    sweep = keeping()
    store.submit(sweep, "ada")
    (one, *_), observations = keys_of(sweep)
    store.commit([result(one, observations, 10, 5, sweep.key, kept=True)])
    assert store.kept_entries(sweep.key, observations[0])[0].trajectories == 0
    store.commit([result(one, observations, 0, 10, sweep.key, kept=True)])
    assert store.kept_entries(sweep.key, observations[0])[0].trajectories == 15


def test_storing_values_twice_changes_nothing_and_other_values_are_a_determinism_fault(store: Store) -> None:
    sweep = keeping()
    store.submit(sweep, "ada")
    (one, *_), observations = keys_of(sweep)
    batch = result(one, observations, 0, 10, sweep.key, kept=True)
    store.commit([batch])
    assert {refused.why for refused in store.commit([batch]).refused} == {"duplicate"}
    swapped = values(one, observations[0], 0, 10)[[1, 0, *range(2, 10)]]  # the sums are the same
    forged = replace(batch, values={**batch.values, observations[0]: Kept(*pack(swapped))})
    outcome = store.commit([forged])
    assert {(refused.observation, refused.why) for refused in outcome.refused} == {
        (observations[0], "determinism"),
        (observations[1], "duplicate"),
    }
    assert set(outcome.stuck) == {one}
    assert stored(store, one, observations[0], 10) == values(one, observations[0], 0, 10).tolist()


def test_a_settled_sweep_is_served_the_trajectories_it_settled_with(store: Store) -> None:
    shorter, longer = keeping(cap=20), keeping(cap=50)
    for sweep in (shorter, longer):
        store.submit(sweep, "ada")
    (one, *_), observations = keys_of(shorter)
    store.commit([result(one, observations, 0, 20, shorter.key, kept=True)])
    before = store.kept_entries(shorter.key, observations[0])[0]
    store.commit([result(one, observations, 20, 30, longer.key, kept=True)])
    after = store.kept_entries(shorter.key, observations[0])[0]
    assert before == after
    assert (after.trajectories, after.met_by) == (20, "cap")
    assert after.digest is not None
    assert store.kept_entries(longer.key, observations[0])[0].trajectories == 50
    assert stored(store, one, observations[0], 20) == values(one, observations[0], 0, 20).tolist()


def test_many_chunks_are_read_in_pages(store: Store) -> None:
    sweep = keeping()
    store.submit(sweep, "ada")
    (one, *_), observations = keys_of(sweep)
    store.commit([result(one, observations, first, 3, sweep.key, kept=True) for first in range(0, 90, 3)])
    assert stored(store, one, observations[0], 90) == values(one, observations[0], 0, 90).tolist()


def test_a_batch_and_its_values_are_stored_together_or_not_at_all(store: Store) -> None:
    sweep = keeping()
    store.submit(sweep, "ada")
    (one, *_), observations = keys_of(sweep)
    batch = result(one, observations, 0, 10, sweep.key, kept=True)
    nothing: bytes = None  # type: ignore[assignment]
    broken = replace(batch, values={**batch.values, observations[1]: Kept(nothing, "0" * 64)})
    with pytest.raises(IntegrityError):
        store.commit([broken])
    with store.engine.connect() as connection:
        assert [connection.scalar(select(func.count()).select_from(t)) for t in (schema.batch, schema.kept)] == [0, 0]


def test_values_that_somebody_removed_are_missed(store: Store) -> None:
    sweep = keeping()
    store.submit(sweep, "ada")
    (one, *_), observations = keys_of(sweep)
    store.commit([result(one, observations, first, 10, sweep.key, kept=True) for first in (0, 10, 20)])
    with writing(store.engine).begin() as connection:
        connection.execute(delete(schema.kept).where(schema.kept.c.first == 10))
    with pytest.raises(MissingValues, match="from trajectory 10 on"):
        stored(store, one, observations[0], 30)


def first_revision(url: str, source: Engine) -> Engine:
    """A database as it was before there were kept values, with the rows of another one."""
    engine = open_database(url)
    with writing(engine).begin() as connection:
        command.upgrade(_configuration(connection), "0001")
        old = MetaData()
        old.reflect(connection)
        for table in old.sorted_tables:
            if table.name != "alembic_version":
                connection.execute(table.delete())
                columns = [schema.metadata.tables[table.name].c[column.name] for column in table.c]
                with source.connect() as reading:
                    rows = [dict(row._mapping) for row in reading.execute(select(*columns))]
                if rows:
                    connection.execute(table.insert(), rows)
    return engine


def test_a_database_from_before_keeps_what_was_sampled_and_takes_values(make_database: DatabaseMaker) -> None:
    plain, sweep = small_sweep(), keeping()
    (one, *_), observations = keys_of(plain)
    with make_database() as new, make_database(migrated=False) as url:
        source = open_database(new)
        Store(source).submit(plain, "ada")
        Store(source).commit([result(one, observations, 0, 10, plain.key)])
        before = [entry.digest for entry in Store(source).table_entries(plain.key)]
        engine = first_revision(url, source)
        assert not schema_is_current(engine)
        migrate(engine)
        assert schema_is_current(engine)
        store = Store(engine)
        assert [entry.digest for entry in store.table_entries(plain.key)] == before
        store.submit(sweep, "ada")
        store.commit([result(one, keys_of(sweep)[1], 0, 10, sweep.key, kept=True)])
        assert np.array(stored(store, one, keys_of(sweep)[1][0], 10)).shape == (10, 1)
        engine.dispose()
        source.dispose()
