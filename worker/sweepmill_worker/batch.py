"""A batch: trajectories [first, first + count) of one ensemble, accumulated exactly."""

from collections.abc import Mapping
from dataclasses import dataclass

from sweepmill.accumulate import Accumulator


@dataclass(frozen=True)
class Batch:
    """One accumulator per observation key."""

    ensemble: str
    first: int
    count: int
    accumulators: Mapping[str, Accumulator]
