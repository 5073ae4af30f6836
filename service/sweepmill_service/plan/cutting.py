"""Cutting the next task out of an ensemble."""

import math

from sweepmill_service.plan.entries import Entry, PlanMember
from sweepmill_service.plan.task import SizeRules, Task
from sweepmill_worker.kept import BATCH_BYTES


def next_task(entry: Entry, member: PlanMember, owner: str, seconds: float, speculative: bool = False) -> Task | None:
    """The next task of an ensemble for a sweep, about ``seconds`` long; None if nothing is left to hand out.

    It carries every observation, of any live sweep, whose next trajectory is the same, and ends where a total must
    be kept, where another batch begins, where another observation joins, or before its values are too many.
    """
    target = entry.speculative_target(member) if speculative else entry.likely_target(member)
    first = entry.first_needed(member)
    if first >= target:
        return None
    chosen, ends = _companions(entry, first, speculative)
    ends += [end for key in chosen if (end := entry.track(key).room(first)) is not None]
    ends += [target, *([] if (mark := entry.cut(first)) is None else [mark])]
    if kept := sum(entry.kept_bytes.get(key, 0) for key in chosen):
        ends.append(first + max(1, BATCH_BYTES // kept))
    count = min(max(1, int(seconds / entry.seconds_per_trajectory)), min(ends) - first)
    attempt = entry.faults.get(first, 0) + 1
    predicted = count * entry.seconds_per_trajectory
    return Task(entry.key, chosen, first, count, member.sweep, owner, attempt, predicted)


def _companions(entry: Entry, first: int, speculative: bool) -> tuple[tuple[str, ...], list[int]]:
    """Observations that need trajectory ``first`` next, and where others will join."""
    chosen: list[str] = []
    joins: list[int] = []
    for key in entry.observations():
        following = entry.track(key).next_needed
        if following >= entry.limit(key, speculative):
            continue
        if following == first:
            chosen.append(key)
        elif following > first:
            joins.append(following)
    return tuple(sorted(chosen)), joins


def batch_seconds(entry: Entry, rules: SizeRules, sweep_remaining: float, threads: int) -> float:
    """Core-seconds of the next batch: short at first, growing in steps, shared out near the end of a sweep."""
    if entry.measured_seconds is None:
        wanted = min(rules.first_batch_seconds, rules.first_batch_count * entry.seconds_per_trajectory)
    else:
        wanted = rules.batch_seconds
        if entry.largest:
            wanted = min(wanted, rules.growth * entry.largest * entry.seconds_per_trajectory)
    share = sweep_remaining / max(1, threads)
    return min(wanted, max(share, rules.least_seconds)) if math.isfinite(share) else wanted
