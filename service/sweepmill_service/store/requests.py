"""Submitting, withdrawing and amending: what requests write."""

from collections.abc import Iterator
from enum import Enum
from typing import Any, Final, Literal, NamedTuple

from sqlalchemy import Connection, delete, func, insert, select, update

from sweepmill.goals import kind_of
from sweepmill.sweep import Point, Sweep
from sweepmill_service.schema import ensemble, observation, request, sweep, sweep_ensemble, sweep_observation
from sweepmill_service.store.common import (
    SAMPLING,
    SETTLED,
    STUCK,
    WAITING,
    WITHDRAWN,
    insert_all,
    insert_missing,
    note_change,
    now,
    to_json,
)
from sweepmill_service.store.sampled import refresh_sampled


class _Unset(Enum):
    UNSET = "unset"


UNSET: Final = _Unset.UNSET
Unset = Literal[_Unset.UNSET]


class Submission(NamedTuple):
    """What a submission did: ``created`` a sweep, or ``joined`` one that was there with a new request."""

    key: str
    created: bool
    joined: bool


def submit(connection: Connection, wanted: Sweep, owner: str) -> Submission:
    """Store a sweep if it is new, and the owner's request for it."""
    at = now()
    created = _insert_sweep(connection, wanted, at)
    if created:
        _insert_parts(connection, wanted)
        refresh_sampled(connection, wanted.key)
    else:
        _retry_failed(connection, wanted.key, at)  # ensembles before their sweep, as commits lock them
        _lock(connection, wanted.key)
    joined = _request(connection, wanted, owner, at)
    _restore(connection, wanted.key)
    note_change(connection)
    return Submission(wanted.key, created, joined and not created)


def withdraw(connection: Connection, key: str, owner: str) -> bool:
    """Remove the owner's request; False if there was none."""
    _lock(connection, key)
    mine = (request.c.sweep == key, request.c.owner == owner)
    removed = connection.execute(delete(request).where(*mine).returning(request.c.owner)).all()
    if not removed:
        return False
    others = connection.scalar(select(func.count()).where(request.c.sweep == key))
    if not others:
        _set_state(connection, key, WITHDRAWN)
    note_change(connection)
    return True


def amend(connection: Connection, key: str, owner: str, label: str | Unset | None, priority: int | Unset) -> bool:
    """Change label or priority of the owner's request; False if there is none."""
    values: dict[str, Any] = {}
    if label is not UNSET:
        values["label"] = label
    if priority is not UNSET:
        values["priority"] = priority
    mine = (request.c.sweep == key, request.c.owner == owner)
    if not connection.scalar(select(func.count()).where(*mine)):
        return False
    if values:
        connection.execute(update(request).where(*mine).values(**values))
        note_change(connection)
    return True


def _insert_sweep(connection: Connection, wanted: Sweep, at: float) -> bool:
    statement = insert_missing(connection, sweep).returning(sweep.c.key)
    return connection.execute(statement.values(_sweep_row(wanted, at))).first() is not None


def _sweep_row(wanted: Sweep, at: float) -> dict[str, Any]:
    points, targets = wanted.points, list(_targets(wanted))
    return {
        "key": wanted.key,
        "specification": wanted.canonical(),
        "state": WAITING,
        "reason": None,
        "commit_counter": 0,
        "families": to_json(sorted({point.ensemble.family for point in points})),
        "axes": to_json(list(wanted.axes)),
        "rules": to_json(_rules(wanted)),
        "at_least": wanted.stop.first_rung,
        "budget": wanted.stop.budget,
        "goal": _goal(wanted),
        "ensembles": sum(first > 0 for _, first in targets),
        "settled": 0,
        "trajectories_sampled": 0,
        "trajectories_cap": sum(first for _, first in targets),
        "core_seconds": 0.0,
        "created_at": at,
    }


def _rules(wanted: Sweep) -> list[dict[str, Any]]:
    keys = {named.name: named.observation.key for named in wanted.observations}
    return [{"observation": keys[rule.of], "below": rule.below} for rule in wanted.stop.standard_error]


def _goal(wanted: Sweep) -> str | None:
    return None if wanted.goal is None else to_json({"kind": kind_of(wanted.goal), **wanted.goal.normal_form()})


def _targets(wanted: Sweep) -> Iterator[tuple[Point, int]]:
    """Every point with the N it is sampled to first: its cap, or the first rung where rounds decide what follows."""
    for point in wanted.points:
        if wanted.goal is None:
            yield point, point.cap
        else:
            yield point, min(wanted.stop.first_rung, point.cap) if point.ensemble.key in wanted.starting else 0


def _insert_parts(connection: Connection, wanted: Sweep) -> None:
    # In order of key: two submissions that share ensembles then cannot wait for each other crosswise.
    insert_all(connection, ensemble, sorted(_ensemble_rows(wanted), key=lambda row: str(row["key"])))
    insert_all(connection, observation, sorted(_observation_rows(wanted), key=lambda row: row["key"]))
    connection.execute(insert(sweep_ensemble), list(_sweep_ensemble_rows(wanted)))
    connection.execute(insert(sweep_observation), list(_sweep_observation_rows(wanted)))


def _ensemble_rows(wanted: Sweep) -> Iterator[dict[str, Any]]:
    for point in wanted.points:
        form = point.ensemble.normal_form()
        yield {
            "key": point.ensemble.key,
            "family": point.ensemble.family,
            "normal_form": to_json(form),
            "revision": form["revision"],
            "core_seconds": 0.0,
        }


def _observation_rows(wanted: Sweep) -> list[dict[str, str]]:
    distinct = {named.observation.key: named.observation for named in wanted.observations}
    return [{"key": key, "normal_form": to_json(one.normal_form())} for key, one in distinct.items()]


def _sweep_ensemble_rows(wanted: Sweep) -> Iterator[dict[str, Any]]:
    fresh = {"sweep": wanted.key, "judged": 0, "sampled": 0, "changed": 0}
    for ordinal, (point, target) in enumerate(_targets(wanted)):
        most = None if wanted.goal is None else point.cap
        yield fresh | {"ensemble": point.ensemble.key, "ordinal": ordinal, "cap": target, "most": most}


def _sweep_observation_rows(wanted: Sweep) -> Iterator[dict[str, Any]]:
    for ordinal, named in enumerate(wanted.observations):
        key = named.observation.key
        yield {"sweep": wanted.key, "name": named.name, "ordinal": ordinal, "observation": key}


def _request(connection: Connection, wanted: Sweep, owner: str, at: float) -> bool:
    row = {
        "sweep": wanted.key,
        "owner": owner,
        "label": wanted.label,
        "priority": wanted.priority,
        "at": at,
        "core_seconds": 0.0,
    }
    statement = insert_missing(connection, request).returning(request.c.owner)
    return connection.execute(statement.values(row)).first() is not None


def _lock(connection: Connection, key: str) -> None:
    statement = select(sweep.c.key).where(sweep.c.key == key)
    connection.execute(statement.with_for_update(key_share=True))


def _restore(connection: Connection, key: str) -> None:
    """Bring a withdrawn or stuck sweep back."""
    row = connection.execute(
        select(sweep.c.state, sweep.c.settled, sweep.c.ensembles, sweep.c.trajectories_sampled).where(
            sweep.c.key == key
        )
    ).one()
    if row.state != SETTLED:
        under_way = SAMPLING if row.trajectories_sampled else WAITING
        _set_state(connection, key, SETTLED if row.settled == row.ensembles else under_way)


def _retry_failed(connection: Connection, key: str, at: float) -> None:
    """Whatever failed in a stuck sweep gets another chance; an ensemble that contradicted itself does not."""
    members = select(sweep_ensemble.c.ensemble).join(sweep, sweep.c.key == sweep_ensemble.c.sweep)
    stuck = members.where(sweep.c.key == key, sweep.c.state == STUCK)
    failed = (ensemble.c.key.in_(stuck), ensemble.c.stuck_kind == "failed")
    connection.execute(update(ensemble).where(*failed).values(stuck=None, stuck_kind=None, retried_at=at))


def _set_state(connection: Connection, key: str, state: str) -> None:
    counter = sweep.c.commit_counter + 1
    statement = update(sweep).where(sweep.c.key == key, sweep.c.state != state)
    connection.execute(statement.values(state=state, reason=None, commit_counter=counter))
