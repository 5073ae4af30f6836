"""Storing results: batches, totals, progress and charges in one transaction."""

from collections import defaultdict
from collections.abc import Mapping, Sequence
from typing import Any

from sqlalchemy import Connection, bindparam, insert, update

from sweepmill_service.schema import batch, ensemble, kept, request
from sweepmill_service.store.classify import Pair, Ranges, classify
from sweepmill_service.store.common import now, to_json
from sweepmill_service.store.folding import fold
from sweepmill_service.store.judging import judge_locked
from sweepmill_service.store.members import SweepRow, lock_ensembles, open_members, reaches, wanted_marks
from sweepmill_service.store.moving import advance, save_sweeps
from sweepmill_service.store.results import BatchResult, Outcome

SMOOTHING = 0.5  # weight of the latest batch in the seconds per trajectory


def commit(connection: Connection, results: Sequence[BatchResult]) -> Outcome:
    """Store every new result, fold what extends a prefix, judge what reached a rung, charge who asked for it.

    Storing a result twice changes nothing.
    """
    outcome = Outcome()
    keys = {result.ensemble for result in results}
    locked = lock_ensembles(connection, keys)
    members, sweeps = open_members(connection, keys, {result.sweep for result in results})
    known = reaches(connection, keys)
    ranges = classify(connection, results, known, outcome)
    chains = fold(connection, ranges, wanted_marks(members, known))
    _insert_batches(connection, ranges, chains)
    new = [result for result in results if _is_new(result, ranges)]
    _update_ensembles(connection, new, locked, outcome)
    _charge(connection, new, sweeps)
    after = outcome.reaches = reaches(connection, keys)
    advance(connection, members, after)
    judge_locked(connection, members, after, outcome)
    save_sweeps(connection, sweeps.values())
    return outcome


def _is_new(result: BatchResult, ranges: dict[Pair, Ranges]) -> bool:
    pairs = ((result.ensemble, observation) for observation in result.accumulators)
    return any(pair in ranges and ranges[pair].fresh.get(result.first) is result for pair in pairs)


def _insert_batches(connection: Connection, ranges: dict[Pair, Ranges], chains: dict[Pair, list[int]]) -> None:
    at = now()
    rows = [
        _batch_row(result, pair[1], first in chains.get(pair, ()), at)
        for pair, one in ranges.items()
        for first, result in one.fresh.items()
    ]
    if rows:
        connection.execute(insert(batch), rows)
    values = [
        {"ensemble": result.ensemble, "observation": pair[1], "first": first} | result.values[pair[1]]._asdict()
        for pair, one in ranges.items()
        for first, result in one.fresh.items()
        if pair[1] in result.values
    ]
    if values:
        connection.execute(insert(kept), values)


def _batch_row(result: BatchResult, observation: str, folded: bool, at: float) -> dict[str, Any]:
    return {
        "ensemble": result.ensemble,
        "observation": observation,
        "first": result.first,
        "count": result.count,
        "digest": result.digests[observation],
        "accumulator": None if folded else result.accumulators[observation],
        "seconds": result.seconds / len(result.accumulators),
        "worker": result.worker,
        "versions": to_json(dict(result.versions)),
        "at": at,
    }


def _update_ensembles(
    connection: Connection, new: Sequence[BatchResult], locked: dict[str, Any], outcome: Outcome
) -> None:
    spent: dict[str, float] = defaultdict(float)
    pace = {key: row.seconds_per_trajectory for key, row in locked.items()}
    for result in new:
        spent[result.ensemble] += result.seconds
        latest = result.seconds / result.count
        before = pace[result.ensemble]
        pace[result.ensemble] = latest if before is None else before + SMOOTHING * (latest - before)
    rows = [{"k": key, "pace": pace[key], "more": seconds} for key, seconds in spent.items()]
    if rows:
        statement = update(ensemble).where(ensemble.c.key == bindparam("k"))
        more = ensemble.c.core_seconds + bindparam("more")
        connection.execute(statement.values(seconds_per_trajectory=bindparam("pace"), core_seconds=more), rows)
    if outcome.stuck:
        stuck = [{"k": key, "why": why} for key, why in outcome.stuck.items()]
        statement = update(ensemble).where(ensemble.c.key == bindparam("k"))
        connection.execute(statement.values(stuck=bindparam("why"), stuck_kind="determinism"), stuck)


def _charge(connection: Connection, new: Sequence[BatchResult], sweeps: Mapping[str, SweepRow]) -> None:
    """Core-seconds go to the request a batch was dispatched for, and to its sweep."""
    spent: dict[tuple[str, str], float] = defaultdict(float)
    for result in new:
        spent[result.sweep, result.owner] += result.seconds
        sweeps[result.sweep].charge(result.seconds)
    if spent:
        rows = [{"s": key, "o": owner, "more": seconds} for (key, owner), seconds in sorted(spent.items())]
        mine = update(request).where(request.c.sweep == bindparam("s"), request.c.owner == bindparam("o"))
        connection.execute(mine.values(core_seconds=request.c.core_seconds + bindparam("more")), rows)
