"""What keeping values costs: `python tests/benchmarks/bench_values.py [--quick]`.

Periodic chain at p = 0.16, depth 4L, one core.  `slower` is the processor time of sampling with kept values over that
without (medians of rounds that take turns), `byte/value` the size of what is stored for each integer; the other columns
are the sizes of the answers of the service and how many rows a second it makes.
"""

import argparse
import sys
import tempfile
import time
from pathlib import Path
from statistics import median
from typing import Any

sys.path.insert(0, str(Path(__file__).parents[1]))

from support.api import sampled_by_hand
from sweepmill.sweep import Sweep
from sweepmill_service.database import open_database
from sweepmill_service.export.values import VALUE_WRITERS, Kept
from sweepmill_service.migrations import migrate
from sweepmill_service.store import Store
from sweepmill_worker.sample import sample

ROUNDS = 7
OBSERVED: dict[str, dict[str, Any]] = {
    "half, one layer": {"quantity": "entropy", "at": "end"},
    "i3, averaged": {"quantity": "tripartite-information", "average_translations": True},
    "every cut": {"quantity": "entropy", "region": "every-cut", "at": "end"},
    "series of 32": {"quantity": "entropy", "at": {"every": 4}},
    "randomness": {"quantity": "outcome-randomness"},
}


def sweep_of(fields: dict[str, Any], trajectories: int, sites: int = 32) -> Sweep:
    """One ensemble with one observation."""
    circuit = {"family": "hybrid-clifford", "sites": sites, "measurement_rate": 0.16, "layers": 4 * sites}
    return Sweep.parse({"circuit": circuit, "observe": [fields], "stop": {"trajectories": trajectories}})


def slowdown(fields: dict[str, Any], count: int) -> tuple[float, float]:
    """Processor time with kept values over that without, and stored bytes per value."""
    sweeps = [sweep_of(fields | {"keep_values": kept}, count) for kept in (False, True)]
    seconds: list[list[float]] = []
    for turn in range(ROUNDS):
        seconds.append([])
        for sweep in sweeps:
            begin = time.thread_time()
            batch = sample(sweep.points[0].ensemble, [sweep.observations[0].observation], turn * count, count)
            seconds[-1].append(time.thread_time() - begin)
    (chunk,), (total,) = batch.values.values(), batch.accumulators.values()
    ratio = median(kept / plain for plain, kept in seconds[1:])
    return ratio, len(chunk.data) / (count * total.coordinates * total.components)


def answers(fields: dict[str, Any], count: int) -> list[tuple[float, float]]:
    """Bytes per row, and rows per second, of every format."""
    sweep = sweep_of(fields | {"keep_values": True}, count)
    with tempfile.TemporaryDirectory() as home:
        engine = open_database(f"sqlite:///{Path(home) / 'bench.sqlite'}")
        migrate(engine)
        store = Store(engine)
        store.submit(sweep, "ada")
        sampled_by_hand(store, sweep, count, owner="ada")
        found = []
        for write in VALUE_WRITERS.values():
            kept = Kept.find(store, sweep.key, None)
            rows = count * len(kept.layout.coordinates(0, kept.item))
            begin = time.process_time()
            size = sum(map(len, write(kept.content(store))))
            found.append((size / rows, rows / (time.process_time() - begin)))
        engine.dispose()
    return found


def main() -> None:
    """Print the table."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0] if __doc__ else None)
    parser.add_argument("--quick", action="store_true", help="a fifth of the trajectories")
    count = 2_000 if parser.parse_args().quick else 10_000
    answers(OBSERVED["half, one layer"], 10)  # what a first call loads
    titles = [f"{form} {unit}" for form in VALUE_WRITERS for unit in ("byte/row", "rows/s")]
    print(f"{'observation':>16} {'slower':>7} {'byte/value':>11} " + " ".join(f"{title:>17}" for title in titles))
    for name, fields in OBSERVED.items():
        ratio, size = slowdown(fields, count)
        cells = " ".join(f"{one:>17.3g} {pace:>17,.0f}" for one, pace in answers(fields, 4 * count))
        print(f"{name:>16} {ratio:>7.3f} {size:>11.3f} {cells}", flush=True)


if __name__ == "__main__":
    main()
