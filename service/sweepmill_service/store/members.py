"""Ensembles of sweeps that are not settled yet, and how far each of their observations is."""

import json
from collections import defaultdict
from collections.abc import Collection, Iterable
from dataclasses import dataclass
from typing import Any, NamedTuple

from sqlalchemy import Connection, select

from sweepmill_service.plan.marks import Reach, ladder, next_mark, next_rung
from sweepmill_service.schema import ensemble, mark, sweep, sweep_ensemble, sweep_observation, total
from sweepmill_service.store.common import SAMPLING, SETTLED, WAITING, WITHDRAWN, chunks, is_placed

NOTHING = Reach(0, frozenset())
Reaches = dict[tuple[str, str], Reach]


class Rule(NamedTuple):
    """Standard error of every coordinate of an observation below a bound."""

    observation: str
    below: float


@dataclass
class SweepRow:
    """A sweep under its row lock; the counters are written back at the end of the transaction."""

    key: str
    state: str
    rules: tuple[Rule, ...]
    at_least: int
    has_goal: bool
    observations: tuple[str, ...]
    commit: int
    ensembles: int
    settled: int
    sampled: int
    charged: float = 0.0
    touched: bool = False

    def charge(self, seconds: float) -> None:
        """Add core-seconds."""
        self.charged += seconds
        self.touched = True

    def advance(self, trajectories: int) -> None:
        """Add trajectories sampled."""
        self.sampled += trajectories
        self.touched = True
        if self.state == WAITING and self.sampled:
            self.state = SAMPLING

    def settle_one(self) -> None:
        """Count one more ensemble as settled."""
        self.settled += 1
        self.touched = True
        if self.settled == self.ensembles:
            self.state = SETTLED


@dataclass(eq=False)
class Member:
    """An ensemble within a sweep, not settled."""

    sweep: SweepRow
    ensemble: str
    cap: int
    judged: int
    sampled: int

    @property
    def waits(self) -> bool:
        """Whether it has what the current round asks for: the goal is judged once all have."""
        return self.sweep.has_goal and self.judged >= self.cap

    @property
    def ladder(self) -> tuple[int, ...]:
        """All N at which it is to be judged."""
        return ladder(self.sweep.at_least, self.cap, bool(self.sweep.rules))

    def reaches(self, known: Reaches) -> list[Reach]:
        """How far each observation of the sweep is."""
        return [known.get((self.ensemble, observation), NOTHING) for observation in self.sweep.observations]

    def next_mark(self, known: Reaches) -> int:
        """The N at which it is judged next."""
        return next_mark(next_rung(self.ladder, self.judged), self.reaches(known))


def lock_ensembles(connection: Connection, keys: Collection[str]) -> dict[str, Any]:
    """Rows of the ensembles, locked in order of key until the transaction ends."""
    statement = select(ensemble).order_by(ensemble.c.key).with_for_update(key_share=True)
    rows: dict[str, Any] = {}
    for piece in chunks(sorted(keys)):
        rows.update((row.key, row) for row in connection.execute(statement.where(ensemble.c.key.in_(piece))))
    return rows


def open_members(
    connection: Connection, keys: Collection[str], charged: Iterable[str] = ()
) -> tuple[list[Member], dict[str, SweepRow]]:
    """Members of sweeps that somebody requests, and these sweeps with those to be charged, locked."""
    rows = _member_rows(connection, keys)
    sweeps = lock_sweeps(connection, {row.sweep for row in rows} | set(charged))
    members = [Member(sweeps[row.sweep], row.ensemble, row.cap, row.judged, row.sampled) for row in rows]
    return members, sweeps


def _member_rows(connection: Connection, keys: Collection[str]) -> list[Any]:
    columns = sweep_ensemble.c
    statement = (
        select(columns.sweep, columns.ensemble, columns.cap, columns.judged, columns.sampled)
        .join(sweep, sweep.c.key == columns.sweep)
        .where(columns.met_by.is_(None), is_placed(), sweep.c.state != WITHDRAWN)
    )
    return [row for piece in chunks(keys) for row in connection.execute(statement.where(columns.ensemble.in_(piece)))]


def lock_sweeps(connection: Connection, keys: Collection[str]) -> dict[str, SweepRow]:
    """Rows of the sweeps with their observations, locked in order of key until the transaction ends."""
    names: dict[str, list[str]] = defaultdict(list)
    rows: list[Any] = []
    for piece in chunks(sorted(keys)):
        columns = (sweep_observation.c.sweep, sweep_observation.c.observation)
        observed = select(*columns).where(sweep_observation.c.sweep.in_(piece))
        for key, observation in connection.execute(observed.order_by(sweep_observation.c.ordinal)):
            names[key].append(observation)
        locked = select(sweep).where(sweep.c.key.in_(piece)).order_by(sweep.c.key).with_for_update(key_share=True)
        rows.extend(connection.execute(locked))
    return {row.key: _sweep_row(row, names[row.key]) for row in rows}


def _sweep_row(row: Any, observations: list[str]) -> SweepRow:
    return SweepRow(
        key=row.key,
        state=row.state,
        rules=tuple(Rule(rule["observation"], rule["below"]) for rule in json.loads(row.rules)),
        at_least=row.at_least,
        has_goal=row.goal is not None,
        observations=tuple(dict.fromkeys(observations)),
        commit=row.commit_counter,
        ensembles=row.ensembles,
        settled=row.settled,
        sampled=row.trajectories_sampled,
    )


def reaches(connection: Connection, keys: Collection[str]) -> Reaches:
    """Prefix and marks of every observation of the ensembles."""
    prefixes: dict[tuple[str, str], int] = {}
    marks: dict[tuple[str, str], set[int]] = defaultdict(set)
    for piece in chunks(keys):
        columns = (total.c.ensemble, total.c.observation, total.c.trajectories)
        for one, observation, number in connection.execute(select(*columns).where(total.c.ensemble.in_(piece))):
            prefixes[one, observation] = number
        kept = (mark.c.ensemble, mark.c.observation, mark.c.trajectories)
        for one, observation, number in connection.execute(select(*kept).where(mark.c.ensemble.in_(piece))):
            marks[one, observation].add(number)
    return {pair: Reach(number, frozenset(marks[pair])) for pair, number in prefixes.items()}


def wanted_marks(members: Iterable[Member], known: Reaches) -> dict[str, set[int]]:
    """By ensemble, the N whose totals must be kept because a rule is still to be judged there."""
    wanted: dict[str, set[int]] = defaultdict(set)
    for member in members:
        if member.waits:
            continue
        wanted[member.ensemble].add(member.next_mark(known))
        wanted[member.ensemble].update(step for step in member.ladder if step > member.judged)
    return wanted
