"""Raw integers of one observation on a block of trajectories."""

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from sweepmill.observation import OutcomeRandomness, RecordBits, wants_histogram
from sweepmill.times import Reading
from sweepmill_worker.clifford.engine import Readings


@dataclass(frozen=True)
class Values:
    """``raw`` int64 [n, C] or [n, C, 2]: what an accumulator takes; ``single`` [n, C, m]: readings for a histogram."""

    raw: NDArray[np.int64]
    single: NDArray[np.int64] | None = None


def state_values(
    counts: Readings,
    times: tuple[Reading, ...],
    layer_index: dict[int, int],
    indices: NDArray[np.int64],
    signs: tuple[int, ...],
    histogram: bool,
) -> Values:
    """Sums of a state's integers, over the layers of a reading and over translations."""
    blocks, singles = [], []
    for time in times:
        rows = [layer_index[n] for n in time.layers]
        # [n, layers, positions, readings]
        readings = sum(
            sign * counts.entropies[:, rows][:, :, indices[..., term]].astype(np.int64)
            for term, sign in enumerate(signs)
        )
        readings = np.asarray(readings)
        blocks.append(readings.sum(axis=(1, 3)))
        if histogram:
            singles.append(readings.transpose(0, 2, 1, 3).reshape(len(readings), indices.shape[0], -1))
    single = np.concatenate(singles, axis=1) if histogram else None
    return Values(np.concatenate(blocks, axis=1), single)


def record_values(counts: Readings, times: tuple[Reading, ...], histogram: bool) -> Values:
    """Random outcomes in layers 1 … n, summed over the layers n of a reading."""
    so_far = np.cumsum(counts.random, axis=1, dtype=np.int64)
    picked = [so_far[:, [n - 1 for n in time.layers]] for time in times]
    raw = np.stack([part.sum(axis=1) for part in picked], axis=1)
    if not histogram:
        return Values(raw)
    return Values(raw, np.stack(picked, axis=1))


def randomness_values(counts: Readings, times: tuple[Reading, ...], cumulative: bool) -> Values:
    """Pairs (random outcomes, measurements) of the layers of a reading, or of all layers so far."""
    pair = np.stack([counts.random, counts.measured], axis=-1).astype(np.int64)
    if cumulative:
        pair = np.cumsum(pair, axis=1)
    return Values(np.stack([pair[:, [n - 1 for n in time.layers]].sum(axis=1) for time in times], axis=1))


def values_of(
    observation: Any,
    counts: Readings,
    times: tuple[Reading, ...],
    layer_index: dict[int, int],
    indices: NDArray[np.int64] | None,
    signs: tuple[int, ...],
) -> Values:
    """Raw integers of any observation; coordinates in the order of ``sweepmill.coordinates``."""
    if isinstance(observation, RecordBits):
        return record_values(counts, times, wants_histogram(observation))
    if isinstance(observation, OutcomeRandomness):
        return randomness_values(counts, times, observation.cumulative)
    assert indices is not None
    return state_values(counts, times, layer_index, indices, signs, wants_histogram(observation))
