"""Progress per ensemble, and what is there already of ensembles that may never have been submitted."""

import json
from collections.abc import Callable, Mapping, Sequence
from typing import Any

from sqlalchemy import Connection, Row, select

from sweepmill.ensemble import LAYERED, Ensemble
from sweepmill.messages import EnsembleProgress, ProgressPage
from sweepmill_service.schema import ensemble, sweep, sweep_ensemble, total
from sweepmill_service.store.common import chunks, is_placed
from sweepmill_service.store.status import commit_counter
from sweepmill_service.stored import expand


def progress(connection: Connection, key: str, since: int | None, limit: int, after: int | None) -> ProgressPage:
    """A page of ensembles in table order: those changed after commit ``since``, beyond ordinal ``after``."""
    counter = commit_counter(connection, key)
    conditions = [sweep_ensemble.c.sweep == key, is_placed()]
    if since is not None:
        conditions.append(sweep_ensemble.c.changed > since)
    if after is not None:
        conditions.append(sweep_ensemble.c.ordinal > after)
    statement = (
        select(sweep_ensemble, ensemble.c.family, ensemble.c.normal_form, ensemble.c.stuck)
        .join(ensemble, ensemble.c.key == sweep_ensemble.c.ensemble)
        .where(*conditions)
        .order_by(sweep_ensemble.c.ordinal)
        .limit(limit + 1)
    )
    rows = connection.execute(statement).all()
    page = rows[:limit]
    following = page[-1].ordinal if len(rows) > limit else None
    named = _named(connection, key, page)
    ensembles = [_ensemble_progress(row, named(row)) for row in page]
    return ProgressPage(sweep=key, commit=counter, ensembles=ensembles, next=following)


def _named(connection: Connection, key: str, page: Sequence[Row[Any]]) -> Callable[[Row[Any]], Mapping[str, Any]]:
    """What to call an ensemble by: its scalar parameters, and the named values that only the specification knows."""
    if not any(row.family == LAYERED for row in page):
        return lambda row: Ensemble.from_normal_form(json.loads(row.normal_form)).columns
    text = connection.scalars(select(sweep.c.specification).where(sweep.c.key == key)).one()
    ensembles = expand(text).ensembles
    return lambda row: ensembles[row.ordinal].columns


def _ensemble_progress(row: Row[Any], columns: Mapping[str, Any]) -> EnsembleProgress:
    return EnsembleProgress(
        ordinal=row.ordinal,
        ensemble=row.ensemble,
        parameters=dict(columns),
        trajectories=row.sampled if row.trajectories is None else row.trajectories,
        cap=row.cap,
        met_by=row.met_by,
        reason=row.stuck if row.met_by is None else None,
        changed=row.changed,
    )


def already_sampled(
    connection: Connection, ensembles: Sequence[str], observations: Sequence[str]
) -> dict[tuple[str, str], int]:
    """Length of the prefix of every (ensemble, observation) that has one."""
    found: dict[tuple[str, str], int] = {}
    columns = (total.c.ensemble, total.c.observation, total.c.trajectories)
    for few in chunks(observations):
        for piece in chunks(ensembles, 400):
            where = (total.c.ensemble.in_(piece), total.c.observation.in_(few))
            for key, observation, number in connection.execute(select(*columns).where(*where)):
                found[key, observation] = number
    return found


def seconds_per_trajectory(connection: Connection, ensembles: Sequence[str]) -> dict[str, float]:
    """Measured core-seconds per trajectory of those ensembles that were sampled before."""
    found: dict[str, float] = {}
    for piece in chunks(ensembles):
        measured = ensemble.c.seconds_per_trajectory
        statement = select(ensemble.c.key, measured).where(ensemble.c.key.in_(piece), measured.is_not(None))
        found.update((row.key, row.seconds_per_trajectory) for row in connection.execute(statement))
    return found
