"""Starts and faults: what the dispatcher notes besides results."""

from collections.abc import Collection, Sequence
from dataclasses import asdict

from sqlalchemy import Connection, and_, case, func, insert, select, update

from sweepmill_service.schema import ensemble, fault, start, sweep, sweep_ensemble
from sweepmill_service.store.common import SAMPLING, STUCK, WAITING, chunks, is_placed, now, to_json
from sweepmill_service.store.members import lock_ensembles
from sweepmill_service.store.results import BatchFault, Start


def log_starts(connection: Connection, starts: Sequence[Start], run: str) -> None:
    """Note tasks before they are handed to the pool."""
    at = now()
    rows = [asdict(one) | {"observations": to_json(one.observations), "run": run, "at": at} for one in starts]
    if rows:
        connection.execute(insert(start), rows)


def record_fault(connection: Connection, failed: BatchFault, attempts: int) -> int:
    """Note a failed attempt and return its number; after ``attempts`` of them the ensemble is stuck."""
    retried_at = lock_ensembles(connection, [failed.ensemble])[failed.ensemble].retried_at or 0.0
    counts = select(func.coalesce(func.max(fault.c.attempt), 0), func.count(case((fault.c.at > retried_at, 1))))
    here = (fault.c.ensemble == failed.ensemble, fault.c.first == failed.first)
    latest, counted = connection.execute(counts.where(*here)).one()
    row = asdict(failed) | {"attempt": latest + 1, "at": now()}
    connection.execute(insert(fault), row)
    if counted + 1 >= attempts:
        _stick(connection, failed, counted + 1)
    return int(counted) + 1


def _stick(connection: Connection, failed: BatchFault, attempts: int) -> None:
    reason = (
        f"trajectories {failed.first} to {failed.first + failed.count - 1} failed {attempts} times, "
        f"the last time with {failed.kind}: {failed.message}"
    )
    one = update(ensemble).where(ensemble.c.key == failed.ensemble, ensemble.c.stuck.is_(None))
    connection.execute(one.values(stuck=reason, stuck_kind="failed"))


def stick_sweep(connection: Connection, key: str, reason: str) -> bool:
    """A sweep that cannot proceed as a whole; False if it is not under way."""
    under_way = (sweep.c.key == key, sweep.c.state.in_((WAITING, SAMPLING)))
    counter = sweep.c.commit_counter + 1
    statement = update(sweep).where(*under_way).values(state=STUCK, reason=reason, commit_counter=counter)
    return connection.execute(statement.returning(sweep.c.key)).first() is not None


def stick_sweeps(connection: Connection, keys: Collection[str]) -> list[str]:
    """Those of the sweeps become stuck whose ensembles are all settled or stuck; returns their keys."""
    members = sweep_ensemble.c
    left = and_(members.met_by.is_(None), ensemble.c.stuck.is_(None))
    statement = (
        select(members.sweep, func.count(case((left, 1))), func.count(ensemble.c.stuck), func.min(ensemble.c.stuck))
        .join(ensemble, ensemble.c.key == members.ensemble)
        .where(members.met_by.is_(None), is_placed())
        .group_by(members.sweep)
    )
    stuck: list[str] = []
    for piece in chunks(sorted(keys)):
        for key, able, number, reason in connection.execute(statement.where(members.sweep.in_(piece))).all():
            what = "one ensemble" if number == 1 else f"{number} ensembles"
            if not able and stick_sweep(connection, key, f"{what} cannot proceed: {reason}"):
                stuck.append(key)
    return stuck
