"""When a sweep would be done on the pool as it is now: behind what its owner has waiting, beside what others have."""

from collections.abc import Sequence
from typing import Final, NamedTuple

from sweepmill_service.plan.sweeps import Waiting

EFFICIENCY: Final = 0.9
"""Core-seconds of sampling per core and second, where a pool was not watched; the rest is handing out and storing."""
SLOWEST: Final = 0.01
LATENCY: Final = 1.0
"""Seconds until the first batches are out, and until the last ones are stored."""
DEVIATION: Final = 0.15
"""Standard deviation of the logarithm of the time, costs being known: batches end unevenly, and others come and go."""


class Share(NamedTuple):
    """The pool as one owner meets it: core-seconds that come first, those of each other owner, and cores.

    ``pace``: core-seconds of sampling that a core gives in a second.
    """

    before: float
    others: tuple[float, ...]
    cores: int
    pace: float = EFFICIENCY


def share_of(waiting: Sequence[Waiting], sweep: str, owner: str, priority: int, cores: int) -> Share:
    """What stands before and beside a sweep that the owner submits now, or has submitted already.

    An owner's sweeps are sampled by priority, earlier ones first; what several owners request is shared by them.
    """
    mine = next((one for one in waiting if one.sweep == sweep and one.owner == owner), None)
    rank = (-priority, float("inf")) if mine is None else (-mine.priority, mine.at)
    before = sum(one.core_seconds for one in waiting if one.owner == owner and one.sweep != sweep and one.rank < rank)
    others: dict[str, float] = {}
    for one in waiting:
        if one.owner != owner and one.sweep != sweep:
            others[one.owner] = others.get(one.owner, 0.0) + one.core_seconds
    return Share(before, tuple(others.values()), cores)


def seconds_to_finish(core_seconds: float, longest: float, share: Share) -> float:
    """Seconds until so many core-seconds are done; ``longest`` is the time of the longest trajectory.

    Owners with work get equal shares: while one is served, every other one is served as much, or all it has.
    """
    if core_seconds <= 0:
        return 0.0
    until = share.before + core_seconds
    served = until + sum(min(other, until) for other in share.others)
    return LATENCY + max(served / (max(share.pace, SLOWEST) * share.cores), longest)
