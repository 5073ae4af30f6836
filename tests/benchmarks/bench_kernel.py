"""The kernel against the stim route: `python tests/benchmarks/bench_kernel.py [--quick]`.

Open chain, depth 2L, randomness and the entropies of all cuts at the end included, one core.  Kernel and stim take
turns within one run, so that a noisy machine is noisy to both; figures are medians of processor time.  "reference" is
what the stim route took on the machine of our reference figures (server processor with AVX-512, 2.97 GHz).
"""

import argparse
import time
from collections.abc import Callable
from functools import partial
from statistics import median

import numpy as np
from stim_route import StimRoute  # type: ignore[import-not-found]

from sweepmill_worker.clifford.engine import HybridChain, run

RATES = (0.05, 0.16, 0.30)
REFERENCE_STIM_MS = {
    64: (5.28, 6.09, 7.07),
    128: (23.7, 31.2, 37.8),
    256: (110.0, 162.0, 213.0),
    512: (601.0, 1093.0, 1646.0),
}
KEY = (0x5EED5EED, 0x0B5E55ED)
ROUNDS = 7


def timed(call: Callable[[], object]) -> float:
    """Processor time of this thread, ms."""
    begin = time.thread_time()
    call()
    return 1e3 * (time.thread_time() - begin)


def copy_speed() -> float:
    """GB/s of copying 256 MB, best of five: the machine's yardstick."""
    source = np.ones(2**25)
    target = np.empty_like(source)
    return max(source.nbytes / timed(lambda: np.copyto(target, source)) / 1e6 for _ in range(5))


def compare(sites: int, rate: float) -> tuple[float, float, float]:
    """Medians of kernel ms, stim ms and their ratio over the rounds."""
    chain = HybridChain(sites, 2 * sites, periodic=False, mixed=False, threshold=int(rate * 2**32))
    cuts = [tuple(range(x)) for x in range(sites + 1)]
    batch = max(4, round(5000 * (32 / sites) ** 2.5))
    stim_route = StimRoute(sites, rate, seed=1)
    stim_route.trajectory()
    kernel_ms, stim_ms = [], []
    for turn in range(ROUNDS if sites < 512 else 3):
        sample = partial(run, chain, KEY, turn * batch, batch, [2 * sites], cuts)
        kernel_ms.append(timed(sample) / batch)
        stim_ms.append(timed(stim_route.trajectory))
    return median(kernel_ms), median(stim_ms), median(s / k for s, k in zip(stim_ms, kernel_ms, strict=True))


def main() -> None:
    """Print the table."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0] if __doc__ else None)
    parser.add_argument("--quick", action="store_true", help="leave out 512 sites")
    sizes = [64, 128, 256] if parser.parse_args().quick else [64, 128, 256, 512]
    print(f"memory copy: {copy_speed():.1f} GB/s")
    print(f"{'sites':>6} {'rate':>5} {'kernel ms':>10} {'stim ms':>9} {'reference':>9} {'ratio':>6}")
    for sites in sizes:
        for rate, reference in zip(RATES, REFERENCE_STIM_MS[sites], strict=True):
            kernel, stim, ratio = compare(sites, rate)
            print(f"{sites:>6} {rate:>5.2f} {kernel:>10.3f} {stim:>9.2f} {reference:>9.2f} {ratio:>6.1f}", flush=True)


if __name__ == "__main__":
    main()
