"""What readings cost on top of the evolution: `python tests/benchmarks/bench_readings.py [--quick]`.

Periodic chain, depth 32L, one hundred reads, one core; medians of processor time.  "evolution" is the same batch with
no reads, and the other columns are what a quantity adds, in units of the evolution.  `one i3` is the tripartite
information of the quarters averaged over all translations, in a unit cell at depth 2L, in units of that evolution.
"""

import argparse
import time
from functools import partial
from statistics import median

import numpy as np

from sweepmill.observation import observation_from_normal_form
from sweepmill_worker.clifford.engine import HybridChain, run_plan
from sweepmill_worker.clifford.roads import Plan, plan
from sweepmill_worker.observables.plan import plan_probes

RATES = (0.05, 0.16, 0.30)
KEY = (0x5EED5EED, 0x0B5E55ED)
ROUNDS = 5
READS = 100


def planned(sites: int, **fields: object) -> Plan:
    """The plan of one observation on a pure ring."""
    item = observation_from_normal_form({"revision": 1, **fields})
    return plan(plan_probes(sites, 0, True, (item,)).probes, mixed=False)


def plans(sites: int) -> dict[str, Plan]:
    """The quantities that are measured."""
    return {
        "all cuts": planned(sites, quantity="entropy", region="every-cut"),
        "intervals": planned(sites, quantity="entropy", region="every-interval", average_translations=True),
        "lengths": planned(sites, quantity="generator-lengths"),
        "site info": planned(sites, quantity="site-environment-information"),
    }


def milliseconds(sites: int, rate: float, layers: int, reads: list[int], chosen: Plan, first: int, count: int) -> float:
    """Processor time of one trajectory."""
    chain = HybridChain(sites, layers, periodic=True, mixed=False, threshold=int(rate * 2**32))
    begin = time.thread_time()
    run_plan(chain, KEY, first, count, reads, chosen)
    return 1e3 * (time.thread_time() - begin) / count


def added(sites: int, rate: float, layers: int, reads: list[int], chosen: list[Plan]) -> tuple[float, list[float]]:
    """Evolution in ms, and what each plan adds to it, as medians over rounds that take turns."""
    count = max(1, round(2e8 / (layers * sites**1.5)))
    rounds = []
    for turn in range(ROUNDS):
        timed = partial(milliseconds, sites, rate, layers, first=turn * count, count=count)
        rounds.append([timed(reads=[], chosen=chosen[0]), *(timed(reads=reads, chosen=one) for one in chosen)])
    evolution = median(row[0] for row in rounds)
    return evolution, [median(row[i] / row[0] - 1 for row in rounds) for i in range(1, len(chosen) + 1)]


def main() -> None:
    """Print the table."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0] if __doc__ else None)
    parser.add_argument("--quick", action="store_true", help="leave out 512 sites")
    sizes = [64, 256] if parser.parse_args().quick else [64, 256, 512]
    titles = [*plans(8), "one i3"]
    print(f"{'sites':>6} {'rate':>5} {'evolution ms':>13} " + " ".join(f"{title:>10}" for title in titles))
    for sites in sizes:
        reads = np.linspace(0, 32 * sites, READS + 1).astype(int)[1:].tolist()
        i3 = planned(sites, quantity="tripartite-information", average_translations=True)
        for rate in RATES:
            evolution, extra = added(sites, rate, 32 * sites, reads, list(plans(sites).values()))
            extra += added(sites, rate, 2 * sites, [2 * sites - 1, 2 * sites], [i3])[1]
            print(f"{sites:>6} {rate:>5.2f} {evolution:>13.2f} " + " ".join(f"{x:>10.2f}" for x in extra), flush=True)


if __name__ == "__main__":
    main()
