"""The kernel against the stim route: `python tests/benchmarks/bench_kernel.py [--quick]`.

Open chain, depth 2L, randomness and the entropies of all cuts at the end included, one core.  Kernel and stim take
turns within one run, so that a noisy machine is noisy to both; figures are medians of processor time.  "reference" is
what the stim route took on the machine of our reference figures (server processor with AVX-512, 2.97 GHz); "floor" the
ratio that was reached there.  Beyond 1024 sites stim takes minutes per trajectory, and the kernel runs alone.
"""

import argparse
import time
from collections.abc import Callable
from functools import partial
from math import log2
from statistics import median

import numpy as np
from kernel_parts import line_cost, parts  # type: ignore[import-not-found]
from stim_route import StimRoute  # type: ignore[import-not-found]

from sweepmill_worker.clifford.engine import HybridChain, run_plan
from sweepmill_worker.clifford.roads import Plan, plan
from sweepmill_worker.observables.probes import of_regions

RATES = (0.05, 0.16, 0.30)
REFERENCE = {
    64: ((5.28, 81), (6.09, 67), (7.07, 65)),
    128: ((23.7, 114), (31.2, 87), (37.8, 76)),
    256: ((110.0, 111), (162.0, 107), (213.0, 108)),
    512: ((601.0, 111), (1093.0, 142), (1646.0, 172)),
    1024: ((4705.0, 121), (9863.0, 217), (15370.0, 312)),
}
"""Per rate: ms of the stim route, and floor of the ratio."""
KEY = (0x5EED5EED, 0x0B5E55ED)


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


def rounds(sites: int) -> int:
    """How often kernel and stim take turns."""
    return {512: 3, 1024: 1}.get(sites, 7)


def all_cuts(sites: int) -> Plan:
    """What to read; made once for all batches, as the service does."""
    return plan(of_regions(sites, [tuple(range(x)) for x in range(sites + 1)]), mixed=False)


def sampler(sites: int, rate: float, wanted: Plan) -> Callable[[int, int], object]:
    """Sample trajectories first .. first + count - 1; entropies only if anything is wanted."""
    chain = HybridChain(sites, 2 * sites, periodic=False, mixed=False, threshold=int(rate * 2**32))
    reads = [2 * sites] if wanted.size else []
    return lambda first, count: run_plan(chain, KEY, first, count, reads, wanted)


def compare(sites: int, rate: float, cuts: Plan) -> tuple[float, float, float]:
    """Medians of kernel ms, stim ms and their ratio over the rounds."""
    sample = sampler(sites, rate, cuts)
    batch = max(4, round(5000 * (32 / sites) ** 2.5))
    stim_route = StimRoute(sites, rate, seed=1)
    if rounds(sites) > 1:
        stim_route.trajectory()
    kernel_ms, stim_ms = [], []
    for turn in range(rounds(sites)):
        kernel_ms.append(timed(partial(sample, turn * batch, batch)) / batch)
        stim_ms.append(timed(stim_route.trajectory))
    return median(kernel_ms), median(stim_ms), median(s / k for s, k in zip(stim_ms, kernel_ms, strict=True))


def print_parts(sites: int, rate: float) -> None:
    """Shares of the time, and the time over that of the memory traffic alone."""
    batch = max(1, round(5000 * (32 / sites) ** 2.5))
    bare, reading = (
        sampler(sites, rate, plan(of_regions(sites, []), mixed=False)),
        sampler(sites, rate, all_cuts(sites)),
    )
    without, extra = [], []
    for turn in range(5 if sites < 4096 else 3):
        without.append(timed(partial(bare, turn * batch, batch)) / batch)
        extra.append(timed(partial(reading, turn * batch, batch)) / batch - without[-1])
    layers, entropies = median(without), max(0.0, median(extra))
    found = parts(sites, rate)
    measuring = layers - found.gates - found.randomness
    shares = [part / (layers + entropies) for part in (found.gates, measuring, entropies, found.randomness)]
    print(
        f"{sites:>6} {rate:>5.2f} "
        + " ".join(f"{share:>12.0%}" for share in shares)
        + f" {layers / found.bound:>16.2f}"
    )


def main() -> None:
    """Print the tables."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0] if __doc__ else None)
    parser.add_argument("--quick", action="store_true", help="leave out 512 sites and more")
    quick = parser.parse_args().quick
    print(f"memory copy: {copy_speed():.1f} GB/s")
    print(
        f"{'sites':>6} {'rate':>5} {'kernel ms':>10} {'stim ms':>9} {'reference':>9} {'ratio':>6} {'floor':>6} growth"
    )
    figures: dict[tuple[int, float], float] = {}
    for sites in (64, 128, 256) if quick else (64, 128, 256, 512, 1024, 2048, 4096):
        cuts = all_cuts(sites)
        for rate, (reference, floor) in zip(RATES, REFERENCE.get(sites, ((0.0, 0),) * 3), strict=True):
            if sites in REFERENCE:
                kernel, stim, ratio = compare(sites, rate, cuts)
                versus = f"{stim:>9.2f} {reference:>9.2f} {ratio:>6.1f} {floor:>6}"
            else:
                sampler(sites, rate, cuts)(0, 1)
                kernel, versus = timed(partial(sampler(sites, rate, cuts), 1, 1)), " " * 33
            figures[sites, rate] = kernel
            before = figures.get((sites // 2, rate))
            growth = f" L^{log2(kernel / before):.2f}" if before else ""
            print(f"{sites:>6} {rate:>5.2f} {kernel:>10.3f} {versus}{growth}", flush=True)
    print("\nns per line of 64 bytes, read, changed and written:", end="")
    print("".join(f" {name} {line_cost(size):.2f}" for name, size in (("L1", 2**14), ("L2", 2**19), ("beyond", 2**25))))
    names = " ".join(f"{name:>12}" for name in ("gates", "measurements", "entropies", "randomness"))
    print(f"{'sites':>6} {'rate':>5} {names}  time over bound")
    for sites in (256,) if quick else (256, 1024, 4096):
        for rate in RATES:
            print_parts(sites, rate)


if __name__ == "__main__":
    main()
