"""The totals behind a table, in table order, read in short transactions."""

import hashlib
from collections.abc import Iterable, Iterator
from typing import Any, NamedTuple

from sqlalchemy import Column, Connection, Engine, Table, case, func, select

from sweepmill_service.schema import mark, sweep, sweep_ensemble, sweep_observation, total
from sweepmill_service.store.common import is_placed
from sweepmill_service.store.errors import UnknownKey

FIRST_PAGE, LARGEST_PAGE = 100, 4000  # totals
PAGE_BYTES = 32_000_000  # of totals held in memory at once


Total = tuple[Any, ...]  # in the order of `_columns`


class TableEntry(NamedTuple):
    """Total of one ensemble and observation; ``accumulator`` is None where nothing was sampled yet."""

    ordinal: int
    ensemble_key: str
    observation_key: str
    trajectories: int
    accumulator: bytes | None
    digest: str | None
    met_by: str | None
    frozen: bool


class _Member(NamedTuple):
    ordinal: int
    ensemble: str
    trajectories: int | None
    met_by: str | None


def table_entries(engine: Engine, key: str) -> Iterator[TableEntry]:
    """Every entry ordered by (ordinal, observation in the order of the sweep); raises UnknownKey at once."""
    with engine.connect() as connection:
        observations = sweep_observations(connection, key)
    return _pages(engine, key, observations)


def sweep_observations(connection: Connection, key: str) -> list[str]:
    """Keys of the sweep's observations in its order, each once; raises UnknownKey."""
    statement = select(sweep_observation.c.observation).where(sweep_observation.c.sweep == key)
    keys = connection.scalars(statement.order_by(sweep_observation.c.ordinal)).all()
    if not keys:
        raise UnknownKey("sweep", key)
    return list(dict.fromkeys(keys))


def _pages(engine: Engine, key: str, observations: list[str]) -> Iterator[TableEntry]:
    last, page = -1, FIRST_PAGE
    while True:
        size = max(1, page // len(observations))
        with engine.connect() as connection:
            members = _members(connection, key, last, size)
            totals = _totals(connection, key, members, observations, frozen=False)
            frozen = _totals(connection, key, members, observations, frozen=True)
        for member in members:
            yield from _entries(member, observations, totals if member.met_by is None else frozen)
        if len(members) < size:
            return
        last = members[-1].ordinal
        largest = max((len(row[3]) for row in (*totals.values(), *frozen.values())), default=1)
        page = min(PAGE_BYTES // largest, LARGEST_PAGE)


def _members(connection: Connection, key: str, last: int, size: int) -> list[_Member]:
    columns = sweep_ensemble.c
    statement = select(columns.ordinal, columns.ensemble, columns.trajectories, columns.met_by)
    where = (columns.sweep == key, columns.ordinal > last, is_placed())
    rows = connection.execute(statement.where(*where).order_by(columns.ordinal).limit(size))
    return [_Member(*row) for row in rows]


def _totals(
    connection: Connection, key: str, members: list[_Member], observations: list[str], frozen: bool
) -> dict[tuple[str, str], Total]:
    """Totals of a page of members by ensemble and observation: kept ones of the settled, current ones of the others."""
    if not any((member.met_by is not None) == frozen for member in members):
        return {}
    source, mine = (mark if frozen else total), sweep_ensemble.c
    same = source.c.ensemble == mine.ensemble
    statement = (
        select(*_columns(source))
        .join(sweep_ensemble, same & (source.c.trajectories == mine.trajectories) if frozen else same)
        .where(mine.sweep == key, mine.ordinal.between(members[0].ordinal, members[-1].ordinal))
        .where(mine.met_by.is_not(None) if frozen else mine.met_by.is_(None), source.c.observation.in_(observations))
    )
    return {(row[0], row[1]): tuple(row) for row in connection.execute(statement)}


def _columns(table: Table) -> list[Column[Any]]:
    names = ("ensemble", "observation", "trajectories", "accumulator", "digest")
    return [table.c[name] for name in names]


def _entries(member: _Member, observations: list[str], totals: dict[tuple[str, str], Total]) -> Iterator[TableEntry]:
    for observation in observations:
        row = totals.get((member.ensemble, observation))
        number, accumulator, digest = (0, None, None) if row is None else row[2:]
        frozen = member.met_by is not None
        yield TableEntry(
            member.ordinal, member.ensemble, observation, number, accumulator, digest, member.met_by, frozen
        )


def table_version(connection: Connection, key: str) -> str:
    """Version of the table as it is now."""
    members = sweep_ensemble.c
    number = case((members.met_by.is_(None), func.coalesce(total.c.trajectories, 0)), else_=members.trajectories)
    statement = (
        select(members.ordinal, sweep_observation.c.observation, number, members.met_by)
        .join(sweep_observation, sweep_observation.c.sweep == members.sweep)
        .outerjoin(
            total,
            (total.c.ensemble == members.ensemble) & (total.c.observation == sweep_observation.c.observation),
        )
        .where(members.sweep == key, is_placed())
        .order_by(members.ordinal, sweep_observation.c.ordinal)
    )
    return version_of(key, (Number(*row) for row in connection.execute(statement)))


class Number(NamedTuple):
    """How many trajectories one entry of a table rests on."""

    ordinal: int
    observation_key: str
    trajectories: int
    met_by: str | None


def version_of(key: str, numbers: Iterable[Number]) -> str:
    """Digest over the N of every ensemble and observation: equal versions mean equal tables."""
    digest = hashlib.sha256(key.encode())
    for one in dict.fromkeys(numbers):  # an observation under two names counts once
        digest.update(f"\n{one.ordinal}:{one.observation_key}:{one.trajectories}:{one.met_by}".encode())
    return digest.hexdigest()


def frozen_digests(connection: Connection, key: str) -> dict[str, str]:
    """Digest of every settled ensemble of a sweep, by ensemble key."""
    if connection.scalar(select(sweep.c.key).where(sweep.c.key == key)) is None:
        raise UnknownKey("sweep", key)
    columns = sweep_ensemble.c
    statement = select(columns.ensemble, columns.digest)
    rows = connection.execute(statement.where(columns.sweep == key, columns.digest.is_not(None)))
    return {row.ensemble: row.digest for row in rows}
