"""Everything this package raises, one base class to catch.

SweepmillError
├── SpecificationError     a sweep that cannot be accepted: every fault with its path
├── AccumulatorOverflow    a sum beyond 127 bits: nothing is stored
├── AccumulatorMismatch    totals of different shapes cannot be merged
└── MissingExtra           an optional dependency is not installed
"""

from collections.abc import Iterable
from typing import NamedTuple


class SweepmillError(Exception):
    """Base of all errors of this package."""


class Fault(NamedTuple):
    """One thing wrong with a specification: where, and what would pass."""

    path: str
    message: str

    def __str__(self) -> str:
        return f"{self.path}: {self.message}" if self.path else self.message


class SpecificationError(SweepmillError):
    """A specification refused as a whole, with every fault listed."""

    def __init__(self, faults: Iterable[Fault]) -> None:
        self.faults = tuple(faults)
        super().__init__("\n".join(map(str, self.faults)))


class AccumulatorOverflow(SweepmillError):
    """A sum left the range of 127-bit integers."""


class AccumulatorMismatch(SweepmillError):
    """Two accumulators do not describe the same coordinates."""


class MissingExtra(SweepmillError):
    """A feature needs an optional dependency."""

    def __init__(self, feature: str, extra: str) -> None:
        self.extra = extra
        super().__init__(f'{feature} needs an optional dependency: pip install "sweepmill[{extra}]"')
