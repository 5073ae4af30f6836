"""Folding batches into totals: one merge pass and one write per (ensemble, observation) and transaction."""

import hashlib
from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

from sqlalchemy import Connection, bindparam, select, tuple_, update

from sweepmill.accumulate import Accumulator
from sweepmill_service.plan.marks import COMMON_MARKS
from sweepmill_service.schema import batch, mark, total
from sweepmill_service.store.classify import Pair, Ranges
from sweepmill_service.store.common import chunks, insert_all, replace_all

Blobs = dict[tuple[str, str, int], bytes]


@dataclass
class _Fold:
    totals: list[dict[str, Any]] = field(default_factory=list)
    marks: list[dict[str, Any]] = field(default_factory=list)
    folded: list[dict[str, Any]] = field(default_factory=list)  # rows of earlier commits


def fold(
    connection: Connection, ranges: Mapping[Pair, Ranges], wanted: Mapping[str, set[int]]
) -> dict[Pair, list[int]]:
    """Extend totals by every batch that follows without a gap; returns the firsts folded, by pair.

    A total about to leave an N of ``wanted``, or a common mark, is kept there.
    """
    chains = {pair: chain for pair, one in ranges.items() if (chain := one.chain())}
    totals = _totals(connection, list(chains))
    earlier = [(*pair, first) for pair, chain in chains.items() for first in chain if first not in ranges[pair].fresh]
    stored = _accumulators(connection, earlier)
    work = _Fold()
    for pair, chain in chains.items():
        _fold_one(pair, ranges[pair], chain, totals.get(pair), stored, wanted.get(pair[0], set()), work)
    _write(connection, work)
    return chains


def _fold_one(
    pair: Pair,
    ranges: Ranges,
    chain: list[int],
    start: bytes | None,
    stored: Blobs,
    wanted: set[int],
    work: _Fold,
) -> None:
    ensemble, observation = pair
    place = {"ensemble": ensemble, "observation": observation}
    sum_so_far = None if start is None else Accumulator.from_bytes(start)
    for first in chain:
        if sum_so_far is not None and (first in wanted or first in COMMON_MARKS):
            work.marks.append(place | _content(sum_so_far, first))
        if first in ranges.fresh:
            data = ranges.fresh[first].accumulators[observation]
        else:
            data = stored[ensemble, observation, first]
            work.folded.append({"e": ensemble, "o": observation, "f": first})
        piece = Accumulator.from_bytes(data)
        sum_so_far = piece if sum_so_far is None else sum_so_far.merge(piece)
    assert sum_so_far is not None
    ranges.prefix = chain[-1] + ranges.islands[chain[-1]]
    work.totals.append(place | _content(sum_so_far, ranges.prefix))


def _content(accumulator: Accumulator, number: int) -> dict[str, Any]:
    data = accumulator.to_bytes()
    return {"trajectories": number, "accumulator": data, "digest": hashlib.sha256(data).hexdigest()}


def _totals(connection: Connection, pairs: list[Pair]) -> dict[Pair, bytes]:
    found: dict[Pair, bytes] = {}
    for piece in chunks(pairs, 200):
        statement = select(total).where(tuple_(total.c.ensemble, total.c.observation).in_(piece))
        found.update(((row.ensemble, row.observation), row.accumulator) for row in connection.execute(statement))
    return found


def _accumulators(connection: Connection, places: list[tuple[str, str, int]]) -> Blobs:
    found: Blobs = {}
    for piece in chunks(places, 200):
        statement = select(batch).where(tuple_(batch.c.ensemble, batch.c.observation, batch.c.first).in_(piece))
        found.update(
            ((row.ensemble, row.observation, row.first), row.accumulator) for row in connection.execute(statement)
        )
    return found


def _write(connection: Connection, work: _Fold) -> None:
    replace_all(connection, total, work.totals)
    insert_all(connection, mark, work.marks)
    if work.folded:
        drop = update(batch).where(
            batch.c.ensemble == bindparam("e"),
            batch.c.observation == bindparam("o"),
            batch.c.first == bindparam("f"),
        )
        connection.execute(drop.values(accumulator=None), work.folded)
