"""Rounds: what the goal of a sweep is judged on, and what was decided."""

import json
from dataclasses import dataclass
from typing import Any, Literal, NamedTuple

from sqlalchemy import Connection, Row, bindparam, func, insert, or_, select, tuple_, update

from sweepmill.messages import Answer, Round, RoundPlace
from sweepmill_service.schema import ensemble, mark, round_, sweep, sweep_ensemble, sweep_observation, total
from sweepmill_service.store.common import SAMPLING, WAITING, chunks, now, to_json
from sweepmill_service.store.errors import UnknownKey
from sweepmill_service.store.judging import freeze
from sweepmill_service.store.members import lock_ensembles, lock_sweeps, open_members, reaches
from sweepmill_service.store.moving import save_sweeps
from sweepmill_service.store.results import Outcome


class StoredPlace(NamedTuple):
    """An ensemble a goal may use; ``judged`` is its N in this round, 0 where it is not placed yet.

    ``accumulator`` is the total of the goal's observation at that N, ``seconds`` the measured cost of a trajectory.
    """

    ordinal: int
    ensemble: str
    normal_form: dict[str, Any]
    judged: int
    most: int
    stuck: bool
    seconds: float | None
    accumulator: bytes | None


@dataclass(frozen=True)
class Evidence:
    """All that a round is judged on."""

    sweep: str
    goal: dict[str, Any]
    specification: str
    at_least: int
    rounds: int  # judged before
    core_seconds: float
    budget: float | None
    places: tuple[StoredPlace, ...]


@dataclass(frozen=True)
class Decision:
    """What follows: the answers so far, and the N of every place in the next round, or by what each settles.

    ``targets``, ``costs`` (core-seconds per trajectory, as they were weighed) and ``met_by`` by ordinal; ``met_by``
    is empty while the sweep goes on.
    """

    answers: tuple[dict[str, Any], ...]
    targets: dict[int, int]
    costs: dict[int, float]
    met_by: dict[int, Literal["error", "cap"]]


def evidence(connection: Connection, key: str) -> Evidence:
    """What the next round of a sweep is judged on; raises UnknownKey."""
    row = connection.execute(select(sweep).where(sweep.c.key == key)).first()
    if row is None or row.goal is None:
        raise UnknownKey("sweep", key)
    goal = json.loads(row.goal)
    read = select(sweep_observation.c.observation).where(sweep_observation.c.sweep == key)
    observation = connection.scalars(read.where(sweep_observation.c.name == goal["of"])).one()
    members = sweep_ensemble.c
    columns = (members.ordinal, members.judged, members.most, *ensemble.c)
    statement = select(*columns).join(ensemble, ensemble.c.key == members.ensemble).where(members.sweep == key)
    rows = connection.execute(statement.order_by(members.ordinal)).all()
    totals = _totals(connection, observation, {one.key: one.judged for one in rows if one.judged})
    return Evidence(
        sweep=key,
        goal=goal,
        specification=row.specification,
        at_least=row.at_least,
        rounds=_number(connection, key),
        core_seconds=row.core_seconds,
        budget=row.budget,
        places=tuple(_place(one, totals.get(one.key)) for one in rows),
    )


def close_round(connection: Connection, known: Evidence, decision: Decision) -> Outcome | None:
    """Note a round and go on, or settle; None where the sweep has moved on since the evidence was read."""
    judged = {place.ensemble: place.judged for place in known.places if place.judged}
    lock_ensembles(connection, judged)
    row = lock_sweeps(connection, [known.sweep])[known.sweep]
    if row.state not in (WAITING, SAMPLING) or not _is_current(connection, known):
        return None
    members, sweeps = open_members(connection, judged)
    mine = [one for one in members if one.sweep.key == known.sweep]
    outcome = Outcome(reaches=reaches(connection, judged))
    _insert_round(connection, known, decision)
    if decision.met_by:
        by = {place.ensemble: decision.met_by[place.ordinal] for place in known.places if place.judged}
        stuck = {place.ensemble for place in known.places if place.stuck}
        freeze(connection, {one: by[one.ensemble] for one in mine if one.ensemble not in stuck}, outcome)
    else:
        _place_anew(connection, known, decision)
    sweeps[known.sweep].touched = True
    save_sweeps(connection, [sweeps[known.sweep]])
    _note_answers(connection, known.sweep, decision)
    return outcome


def end_rounds(connection: Connection, key: str, reason: str) -> bool:
    """Settle a sweep at the N of its last round, what was placed since then left out; False if there is none."""
    known = evidence(connection, key)
    if not known.rounds:
        return False
    answers = json.loads(str(connection.scalar(select(sweep.c.answers).where(sweep.c.key == key))))
    lock_ensembles(connection, [place.ensemble for place in known.places if place.judged])
    members = sweep_ensemble.c
    able = select(ensemble.c.key).where(ensemble.c.stuck.is_(None))
    mine = (members.sweep == key, members.met_by.is_(None), members.ensemble.in_(able))
    connection.execute(update(sweep_ensemble).where(*mine).values(cap=members.judged))
    by: Literal["error", "cap"] = "error" if all(one["met"] for one in answers) else "cap"
    met_by = dict.fromkeys((place.ordinal for place in known.places if place.judged), by)
    noted = tuple({**one, "round": known.rounds + 1, "reason": reason} if not one["met"] else one for one in answers)
    _count_places(connection, key)
    return close_round(connection, known, Decision(noted, {}, {}, met_by)) is not None


def rounds(connection: Connection, key: str) -> list[Round]:
    """All rounds of a sweep in order, and none where it has no goal."""
    rows = connection.execute(select(round_).where(round_.c.sweep == key).order_by(round_.c.number))
    return [_round(row) for row in rows]


def _round(row: Row[Any]) -> Round:
    names = ("ordinal", "judged", "cost", "target")
    return Round(
        number=row.number,
        trajectories=row.trajectories,
        core_seconds=row.core_seconds,
        answers=[Answer.model_validate(one) for one in json.loads(row.answers)],
        places=[RoundPlace(**dict(zip(names, one, strict=True))) for one in json.loads(row.places)],
        settled=bool(row.settled),
        at=row.at,
    )


def _number(connection: Connection, key: str) -> int:
    return int(connection.scalar(select(func.count()).select_from(round_).where(round_.c.sweep == key)) or 0)


def _totals(connection: Connection, observation: str, numbers: dict[str, int]) -> dict[str, bytes]:
    found: dict[str, bytes] = {}
    for table in (total, mark):
        where = (table.c.ensemble, table.c.trajectories)
        for piece in chunks(sorted(numbers.items()), 200):
            statement = select(table.c.ensemble, table.c.accumulator).where(table.c.observation == observation)
            found.update((row[0], row[1]) for row in connection.execute(statement.where(tuple_(*where).in_(piece))))
    return found


def _place(row: Row[Any], accumulator: bytes | None) -> StoredPlace:
    return StoredPlace(
        ordinal=row.ordinal,
        ensemble=row.key,
        normal_form=json.loads(row.normal_form),
        judged=row.judged,
        most=row.most,
        stuck=row.stuck is not None,
        seconds=row.seconds_per_trajectory,
        accumulator=accumulator,
    )


def _is_current(connection: Connection, known: Evidence) -> bool:
    members = sweep_ensemble.c
    statement = select(members.ordinal, members.judged).where(members.sweep == known.sweep, members.judged > 0)
    now_judged = {row.ordinal: row.judged for row in connection.execute(statement)}
    judged = {place.ordinal: place.judged for place in known.places if place.judged}
    return now_judged == judged and _number(connection, known.sweep) == known.rounds


def _insert_round(connection: Connection, known: Evidence, decision: Decision) -> None:
    used = [place for place in known.places if place.judged or decision.targets.get(place.ordinal)]
    rows = [
        [one.ordinal, one.judged, decision.costs.get(one.ordinal), decision.targets.get(one.ordinal, one.judged)]
        for one in used
    ]
    values = {
        "sweep": known.sweep,
        "number": known.rounds + 1,
        "trajectories": sum(place.judged for place in known.places),
        "core_seconds": known.core_seconds,
        "answers": to_json(list(decision.answers)),
        "places": to_json(rows),
        "settled": int(bool(decision.met_by)),
        "at": now(),
    }
    connection.execute(insert(round_), values)


def _place_anew(connection: Connection, known: Evidence, decision: Decision) -> None:
    """Raise the N of places, and fill empty ones."""
    counter = select(sweep.c.commit_counter + 1).where(sweep.c.key == known.sweep).scalar_subquery()
    statement = (
        update(sweep_ensemble)
        .where(sweep_ensemble.c.sweep == known.sweep, sweep_ensemble.c.ordinal == bindparam("o"))
        .values(cap=bindparam("n"), changed=counter)
    )
    rows = [{"o": ordinal, "n": number} for ordinal, number in sorted(decision.targets.items()) if number]
    connection.execute(statement, rows)


def _note_answers(connection: Connection, key: str, decision: Decision) -> None:
    answers = to_json(list(decision.answers))
    connection.execute(update(sweep).where(sweep.c.key == key).values(answers=answers))
    _count_places(connection, key)


def _count_places(connection: Connection, key: str) -> None:
    members = sweep_ensemble.c
    mine = (members.sweep == key, or_(members.cap > 0, members.met_by.is_not(None)))
    placed, caps = connection.execute(select(func.count(), func.sum(members.cap)).where(*mine)).one()
    values = {"ensembles": placed, "trajectories_cap": int(caps)}
    connection.execute(update(sweep).where(sweep.c.key == key).values(**values))
