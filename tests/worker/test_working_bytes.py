"""The bound on the memory of the stabilizer kernel, against what is allocated."""

import gc
import tracemalloc
from collections.abc import Callable

import pytest

from sweepmill_worker.clifford.engine import HybridChain, run, working_bytes


def peak_of(call: Callable[[], object]) -> int:
    """Bytes allocated at a time, those of the interpreter and of other threads included."""
    gc.collect()
    tracemalloc.start()
    call()
    _, peak = tracemalloc.get_traced_memory()
    tracemalloc.stop()
    return peak


@pytest.mark.parametrize("mixed", [False, True])
@pytest.mark.parametrize("sites", [2, 63, 200, 513])
def test_the_bound_holds_and_is_near(sites: int, mixed: bool) -> None:
    chain = HybridChain(sites, 2, False, mixed, 2**30)
    regions = [tuple(range(0, sites, 2))]  # by commutators, which take the most room
    peak = min(peak_of(lambda: run(chain, (1, 2), 0, 1, [2], regions)) for _ in range(5))
    assert peak <= working_bytes(sites, mixed) + 16_384  # results, the plan, and Python's own objects
    assert sites < 200 or working_bytes(sites, mixed) < 1.5 * peak
