"""Invented values of trajectories, and the batches a worker would have returned for them."""

import hashlib
from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from sweepmill.accumulate import Accumulator
from sweepmill_service.store.results import BatchResult, Kept
from sweepmill_worker.kept import pack


def values(ensemble: str, observation: str, first: int, count: int, coordinates: int = 1) -> NDArray[np.int64]:
    """Integers [count, coordinates] that depend on the trajectory and nothing else."""
    rows = [
        hashlib.sha256(f"{ensemble}{observation}{k}".encode()).digest()[:coordinates]
        for k in range(first, first + count)
    ]
    return np.array([list(row) for row in rows], dtype=np.int64) % 7


def accumulator(ensemble: str, observation: str, first: int, count: int) -> Accumulator:
    """What a worker accumulates over trajectories [first, first + count)."""
    return Accumulator.from_values(values(ensemble, observation, first, count), first)


def result(
    ensemble: str,
    observations: Sequence[str],
    first: int,
    count: int,
    sweep: str,
    owner: str = "ada",
    seconds: float = 1.0,
    kept: bool = False,
) -> BatchResult:
    """The result of one task, with its values if they are kept."""
    made = {key: accumulator(ensemble, key, first, count) for key in observations}
    return BatchResult(
        ensemble=ensemble,
        first=first,
        count=count,
        accumulators={key: one.to_bytes() for key, one in made.items()},
        digests={key: one.digest for key, one in made.items()},
        seconds=seconds,
        worker="worker-1",
        versions={"sweepmill": "0"},
        sweep=sweep,
        owner=owner,
        values={key: Kept(*pack(values(ensemble, key, first, count))) for key in observations if kept},
    )
