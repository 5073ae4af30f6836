"""The bound on the memory of the stabilizer kernel, against what is allocated."""

import tracemalloc

import pytest

from sweepmill_worker.clifford.engine import HybridChain, run, working_bytes


@pytest.mark.parametrize("mixed", [False, True])
@pytest.mark.parametrize("sites", [2, 63, 200, 513])
def test_the_bound_holds_and_is_near(sites: int, mixed: bool) -> None:
    chain = HybridChain(sites, 2, False, mixed, 2**30)
    regions = [tuple(range(0, sites, 2))]  # by commutators, which take the most room
    run(chain, (1, 2), 0, 1, [2], regions)
    tracemalloc.start()
    run(chain, (1, 2), 0, 1, [2], regions)
    _, peak = tracemalloc.get_traced_memory()
    tracemalloc.stop()
    assert peak <= working_bytes(sites, mixed) + 16_384  # results, the plan, and Python's own objects
    assert sites < 200 or working_bytes(sites, mixed) < 1.5 * peak
