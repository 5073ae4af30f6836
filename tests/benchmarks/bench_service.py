"""What the service adds to sampling, and how long the store takes with large sweeps.

    python tests/benchmarks/bench_service.py [--quick] [--ensembles 10000] [--workers 2] [--seconds 30]

Prints times and ratios; nothing is asserted, machines differ.
"""

import argparse
import sys
import tempfile
import time
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from multiprocessing import get_context
from pathlib import Path
from statistics import median
from typing import Any

import httpx

from sweepmill.accumulate import Accumulator
from sweepmill.sweep import Sweep
from sweepmill_service.database import open_database
from sweepmill_service.dispatcher import Dispatcher
from sweepmill_service.following import Follower
from sweepmill_service.migrations import migrate
from sweepmill_service.plan.plan import Plan
from sweepmill_service.pool import LocalPool
from sweepmill_service.settings import Settings
from sweepmill_service.store import Store
from sweepmill_service.store.results import BatchResult
from sweepmill_worker.sample import sample

sys.path.insert(0, str(Path(__file__).parents[1]))

from support.api import sampled_by_hand
from support.services import service

ARROW = "application/vnd.apache.arrow.stream"
BATCH_SECONDS = 2.0
TURNS = 3


@contextmanager
def fresh_store() -> Iterator[Store]:
    """A store on a SQLite file that is deleted afterwards."""
    with tempfile.TemporaryDirectory() as home:
        engine = open_database(f"sqlite:///{Path(home) / 'bench.sqlite'}")
        migrate(engine)
        yield Store(engine)
        engine.dispose()


def report(what: str, action: Callable[[], Any]) -> Any:
    """Run and print the wall-clock time."""
    begin = time.perf_counter()
    result = action()
    print(f"{what:<58}{time.perf_counter() - begin:10.3f} s")
    return result


def large_sweep(ensembles: int, replicate: int = 0) -> Sweep:
    """A sweep of many ensembles and two observations."""
    return Sweep.parse(
        {
            "circuit": {
                "family": "hybrid-clifford",
                "sites": 16,
                "measurement_rate": {"from": 0.00001, "to": 0.4, "points": ensembles},
                "layers": {"per_site": 4},
                "replicate": replicate,
            },
            "observe": [{"quantity": "entropy"}, {"quantity": "tripartite-information", "name": "i3"}],
            "stop": {"trajectories": 4000, "at_least": 200, "standard_error": [{"of": "i3", "below": 0.01}]},
        }
    )


def bench_store(ensembles: int) -> None:
    """Parts of the store and the plan with one large sweep."""
    with fresh_store() as store:
        sweep = report(f"parse and expand {ensembles} ensembles", lambda: _expanded(large_sweep(ensembles)))
        report("submit", lambda: store.submit(sweep, "ada"))
        report("submit again", lambda: store.submit(sweep, "bob"))
        plan = Plan()
        follower = Follower(store, plan)
        report("load the plan", follower.look)
        tasks = report("choose 1000 tasks", lambda: [plan.choose(64) for _ in range(1000)])
        results = [_result(task, sweep) for task in tasks[:128]]
        report("commit 128 results in one transaction", lambda: store.commit(results))
        report("status", lambda: store.sweep_status(sweep.key))
        report("progress, 500 ensembles", lambda: store.progress(sweep.key))
        report("table version", lambda: store.table_version(sweep.key))
        report("read all totals", lambda: sum(1 for _ in store.table_entries(sweep.key)))


def _expanded(sweep: Sweep) -> Sweep:
    assert sweep.points
    assert sweep.key
    return sweep


def _result(task: Any, sweep: Sweep) -> BatchResult:
    point = next(point for point in sweep.points if point.ensemble.key == task.ensemble)
    observations = [named.observation for named in sweep.observations]
    made: dict[str, Accumulator] = dict(sample(point.ensemble, observations, task.first, task.count).accumulators)
    return BatchResult(
        ensemble=task.ensemble,
        first=task.first,
        count=task.count,
        accumulators={key: one.to_bytes() for key, one in made.items()},
        digests={key: one.digest for key, one in made.items()},
        seconds=1.0,
        worker="bench",
        versions={},
        sweep=task.sweep,
        owner=task.owner,
    )


def bench_http(ensembles: int) -> None:
    """Over HTTP, as a client sees it: a large sweep accepted, and the table of one that has been sampled read."""
    with tempfile.TemporaryDirectory() as home:
        database = f"sqlite:///{Path(home) / 'bench.sqlite'}"
        engine = open_database(database)
        migrate(engine)
        sampled = large_sweep(ensembles)
        Store(engine).submit(sampled, "ada")
        sampled_by_hand(Store(engine), sampled, 10, owner="ada")
        engine.dispose()
        with service(database, "--no-dispatch") as running, httpx.Client(base_url=running.url, timeout=60) as http:
            body = large_sweep(ensembles, replicate=1).normalized()
            report(f"POST a sweep of {ensembles} ensembles", lambda: http.post("/v1/sweeps", json=body))
            path = f"/v1/sweeps/{sampled.key}/table"
            for name, accept in (("Arrow", ARROW), ("JSON", "application/json"), ("CSV", "text/csv")):
                times = [_timed(lambda: http.get(path, headers={"Accept": accept})) for _ in range(5)]  # noqa: B023
                print(f"{f'GET its table as {name}':<58}{times[0]:10.3f} s, then {median(times[1:]):.3f} s")


def _timed(action: Callable[[], httpx.Response]) -> float:
    begin = time.perf_counter()
    assert action().status_code == 200
    return time.perf_counter() - begin


def bench_whole(workers: int, seconds: float) -> None:
    """One ensemble through the whole service, against bare loops over ``sample`` in as many processes.

    In turn, several times: the speed of a shared machine drifts by more than the difference.
    """
    _bare(10, 0)
    count = max(1000, int(seconds / _bare(4000, 0) * 4000))
    ratios = []
    with get_context("spawn").Pool(workers) as processes, fresh_store() as store, dispatching(store, workers):
        processes.starmap(_bare, [(10, 0)] * workers)  # kernels loaded
        for turn in range(TURNS):
            begin = time.perf_counter()
            processes.starmap(_bare, [(count, turn)] * workers)
            bare = time.perf_counter() - begin
            wall, spent = _through(store, _whole_sweep(count * workers, turn))
            busy = spent / wall / workers
            print(f"turn {turn}: bare loops {bare:.2f} s, service {wall:.2f} s, its workers {busy:.0%} busy sampling")
            ratios.append(bare / wall)
    print(
        f"throughput with {BATCH_SECONDS:g} s batches over that of bare loops, median of {TURNS}: {median(ratios):.3f}"
    )


def _bare(count: int, replicate: int) -> float:
    """CPU seconds of sampling so many trajectories."""
    sweep = _whole_sweep(1, replicate)
    begin = time.process_time()
    sample(sweep.points[0].ensemble, [named.observation for named in sweep.observations], 0, count)
    return time.process_time() - begin


def _whole_sweep(cap: int, replicate: int) -> Sweep:
    return Sweep.parse(
        {
            "circuit": {
                "family": "hybrid-clifford",
                "sites": 64,
                "measurement_rate": 0.16,
                "layers": {"per_site": 4},
                "replicate": replicate,
            },
            "observe": [{"quantity": "entropy"}, {"quantity": "tripartite-information", "name": "i3"}],
            "stop": {"trajectories": cap},
        }
    )


@contextmanager
def dispatching(store: Store, workers: int) -> Iterator[None]:
    """A dispatcher with a pool that is ready."""
    dispatcher = Dispatcher(store, LocalPool(workers), Settings(batch_seconds=BATCH_SECONDS))
    dispatcher.start()
    try:
        while not dispatcher.status().ready:
            time.sleep(0.05)
        yield
    finally:
        dispatcher.stop(5)


def _through(store: Store, sweep: Sweep) -> tuple[float, float]:
    """Seconds from submission to settled, and the core-seconds spent."""
    begin = time.perf_counter()
    store.submit(sweep, "ada")
    while store.sweep_status(sweep.key).state != "settled":
        time.sleep(0.1)  # asking costs the cores that sample
    return time.perf_counter() - begin, store.sweep_status(sweep.key).core_seconds


def main() -> None:
    """Command line."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--ensembles", type=int, default=10_000)
    parser.add_argument("--workers", type=int, default=2)
    parser.add_argument("--seconds", type=float, default=20.0)
    parser.add_argument("--quick", action="store_true")
    arguments = parser.parse_args()
    ensembles = arguments.ensembles // 10 if arguments.quick else arguments.ensembles
    bench_store(ensembles)
    bench_http(ensembles)
    bench_whole(arguments.workers, 8.0 if arguments.quick else arguments.seconds)


if __name__ == "__main__":
    main()
