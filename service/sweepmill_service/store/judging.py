"""Judging stopping rules at their rungs, and freezing what settled."""

import hashlib
import json
from collections.abc import Collection, Iterator, Mapping, Sequence
from typing import Any, Literal, NamedTuple

from sqlalchemy import Connection, bindparam, delete, exists, func, select, tuple_

from sweepmill.accumulate import Accumulator
from sweepmill.coordinates import coordinates
from sweepmill.ensemble import Ensemble
from sweepmill.observation import observation_from_normal_form
from sweepmill.statistics import needed_trajectories, rule_met
from sweepmill_service.plan.marks import COMMON_MARKS
from sweepmill_service.schema import ensemble, mark, observation, sweep, sweep_ensemble, total
from sweepmill_service.store.common import WITHDRAWN, chunks, insert_missing
from sweepmill_service.store.members import (
    Member,
    Reaches,
    Rule,
    lock_ensembles,
    open_members,
    reaches,
)
from sweepmill_service.store.moving import advance, place, save_sweeps, update_member
from sweepmill_service.store.results import Outcome, Verdict

KEPT_BYTES = 16_384  # a total at an unmet rung is kept for later sweeps up to this size
Place = tuple[str, str, int]  # ensemble, observation, N


class _Due(NamedTuple):
    member: Member
    number: int

    def places(self) -> Iterator[Place]:
        for key in self.member.sweep.observations:
            yield self.member.ensemble, key, self.number


class Kept(NamedTuple):
    """A total of the first N trajectories; ``accumulator`` only where a rule reads it."""

    digest: str
    accumulator: bytes | None


def judge(connection: Connection, ensembles: Collection[str]) -> Outcome:
    """Judge every open member of these ensembles as far as its totals allow."""
    outcome = Outcome()
    lock_ensembles(connection, ensembles)
    members, sweeps = open_members(connection, ensembles)
    known = outcome.reaches = reaches(connection, ensembles)
    advance(connection, members, known)
    judge_locked(connection, members, known, outcome)
    save_sweeps(connection, sweeps.values())
    return outcome


def judge_locked(connection: Connection, members: Sequence[Member], known: Reaches, outcome: Outcome) -> None:
    """The same, under locks already taken; verdicts go to the outcome."""
    judged: set[str] = set()
    waiting = list(members)
    while due := [_Due(member, n) for member in waiting if (n := _number_due(member, known)) is not None]:
        _judge_round(connection, due, known, outcome)
        judged.update(one.member.ensemble for one in due)
        met = {(verdict.sweep, verdict.ensemble) for verdict in outcome.verdicts if verdict.met_by}
        waiting = [one.member for one in due if (one.member.sweep.key, one.member.ensemble) not in met]
    for piece in chunks(sorted(judged)):
        _drop_marks(connection, piece)


def freeze(connection: Connection, members: Mapping[Member, Literal["error", "cap"]], outcome: Outcome) -> None:
    """Settle members at the N they were last judged at, under locks already taken; verdicts go to the outcome."""
    due = [_Due(member, member.judged) for member in members]
    kept = _kept_totals(connection, due, outcome.reaches)
    verdicts = [Verdict(member.sweep.key, member.ensemble, member.judged, by, None) for member, by in members.items()]
    _keep_totals(connection, due, outcome.reaches)
    if due:
        _save(connection, due, verdicts, kept)
    outcome.verdicts.extend(verdicts)
    sweeps = {member.sweep.key: member.sweep for member in members}
    outcome.settled_sweeps.update(key for key, row in sweeps.items() if row.settled == row.ensembles)


def _number_due(member: Member, known: Reaches) -> int | None:
    if member.waits:
        return None
    number = member.next_mark(known)
    return number if all(reach.has(number) for reach in member.reaches(known)) else None


def _judge_round(connection: Connection, due: Sequence[_Due], known: Reaches, outcome: Outcome) -> None:
    kept = _kept_totals(connection, due, known)
    forms = _normal_forms(connection, due)
    verdicts = [_verdict(one, kept, forms) for one in due]
    settled = [one for one, verdict in zip(due, verdicts, strict=True) if verdict.met_by]
    needed = [one for one in due if one in settled or one.member.sweep.has_goal]
    _keep_totals(connection, needed, known)
    _keep_totals(connection, [one for one in due if one not in needed], known, KEPT_BYTES)
    _save(connection, due, verdicts, kept)
    outcome.verdicts.extend(verdicts)
    outcome.settled_sweeps.update(
        one.member.sweep.key for one in settled if one.member.sweep.settled == one.member.sweep.ensembles
    )


def _verdict(one: _Due, kept: dict[Place, Kept], forms: dict[str, Any]) -> Verdict:
    if one.member.sweep.has_goal:
        return Verdict(one.member.sweep.key, one.member.ensemble, one.number, None, None)
    met, needed = _rules(one, kept, forms)
    by: Literal["error", "cap"] | None = "error" if met else "cap" if one.number >= one.member.cap else None
    return Verdict(one.member.sweep.key, one.member.ensemble, one.number, by, needed)


def _rules(one: _Due, kept: dict[Place, Kept], forms: dict[str, Any]) -> tuple[bool, int | None]:
    """Whether all rules hold, and if not the N they are extrapolated to need."""
    if not one.member.sweep.rules:
        return False, None
    results = [_rule(rule, one, kept, forms) for rule in one.member.sweep.rules]
    return all(met for met, _ in results), max(needed for _, needed in results)


def _rule(rule: Rule, one: _Due, kept: dict[Place, Kept], forms: dict[str, Any]) -> tuple[bool, int]:
    data = kept[one.member.ensemble, rule.observation, one.number].accumulator
    assert data is not None
    accumulator = Accumulator.from_bytes(data)
    read = observation_from_normal_form(forms[rule.observation])
    places = coordinates(Ensemble.from_normal_form(forms[one.member.ensemble]), read)
    met = rule_met(accumulator, places, rule.below)
    return met, 0 if met else needed_trajectories(accumulator, places, rule.below)


def _kept_totals(connection: Connection, due: Sequence[_Due], known: Reaches) -> dict[Place, Kept]:
    ruled = {(one.member.ensemble, rule.observation, one.number) for one in due for rule in one.member.sweep.rules}
    plain = {place for one in due for place in one.places()} - ruled
    kept: dict[Place, Kept] = {}
    for places, with_data in ((ruled, True), (plain, False)):
        at_prefix = {place for place in places if known[place[:2]].prefix == place[2]}
        kept |= _read(connection, total, at_prefix, with_data)
        kept |= _read(connection, mark, places - at_prefix, with_data)
    return kept


def _read(connection: Connection, table: Any, places: Collection[Place], with_data: bool) -> dict[Place, Kept]:
    key = (table.c.ensemble, table.c.observation, table.c.trajectories)
    columns = [*key, table.c.digest, *([table.c.accumulator] if with_data else [])]
    found: dict[Place, Kept] = {}
    for piece in chunks(sorted(places), 200):
        for row in connection.execute(select(*columns).where(tuple_(*key).in_(piece))):
            data = row.accumulator if with_data else None
            found[row.ensemble, row.observation, row.trajectories] = Kept(row.digest, data)
    return found


def _normal_forms(connection: Connection, due: Sequence[_Due]) -> dict[str, Any]:
    """Normal forms by key, of ensembles and observations that a rule is judged on."""
    ruled = [one.member for one in due if one.member.sweep.rules]
    wanted: list[tuple[Any, set[str]]] = [
        (ensemble, {member.ensemble for member in ruled}),
        (observation, {rule.observation for member in ruled for rule in member.sweep.rules}),
    ]
    forms: dict[str, Any] = {}
    for table, keys in wanted:
        for piece in chunks(sorted(keys)):
            statement = select(table.c.key, table.c.normal_form).where(table.c.key.in_(piece))
            forms.update((row.key, json.loads(row.normal_form)) for row in connection.execute(statement))
    return forms


def _keep_totals(connection: Connection, due: Sequence[_Due], known: Reaches, largest: int | None = None) -> None:
    """Keep totals at the N of these judgements, if they are not larger than ``largest`` bytes.

    Where N is the prefix they are copied from the total; elsewhere they have been kept already.
    """
    pairs = {place[:2] for one in due for place in one.places() if known[place[:2]].prefix == one.number}
    columns = ("ensemble", "observation", "trajectories", "accumulator", "digest")
    for piece in chunks(sorted(pairs), 200):
        rows = select(*(total.c[name] for name in columns)).where(
            tuple_(total.c.ensemble, total.c.observation).in_(piece)
        )
        if largest is not None:
            rows = rows.where(func.length(total.c.accumulator) <= largest)
        connection.execute(insert_missing(connection, mark).from_select(columns, rows))


def _save(connection: Connection, due: Sequence[_Due], verdicts: Sequence[Verdict], kept: dict[Place, Kept]) -> None:
    rows: list[dict[str, Any]] = []
    for one, verdict in zip(due, verdicts, strict=True):
        one.member.judged = one.number
        frozen: dict[str, Any] = {"by": None, "n": None, "d": None}
        if verdict.met_by is not None:
            one.member.sweep.settle_one()
            frozen = {"by": verdict.met_by, "n": one.number, "d": frozen_digest(one.places(), kept)}
        one.member.sweep.touched = True
        rows.append(place(one.member) | {"j": one.number} | frozen)
    values: dict[str, Any] = {
        "judged": bindparam("j"),
        "met_by": bindparam("by"),
        "trajectories": bindparam("n"),
        "digest": bindparam("d"),
        "changed": bindparam("c"),
    }
    connection.execute(update_member().values(**values), rows)


def frozen_digest(places: Iterator[Place], kept: dict[Place, Kept]) -> str:
    """SHA-256 over the sorted lines ``observation key:N:digest of the total``."""
    lines = sorted(f"{place[1]}:{place[2]}:{kept[place].digest}" for place in places)
    return hashlib.sha256("\n".join(lines).encode()).hexdigest()


def _drop_marks(connection: Connection, ensembles: Sequence[str]) -> None:
    """Forget large totals at rungs that were judged and not met; what is frozen or still to be judged stays.

    Small ones stay as well: a later sweep with a laxer rule is then judged at the same N as if it had come first.
    """
    mine = sweep_ensemble.c.ensemble == mark.c.ensemble
    frozen = exists().where(mine, sweep_ensemble.c.trajectories == mark.c.trajectories)
    awaited = exists().where(
        mine,
        sweep_ensemble.c.met_by.is_(None),
        sweep_ensemble.c.judged < mark.c.trajectories,
        sweep.c.key == sweep_ensemble.c.sweep,
        sweep.c.state != WITHDRAWN,
    )
    held = exists().where(
        mine,
        sweep_ensemble.c.met_by.is_(None),
        sweep_ensemble.c.judged == mark.c.trajectories,
        sweep.c.key == sweep_ensemble.c.sweep,
        sweep.c.goal.is_not(None),
    )
    large = (func.length(mark.c.accumulator) > KEPT_BYTES, mark.c.trajectories.not_in(COMMON_MARKS))
    connection.execute(delete(mark).where(mark.c.ensemble.in_(ensembles), ~frozen, ~awaited, ~held, *large))
