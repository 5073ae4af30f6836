"""Sampling any ensemble, or any circuit written as data, by the one executor of such circuits."""

from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray

from sweepmill.ensemble import Ensemble
from sweepmill.presets import layered_form
from sweepmill_worker.clifford.engine import Readings
from sweepmill_worker.program.compile import compile_program
from sweepmill_worker.program.run import run_program

Region = tuple[int, ...]


def executed(
    form: Mapping[str, Any], key: tuple[int, int], count: int, reads: Sequence[int], regions: Sequence[Region]
) -> Readings:
    """Trajectories 0 .. count - 1 of a normal form."""
    return run_program(compile_program(form), key, 0, count, reads, regions)


def sampled(ensemble: Ensemble, count: int, reads: Sequence[int], regions: Sequence[Region]) -> Readings:
    """Trajectories 0 .. count - 1 of an ensemble, with the words of its own key."""
    return executed(layered_form(ensemble), ensemble.key_words, count, reads, regions)


def deviations(samples: NDArray[Any], exact: NDArray[np.float64]) -> NDArray[np.float64]:
    """z of the means of samples [count, ...]; what does not vary has to be exact and is left out."""
    means, errors = samples.mean(axis=0), samples.std(axis=0) / len(samples) ** 0.5
    varies = errors > 0
    np.testing.assert_allclose(means[~varies], exact[~varies], atol=1e-9)
    return np.asarray((means - exact)[varies] / errors[varies])


def intervals(sites: int) -> list[Region]:
    """All intervals of the open line."""
    return [tuple(range(a, b)) for a in range(sites) for b in range(a + 1, sites + 1)]
