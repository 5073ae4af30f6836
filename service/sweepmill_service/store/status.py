"""A sweep with its progress, and lists of sweeps."""

import json
from collections import defaultdict
from collections.abc import Sequence
from typing import Any

from sqlalchemy import ColumnElement, Connection, Row, and_, or_, select

from sweepmill.messages import Request, SweepList, SweepStatus
from sweepmill_service.schema import request, sweep, sweep_observation
from sweepmill_service.store.errors import UnknownKey

COLUMNS = [column for column in sweep.c if column.name != "specification"]


def sweep_status(connection: Connection, key: str) -> SweepStatus:
    """One sweep; raises UnknownKey."""
    rows = connection.execute(select(*COLUMNS).where(sweep.c.key == key)).all()
    if not rows:
        raise UnknownKey("sweep", key)
    return _statuses(connection, rows)[0]


def list_sweeps(
    connection: Connection,
    owner: str | None,
    state: str | None,
    family: str | None,
    limit: int,
    after: str | None,
) -> SweepList:
    """A page of sweeps, newest first; ``after`` is the key of the last sweep of the page before."""
    conditions = _conditions(owner, state, family)
    if after is not None:
        conditions.append(_older_than(connection, after))
    order = (sweep.c.created_at.desc(), sweep.c.key.desc())
    rows = connection.execute(select(*COLUMNS).where(*conditions).order_by(*order).limit(limit + 1)).all()
    page = rows[:limit]
    return SweepList(sweeps=_statuses(connection, page), next=page[-1].key if len(rows) > limit else None)


def specification(connection: Connection, key: str) -> str:
    """Canonical JSON of the sweep's normal form; raises UnknownKey."""
    text = connection.scalar(select(sweep.c.specification).where(sweep.c.key == key))
    if text is None:
        raise UnknownKey("sweep", key)
    return str(text)


def commit_counter(connection: Connection, key: str) -> int:
    """Grows with every change of the sweep's progress; raises UnknownKey."""
    counter = connection.scalar(select(sweep.c.commit_counter).where(sweep.c.key == key))
    if counter is None:
        raise UnknownKey("sweep", key)
    return int(counter)


def _conditions(owner: str | None, state: str | None, family: str | None) -> list[ColumnElement[bool]]:
    conditions: list[ColumnElement[bool]] = []
    if owner is not None:
        conditions.append(sweep.c.key.in_(select(request.c.sweep).where(request.c.owner == owner)))
    if state is not None:
        conditions.append(sweep.c.state == state)
    if family is not None:
        conditions.append(sweep.c.families.contains(json.dumps(family), autoescape=True))
    return conditions


def _older_than(connection: Connection, key: str) -> ColumnElement[bool]:
    created = connection.scalar(select(sweep.c.created_at).where(sweep.c.key == key))
    if created is None:
        raise UnknownKey("sweep", key)
    return or_(sweep.c.created_at < created, and_(sweep.c.created_at == created, sweep.c.key < key))


def _statuses(connection: Connection, rows: Sequence[Row[Any]]) -> list[SweepStatus]:
    keys = [row.key for row in rows]
    requests = defaultdict(list)
    mine = select(request).where(request.c.sweep.in_(keys)).order_by(request.c.at, request.c.owner)
    for row in connection.execute(mine).mappings():
        requests[row["sweep"]].append(Request.model_validate(dict(row)))
    names = defaultdict(list)
    order = (sweep_observation.c.sweep, sweep_observation.c.ordinal)
    named = select(sweep_observation).where(sweep_observation.c.sweep.in_(keys)).order_by(*order)
    for row in connection.execute(named).mappings():
        names[row["sweep"]].append(row["name"])
    return [_status(row, names[row.key], requests[row.key]) for row in rows]


def _status(row: Row[Any], names: list[str], requests: list[Request]) -> SweepStatus:
    return SweepStatus(
        key=row.key,
        state=row.state,
        reason=row.reason,
        families=json.loads(row.families),
        axes=json.loads(row.axes),
        names=names,
        requests=requests,
        ensembles=row.ensembles,
        settled=row.settled,
        trajectories=row.trajectories_sampled,
        trajectories_cap=row.trajectories_cap,
        core_seconds=row.core_seconds,
        budget=row.budget,
        created_at=row.created_at,
        commit=row.commit_counter,
        seconds_left=None,
        goal=None if row.goal is None else json.loads(row.goal),
        answers=json.loads(row.answers or "[]"),
    )
