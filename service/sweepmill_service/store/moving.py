"""Writing back what moved: progress of members and counters of their sweeps."""

from collections.abc import Iterable, Sequence
from typing import Any

from sqlalchemy import Connection, bindparam, case, update

from sweepmill_service.schema import sweep, sweep_ensemble
from sweepmill_service.store.common import SETTLED
from sweepmill_service.store.members import Member, Reaches, SweepRow


def advance(connection: Connection, members: Sequence[Member], known: Reaches) -> None:
    """Set how far each member is: the shortest prefix of its observations, at most its cap."""
    rows: list[dict[str, Any]] = []
    for member in members:
        covered = min(member.cap, *(reach.prefix for reach in member.reaches(known)))
        if covered != member.sampled:
            member.sweep.advance(covered - member.sampled)
            member.sampled = covered
            rows.append(place(member) | {"n": covered})
    if rows:
        statement = update_member().values(sampled=bindparam("n"), changed=bindparam("c"))
        connection.execute(statement, rows)


def place(member: Member) -> dict[str, Any]:
    """Parameters of :func:`update_member`; a change belongs to the sweep's next commit."""
    return {"s": member.sweep.key, "e": member.ensemble, "c": member.sweep.commit + 1}


def update_member() -> Any:
    """UPDATE of one row of sweep_ensemble."""
    return update(sweep_ensemble).where(
        sweep_ensemble.c.sweep == bindparam("s"), sweep_ensemble.c.ensemble == bindparam("e")
    )


def save_sweeps(connection: Connection, sweeps: Iterable[SweepRow]) -> None:
    """Write back the sweeps that something happened to, one commit further."""
    rows = [_row(one) for one in sweeps if one.touched]
    if not rows:
        return
    statement = update(sweep).where(sweep.c.key == bindparam("k"))
    values = {
        "state": bindparam("state_"),
        "reason": case((bindparam("state_") == SETTLED, None), else_=sweep.c.reason),
        "commit_counter": bindparam("commit_"),
        "settled": bindparam("settled_"),
        "trajectories_sampled": bindparam("sampled_"),
        "core_seconds": sweep.c.core_seconds + bindparam("more"),
    }
    connection.execute(statement.values(**values), rows)


def _row(one: SweepRow) -> dict[str, Any]:
    return {
        "k": one.key,
        "state_": one.state,
        "commit_": one.commit + 1,
        "settled_": one.settled,
        "sampled_": one.sampled,
        "more": one.charged,
    }
