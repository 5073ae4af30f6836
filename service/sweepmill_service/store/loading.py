"""Reading the plan: live sweeps, their open ensembles, and what is sampled of these."""

import json
from collections import defaultdict
from collections.abc import Iterable
from dataclasses import dataclass, field
from typing import Any, NamedTuple

from sqlalchemy import Connection, Select, func, select

from sweepmill.revisions import FAMILY_REVISIONS, QUANTITY_REVISIONS
from sweepmill_service.plan.marks import Reach
from sweepmill_service.schema import (
    batch,
    change,
    ensemble,
    fault,
    mark,
    observation,
    request,
    sweep,
    sweep_ensemble,
    sweep_observation,
    total,
)
from sweepmill_service.store.classify import unfolded
from sweepmill_service.store.common import SAMPLING, WAITING, is_placed
from sweepmill_service.store.members import reaches


class LiveRequest(NamedTuple):
    """One owner's request for a live sweep."""

    owner: str
    priority: int
    at: float


@dataclass
class LiveSweep:
    """A sweep that is requested and under way."""

    key: str
    requests: tuple[LiveRequest, ...]
    observations: tuple[str, ...]
    at_least: int
    has_rules: bool
    has_goal: bool
    budget: float | None
    core_seconds: float


@dataclass
class OpenEnsemble:
    """An ensemble of a live sweep that is not settled there; ranges by observation key."""

    key: str
    cap: int
    judged: int
    normal_form: dict[str, Any]
    seconds_per_trajectory: float | None
    stuck: bool
    reaches: dict[str, Reach] = field(default_factory=dict)
    islands: dict[str, dict[int, int]] = field(default_factory=dict)  # first -> count, beyond the prefix
    faults: dict[int, int] = field(default_factory=dict)  # first -> failed attempts that count


def change_counter(connection: Connection) -> int:
    """Grows with every submission, withdrawal and amendment."""
    return int(connection.scalar(select(change.c.counter)) or 0)


def live_sweeps(connection: Connection) -> list[LiveSweep]:
    """Every sweep that is requested and neither settled nor stuck."""
    live = sweep.c.state.in_((WAITING, SAMPLING))
    requests = defaultdict(list)
    wanted = select(request).join(sweep, sweep.c.key == request.c.sweep).where(live)
    for row in connection.execute(wanted.order_by(request.c.at, request.c.owner)):
        requests[row.sweep].append(LiveRequest(row.owner, row.priority, row.at))
    observed = defaultdict(list)
    names = select(sweep_observation).join(sweep, sweep.c.key == sweep_observation.c.sweep).where(live)
    for row in connection.execute(names.order_by(sweep_observation.c.ordinal)):
        observed[row.sweep].append(row.observation)
    rows = connection.execute(select(sweep).where(live).order_by(sweep.c.created_at, sweep.c.key))
    return [
        LiveSweep(
            key=row.key,
            requests=tuple(requests[row.key]),
            observations=tuple(dict.fromkeys(observed[row.key])),
            at_least=row.at_least,
            has_rules=row.rules != "[]",
            has_goal=row.goal is not None,
            budget=row.budget,
            core_seconds=row.core_seconds,
        )
        for row in rows
        if requests[row.key]
    ]


def open_ensembles(connection: Connection, key: str) -> list[OpenEnsemble]:
    """Ensembles of a sweep that are not settled, in table order, with what is stored of them."""
    members = sweep_ensemble.c
    columns = (members.cap, members.judged, *ensemble.c)
    statement = select(*columns).join(ensemble, ensemble.c.key == members.ensemble).where(*_open(key))
    found = {row.key: _open_ensemble(row) for row in connection.execute(statement.order_by(members.ordinal))}
    _load_reaches(connection, key, found)
    _load_islands(connection, key, found)
    _load_faults(connection, key, found)
    return list(found.values())


def due_ensembles(connection: Connection, key: str) -> list[str]:
    """Ensembles of a sweep that may be judged: sampled beyond the last N judged."""
    members = sweep_ensemble.c
    statement = select(members.ensemble).where(*_open(key), members.sampled > members.judged)
    return list(connection.scalars(statement.order_by(members.ordinal)))


def superseded(connection: Connection, key: str) -> bool:
    """Whether the sweep rests on another revision of a family or quantity than this code's."""
    families = select(ensemble.c.family, ensemble.c.revision).distinct()
    used = families.join(sweep_ensemble, sweep_ensemble.c.ensemble == ensemble.c.key).where(*_open(key))
    if any(FAMILY_REVISIONS.get(name) != number for name, number in connection.execute(used)):
        return True
    read = select(observation.c.normal_form).join(
        sweep_observation, sweep_observation.c.observation == observation.c.key
    )
    forms = [json.loads(text) for text in connection.scalars(read.where(sweep_observation.c.sweep == key))]
    return any(QUANTITY_REVISIONS.get(form["quantity"]) != form["revision"] for form in forms)


def observation_forms(connection: Connection, keys: Iterable[str]) -> dict[str, dict[str, Any]]:
    """Normal forms of observations by key."""
    statement = select(observation.c.key, observation.c.normal_form).where(observation.c.key.in_(list(keys)))
    return {row.key: json.loads(row.normal_form) for row in connection.execute(statement)}


def ranges(connection: Connection, key: str) -> tuple[dict[str, Reach], dict[str, dict[int, int]]]:
    """By observation, how far an ensemble is and which batches wait beyond that."""
    reached = reaches(connection, [key])
    islands = unfolded(connection, [key])
    return {pair[1]: one for pair, one in reached.items()}, {pair[1]: one for pair, one in islands.items()}


def _open(key: str) -> tuple[Any, Any, Any]:
    return sweep_ensemble.c.sweep == key, sweep_ensemble.c.met_by.is_(None), is_placed()


def _of_open(columns: Iterable[Any], table: Any, key: str) -> Select[Any]:
    return select(*columns).join(sweep_ensemble, sweep_ensemble.c.ensemble == table.c.ensemble).where(*_open(key))


def _open_ensemble(row: Any) -> OpenEnsemble:
    return OpenEnsemble(
        key=row.key,
        cap=row.cap,
        judged=row.judged,
        normal_form=json.loads(row.normal_form),
        seconds_per_trajectory=row.seconds_per_trajectory,
        stuck=row.stuck is not None,
    )


def _load_reaches(connection: Connection, key: str, found: dict[str, OpenEnsemble]) -> None:
    marks: dict[tuple[str, str], set[int]] = defaultdict(set)
    kept = (mark.c.ensemble, mark.c.observation, mark.c.trajectories)
    for one, read, number in connection.execute(_of_open(kept, mark, key)):
        marks[one, read].add(number)
    columns = (total.c.ensemble, total.c.observation, total.c.trajectories)
    for one, read, number in connection.execute(_of_open(columns, total, key)):
        found[one].reaches[read] = Reach(number, frozenset(marks[one, read]))


def _load_islands(connection: Connection, key: str, found: dict[str, OpenEnsemble]) -> None:
    columns = (batch.c.ensemble, batch.c.observation, batch.c.first, batch.c.count)
    waiting = _of_open(columns, batch, key).where(batch.c.accumulator.is_not(None))
    for one, read, first, count in connection.execute(waiting):
        found[one].islands.setdefault(read, {})[first] = count


def _load_faults(connection: Connection, key: str, found: dict[str, OpenEnsemble]) -> None:
    columns = (fault.c.ensemble, fault.c.first, func.count())
    failed = (
        _of_open(columns, fault, key)
        .join(ensemble, ensemble.c.key == fault.c.ensemble)
        .where(fault.c.at > func.coalesce(ensemble.c.retried_at, 0.0))
        .group_by(fault.c.ensemble, fault.c.first)
    )
    for one, first, number in connection.execute(failed):
        found[one].faults[first] = number
