"""The executor of compiled circuits against the engine of the hybrid chain: `python tests/benchmarks/bench_layered.py`.

Ring, depth 2L, randomness and the entropies of all cuts at the end included, one core: the same circuits, word for
word.  The two take turns within one run, so that a noisy machine is noisy to both; figures are the least processor time
of each and the median of the ratios of neighbouring turns.
"""

import argparse
import time
from collections.abc import Callable
from functools import partial
from statistics import median

from sweepmill_worker.clifford.engine import HybridChain, run
from sweepmill_worker.program.compile import compile_program
from sweepmill_worker.program.run import run_program

RATES = (0.05, 0.16, 0.30)
KEY = (0x5EED5EED, 0x0B5E55ED)
ROUNDS = 11


def timed(call: Callable[[], object]) -> float:
    """Processor time of this thread, ms."""
    begin = time.thread_time()
    call()
    return 1e3 * (time.thread_time() - begin)


def compare(sites: int, rate: float) -> tuple[float, float, float]:
    """ms per trajectory of the engine and of the executor, and their ratio."""
    layers, cuts = 2 * sites, [tuple(range(x)) for x in range(sites + 1)]
    measure = {"measure": "Z", "on": "sites", "rate": rate}
    repeat = [[{"apply": "uniform-clifford", "on": f"bonds-from-{n}"}, measure] for n in (0, 1)]
    program = compile_program({"sites": sites, "layers": layers, "repeat": repeat})
    chain = HybridChain(sites, layers, periodic=True, mixed=False, threshold=int(rate * 2**32))
    batch = max(2, round(2500 * (32 / sites) ** 2.5))
    calls = [
        partial(run, chain, KEY, 0, batch, [layers], cuts),
        partial(run_program, program, KEY, 0, batch, [layers], cuts),
    ]
    for call in calls:
        call()
    times = [[timed(call) / batch for call in calls] for _ in range(ROUNDS)]
    engine, executor = (min(column) for column in zip(*times, strict=True))
    return engine, executor, median(b / a for a, b in times)


def main() -> None:
    """Print the table."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0] if __doc__ else None)
    parser.add_argument("--sizes", type=int, nargs="+", default=[64, 256, 512])
    print(f"{'sites':>6} {'rate':>5} {'engine ms':>10} {'executor ms':>12} {'ratio':>6}")
    for sites in parser.parse_args().sizes:
        for rate in RATES:
            engine, executor, ratio = compare(sites, rate)
            print(f"{sites:>6} {rate:>5.2f} {engine:>10.3f} {executor:>12.3f} {ratio:>6.2f}", flush=True)


if __name__ == "__main__":
    main()
