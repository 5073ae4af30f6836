"""How soon a pool is ready once kernels are compiled, and what its first batch costs over the later ones.

    python tests/benchmarks/bench_start.py [--quick] [--workers 2]

"first / later" is the processor time per trajectory of the very first batch on a fresh worker over the median of the
batches that follow on that worker: 1.0 means that nothing is left to load.
"""

import argparse
import os
import signal
import sys
import time
from collections.abc import Callable
from pathlib import Path
from statistics import median
from typing import Any

from sweepmill.ensemble import Ensemble
from sweepmill.observation import Entropy
from sweepmill_service.pool import LocalPool

sys.path.insert(0, str(Path(__file__).parents[1]))

from support.pools import until, worker_pids

BATCH_SECONDS = 0.5
BATCHES = 9
ENTROPY = Entropy(quantity="entropy").normal_form()
ENSEMBLES = {
    "hybrid-clifford, L = 128": Ensemble.of("hybrid-clifford", sites=128, measurement_rate=0.16, layers=512),
    "edge-bath, L = 64": Ensemble.of("edge-bath", sites=64, layers=128),
    "projective-ising, L = 512": Ensemble.of("projective-ising", sites=512, bond_rate=0.5, layers=1024),
}


def timed(action: Callable[[], Any]) -> float:
    """Wall-clock seconds."""
    begin = time.perf_counter()
    action()
    return time.perf_counter() - begin


def batch(pool: LocalPool, ensemble: Ensemble, number: int, count: int) -> float:
    """Processor seconds of one batch on whatever worker is free."""
    future = pool.submit(f"{ensemble.key[:8]}-{number}", ensemble.normal_form(), [ENTROPY], number * count, count)
    seconds: float = pool.gather([future])[0]["seconds"]
    return seconds


def first_over_later(name: str, ensemble: Ensemble) -> None:
    """Compare batches on a pool of one worker that has done nothing yet."""
    pool = LocalPool(1)
    pool.open()
    until(lambda: bool(pool.workers()), "a worker")
    probe = batch(pool, ensemble, 0, 1)  # the very first task also brings Dask's own first costs; its time is shown
    count = max(1, int(BATCH_SECONDS / max(batch(pool, ensemble, 1, 4) / 4, 1e-7)))
    pool.close()
    pool = LocalPool(1)
    pool.open()
    until(lambda: bool(pool.workers()), "a worker")
    first, *later = [batch(pool, ensemble, 10 + number, count) for number in range(BATCHES)]
    pool.close()
    ratio = first / median(later)
    print(
        f"{name:<28} {count:>7} trajectories a batch, first / later {ratio:.2f}, single trajectory {1e3 * probe:.1f} ms"
    )


def main() -> None:
    """Print the figures."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0] if __doc__ else None)
    parser.add_argument("--quick", action="store_true", help="one family only")
    parser.add_argument("--workers", type=int, default=2)
    options = parser.parse_args()
    LocalPool(1).close()
    pool = LocalPool(options.workers)
    print(f"pool of {options.workers} workers, first start in this process {timed(pool.open):6.2f} s")
    pool.close()
    pool = LocalPool(options.workers)
    print(f"pool of {options.workers} workers, kernels compiled         {timed(pool.open):6.2f} s")
    address, pid = next(iter(worker_pids(pool).items()))
    os.kill(pid, signal.SIGKILL)
    known = {worker.address for worker in pool.workers()} - {address}

    def replaced() -> bool:
        found = {worker.address for worker in pool.workers()}
        return len(found) == options.workers and address not in found and found > known

    print(f"a killed worker is replaced, ready again in  {timed(lambda: until(replaced, 'a new worker')):6.2f} s")
    pool.close()
    for name, ensemble in list(ENSEMBLES.items())[: 1 if options.quick else None]:
        first_over_later(name, ensemble)


if __name__ == "__main__":
    main()
