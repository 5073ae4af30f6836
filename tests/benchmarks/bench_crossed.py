"""Comparing the records of two initial states: `python tests/benchmarks/bench_crossed.py`.

Ring, depth 2L after as many layers of scrambling, p = 0.16, one core: chi of the record against the expectation of a
Pauli product in the signed simulation, and chi of the circuit against half a chain's entropy without signs.  All take
turns within one run; figures are trajectories per second at the least processor time, and medians of the ratios of
neighboring turns.
"""

import argparse
import time
from collections.abc import Callable
from functools import partial
from statistics import median
from typing import Any

from sweepmill.ensemble import Ensemble
from sweepmill.observation import CrossEntropy, Entropy, PauliExpectation
from sweepmill_worker.sample import sample

ROUNDS = 5
SIGNED, UNSIGNED = 8, 800  # trajectories of 16 sites; fewer of longer rings
CHI = CrossEntropy(quantity="cross-entropy", against="plus", at="end")


def timed(call: Callable[[], object]) -> float:
    """Processor time of this thread, ms."""
    begin = time.thread_time()
    call()
    return 1e3 * (time.thread_time() - begin)


def calls_at(sites: int) -> list[tuple[Callable[[], object], int]]:
    """Pauli product and chi with signs, entropy and chi without; each with its number of trajectories."""
    pauli = PauliExpectation(quantity="pauli-expectation", pauli="ZZ", sites=(0, sites // 2), at="end")
    half = Entropy(quantity="entropy", at="end")
    cases: list[tuple[str, Any, int]] = [("reference", pauli, SIGNED), ("reference", CHI, SIGNED)]
    cases += [("auto", half, UNSIGNED), ("auto", CHI, UNSIGNED)]
    calls: list[tuple[Callable[[], object], int]] = []
    for engine, item, batch in cases:
        shape = {"sites": sites, "layers": 2 * sites, "scrambling_layers": 2 * sites}
        ensemble = Ensemble.of("hybrid-clifford", measurement_rate=0.16, engine=engine, **shape)
        count = max(2, batch * 16**2 // sites**2)
        calls.append((partial(sample, ensemble, [item], 0, count), count))
    return calls


def main() -> None:
    """Print the table."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0] if __doc__ else None)
    parser.add_argument("--sizes", type=int, nargs="+", default=[8, 16, 32])
    parser.add_argument("--quick", action="store_true", help="the first size only")
    given = parser.parse_args()
    names = ("Pauli", "chi", "entropy", "chi")
    print(f"{'sites':>6}" + "".join(f"{name + ' / s':>14}" for name in names) + "  signed ratio  unsigned ratio")
    for sites in given.sizes[:1] if given.quick else given.sizes:
        calls = calls_at(sites)
        for call, _ in calls:
            call()
        times = [[timed(call) / count for call, count in calls] for _ in range(ROUNDS)]
        speeds = [1e3 / min(column) for column in zip(*times, strict=True)]
        signed, unsigned = (median(row[i + 1] / row[i] for row in times) for i in (0, 2))
        print(f"{sites:>6}" + "".join(f"{speed:>14.0f}" for speed in speeds) + f"{signed:>14.2f}{unsigned:>16.2f}")


if __name__ == "__main__":
    main()
