"""Which results are new, which were there already, which overlap others."""

from collections import defaultdict
from collections.abc import Collection, Sequence
from dataclasses import dataclass, field
from typing import Any, TypeAlias

from sqlalchemy import Connection, and_, select, tuple_

from sweepmill_service.schema import batch, kept
from sweepmill_service.store.common import chunks
from sweepmill_service.store.members import NOTHING, Reaches
from sweepmill_service.store.results import BatchResult, Outcome, Refused

Pair = tuple[str, str]
Identity: TypeAlias = tuple[str, str | None]  # digests of the total and of kept values


@dataclass
class Ranges:
    """What is stored of one (ensemble, observation) near the results at hand."""

    prefix: int
    rows: dict[int, tuple[int, Identity]] = field(default_factory=dict)  # first -> (count, digests)
    islands: dict[int, int] = field(default_factory=dict)  # first -> count, not folded yet
    fresh: dict[int, BatchResult] = field(default_factory=dict)  # accepted now

    def verdict(self, result: BatchResult, identity: Identity) -> str | None:
        """Why a result is refused, None if it is new."""
        if result.first in self.rows:
            count, known = self.rows[result.first]
            if count != result.count:
                return "overlap"
            return "duplicate" if known == identity else "determinism"
        if result.first < self.prefix or any(
            first < result.first + result.count and result.first < first + count
            for first, count in self.islands.items()
        ):
            return "overlap"
        return None

    def accept(self, result: BatchResult, identity: Identity) -> None:
        """Count a result as stored."""
        self.rows[result.first] = (result.count, identity)
        self.islands[result.first] = result.count
        self.fresh[result.first] = result

    def chain(self) -> list[int]:
        """Firsts of the batches that extend the prefix without a gap, in order."""
        firsts: list[int] = []
        end = self.prefix
        while end in self.islands:
            firsts.append(end)
            end += self.islands[end]
        return firsts


def classify(
    connection: Connection, results: Sequence[BatchResult], known: Reaches, outcome: Outcome
) -> dict[Pair, Ranges]:
    """Sort the results in; refusals go to the outcome, and an ensemble that contradicts itself becomes stuck."""
    ranges = _stored(connection, results, known)
    for result in results:
        for observation in result.accumulators:
            _place(result, observation, ranges[result.ensemble, observation], outcome)
    return {pair: one for pair, one in ranges.items() if one.fresh}


def _place(result: BatchResult, observation: str, ranges: Ranges, outcome: Outcome) -> None:
    identity = result.identity(observation)
    why = ranges.verdict(result, identity)
    if why is None:
        ranges.accept(result, identity)
        return
    refused: Any = (result.ensemble, observation, result.first, result.count, why)
    outcome.refused.append(Refused(*refused))
    if why == "determinism":
        outcome.stuck[result.ensemble] = (
            f"determinism fault: trajectories {result.first} to {result.first + result.count - 1} gave other "
            f"values on {result.worker} than the batch that is stored"
        )


def _stored(connection: Connection, results: Sequence[BatchResult], known: Reaches) -> dict[Pair, Ranges]:
    pairs = {(result.ensemble, observation) for result in results for observation in result.accumulators}
    ranges = {pair: Ranges(known.get(pair, NOTHING).prefix) for pair in pairs}
    for row in _rows(connection, results):
        if (pair := (row.ensemble, row.observation)) in ranges:
            ranges[pair].rows[row.first] = (row.count, (row.digest, row.values))
    for pair, islands in unfolded(connection, {result.ensemble for result in results}).items():
        if pair in ranges:
            ranges[pair].islands.update(islands)
    return ranges


def _rows(connection: Connection, results: Sequence[BatchResult]) -> list[Any]:
    keys = ("ensemble", "observation", "first")
    same = and_(*(kept.c[name] == batch.c[name] for name in keys))
    columns = (*(batch.c[name] for name in keys), batch.c.count, batch.c.digest, kept.c.digest.label("values"))
    both = select(*columns).select_from(batch.outerjoin(kept, same))
    places = {(result.ensemble, result.first) for result in results}
    rows: list[Any] = []
    for piece in chunks(sorted(places), 200):
        where = tuple_(batch.c.ensemble, batch.c.first).in_(piece)
        rows.extend(connection.execute(both.where(where)))
    return rows


def unfolded(connection: Connection, ensembles: Collection[str]) -> dict[Pair, dict[int, int]]:
    """Batches that wait for a gap before them to close: first -> count by (ensemble, observation)."""
    found: dict[Pair, dict[int, int]] = defaultdict(dict)
    columns = (batch.c.ensemble, batch.c.observation, batch.c.first, batch.c.count)
    for piece in chunks(ensembles):
        where = (batch.c.ensemble.in_(piece), batch.c.accumulator.is_not(None))
        for ensemble, observation, first, count in connection.execute(select(*columns).where(*where)):
            found[ensemble, observation][first] = count
    return found
