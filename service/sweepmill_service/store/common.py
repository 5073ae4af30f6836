"""Small things that several statements need."""

import json
import time
from collections.abc import Iterable, Iterator, Sequence
from itertools import islice
from typing import Any, Literal, TypeVar

from sqlalchemy import ColumnElement, Connection, Insert, Table, update
from sqlalchemy.dialects import postgresql, sqlite

from sweepmill_service import schema

CHUNK = 500  # bound parameters of one IN list
T = TypeVar("T")

WAITING: Literal["waiting"] = "waiting"
SAMPLING: Literal["sampling"] = "sampling"
SETTLED: Literal["settled"] = "settled"
WITHDRAWN: Literal["withdrawn"] = "withdrawn"
STUCK: Literal["stuck"] = "stuck"


def now() -> float:
    """Seconds since 1970-01-01 UTC."""
    return time.time()


def chunks(items: Iterable[T], size: int = CHUNK) -> Iterator[list[T]]:
    """Consecutive pieces of at most ``size`` items."""
    iterator = iter(items)
    while piece := list(islice(iterator, size)):
        yield piece


def insert_missing(connection: Connection, table: Table) -> Insert:
    """INSERT that leaves rows alone whose primary key is there already."""
    statement: Insert = _dialect_insert(connection, table).on_conflict_do_nothing()
    return statement


def insert_all(connection: Connection, table: Table, rows: Sequence[dict[str, Any]]) -> None:
    """Insert rows that are not there yet."""
    if rows:
        connection.execute(insert_missing(connection, table), rows)


def replace_all(connection: Connection, table: Table, rows: Sequence[dict[str, Any]]) -> None:
    """Insert rows, or overwrite those with the same primary key."""
    if not rows:
        return
    statement = _dialect_insert(connection, table)
    key = [column.name for column in table.primary_key]
    changed = {name: statement.excluded[name] for name in rows[0] if name not in key}
    connection.execute(statement.on_conflict_do_update(index_elements=key, set_=changed), rows)


def _dialect_insert(connection: Connection, table: Table) -> Any:
    return postgresql.insert(table) if connection.dialect.name == "postgresql" else sqlite.insert(table)


def is_placed() -> ColumnElement[bool]:
    """Members that are sampled: a goal leaves most of the places it might use empty."""
    return schema.sweep_ensemble.c.cap > 0


def note_change(connection: Connection) -> None:
    """Tell dispatchers that requests changed."""
    connection.execute(update(schema.change).values(counter=schema.change.c.counter + 1))


def to_json(value: Any) -> str:
    """Compact JSON with sorted keys."""
    return json.dumps(value, sort_keys=True, separators=(",", ":"))
