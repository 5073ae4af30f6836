"""At which N an ensemble is judged next."""

from collections.abc import Iterable
from functools import lru_cache
from typing import NamedTuple

from sweepmill.ladder import rungs


class Reach(NamedTuple):
    """Length of an observation's prefix, and the N below it at which its total was kept."""

    prefix: int
    marks: frozenset[int]

    def can_reach(self, number: int) -> bool:
        """Whether the total of the first ``number`` trajectories is there or can still be met on the way."""
        return self.prefix <= number or number in self.marks

    def has(self, number: int) -> bool:
        """Whether the total of the first ``number`` trajectories is there."""
        return self.prefix == number or number in self.marks


# Where totals are kept whoever samples: a later sweep with a smaller cap or a laxer rule finds one near its N.
COMMON_MARKS = tuple(200 * 4**step for step in range(20))


@lru_cache(maxsize=4096)
def ladder(at_least: int, cap: int, has_rules: bool) -> tuple[int, ...]:
    """The N at which an ensemble of a sweep is to be judged."""
    return rungs(at_least, cap) if has_rules else (cap,)


def next_rung(steps: tuple[int, ...], judged: int) -> int:
    """First rung above the last N judged; the last rung once all are behind."""
    return next((step for step in steps if step > judged), steps[-1])


def next_mark(rung: int, reaches: Iterable[Reach]) -> int:
    """Smallest N >= rung at which every observation has its total or can still get it.

    The rung itself, unless an observation was sampled beyond it for somebody else without keeping the total there.
    """
    known = list(reaches)
    if all(reach.can_reach(rung) for reach in known):
        return rung
    kept = {number for reach in known for number in (reach.prefix, *reach.marks) if number > rung}
    for number in sorted(kept):
        if all(reach.can_reach(number) for reach in known):
            return number
    raise AssertionError("the longest prefix is always reachable")
