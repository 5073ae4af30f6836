"""A batch: trajectories [first, first + count) of one ensemble, accumulated exactly."""

from collections.abc import Mapping
from dataclasses import dataclass, field

from sweepmill.accumulate import Accumulator
from sweepmill_worker.kept import Chunk


@dataclass(frozen=True)
class Batch:
    """One accumulator per observation key, and the values of those observations that keep them."""

    ensemble: str
    first: int
    count: int
    accumulators: Mapping[str, Accumulator]
    values: Mapping[str, Chunk] = field(default_factory=dict)
