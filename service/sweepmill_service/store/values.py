"""Kept values: which of them a table rests on, and their chunks, read in short transactions."""

from collections.abc import Iterator
from typing import NamedTuple

from sqlalchemy import Connection, Engine, and_, case, func, select

from sweepmill_service.schema import batch, kept, mark, sweep_ensemble, total

FIRST_PAGE, LARGEST_PAGE = 8, 1000  # chunks
PAGE_BYTES = 16_000_000  # of chunks held in memory at once


class KeptEntry(NamedTuple):
    """How many trajectories of an ensemble a table rests on, with the digest of their total."""

    ordinal: int
    ensemble_key: str
    trajectories: int
    digest: str | None
    met_by: str | None


class KeptChunk(NamedTuple):
    """Packed values of so many trajectories from ``first`` on."""

    first: int
    trajectories: int
    data: bytes


class MissingValues(Exception):
    """Values that ought to be there are not: the database was changed by somebody else."""


def kept_entries(connection: Connection, key: str, observation: str) -> list[KeptEntry]:
    """Every ensemble of a sweep in table order, each with the N of its total of that observation."""
    mine = sweep_ensemble.c
    here = (mine.met_by.is_(None), func.coalesce(total.c.trajectories, 0))
    statement = (
        select(
            mine.ordinal,
            mine.ensemble,
            case(here, else_=mine.trajectories),
            case((mine.met_by.is_(None), total.c.digest), else_=mark.c.digest),
            mine.met_by,
        )
        .outerjoin(total, and_(total.c.ensemble == mine.ensemble, total.c.observation == observation))
        .outerjoin(
            mark,
            and_(
                mark.c.ensemble == mine.ensemble,
                mark.c.observation == observation,
                mark.c.trajectories == mine.trajectories,
            ),
        )
        .where(mine.sweep == key)
        .order_by(mine.ordinal)
    )
    return [KeptEntry(*row) for row in connection.execute(statement)]


def kept_chunks(engine: Engine, ensemble: str, observation: str, number: int) -> Iterator[KeptChunk]:
    """Chunks of the first ``number`` trajectories in order. Raises MissingValues where one is not there."""
    reached, page = 0, FIRST_PAGE
    while reached < number:
        with engine.connect() as connection:
            rows = _page(connection, (ensemble, observation), (reached, number), page)
        for row in rows:
            if row.first != reached:
                break
            yield row
            reached += row.trajectories
        if not rows or rows[-1].first + rows[-1].trajectories != reached:
            raise MissingValues(f"values of ensemble {ensemble} are missing from trajectory {reached} on")
        page = max(1, min(PAGE_BYTES // max(len(row.data) for row in rows), LARGEST_PAGE))


def _page(connection: Connection, pair: tuple[str, str], within: tuple[int, int], size: int) -> list[KeptChunk]:
    same = and_(*(kept.c[name] == batch.c[name] for name in ("ensemble", "observation", "first")))
    statement = (
        select(batch.c.first, batch.c.count, kept.c.data)
        .select_from(batch.join(kept, same))
        .where(kept.c.ensemble == pair[0], kept.c.observation == pair[1])
        .where(kept.c.first >= within[0], kept.c.first < within[1])
        .order_by(kept.c.first)
        .limit(size)
    )
    return [KeptChunk(*row) for row in connection.execute(statement)]
