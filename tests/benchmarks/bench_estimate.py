"""Estimates before sampling against what was used then: `python tests/benchmarks/bench_estimate.py [--seconds 1]`.

Two rounds of varied sweeps, the second with other sizes and rates than the first, are estimated with an empty store
(cold) and with what the sweeps before them left in one (learned), then sampled in this process as the dispatcher
would.  Predicted over used core-seconds and standard errors (largest over ensembles and coordinates), and how often
the quoted range, of one standard deviation to either side, holds what came.  With `--pool` a service with two workers
samples for two owners, and times are compared as well.  Nothing is asserted, machines differ.
"""

import argparse
import math
import sys
import tempfile
import time
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from functools import partial
from pathlib import Path
from statistics import median
from typing import Any, NamedTuple

from sweepmill.accumulate import Accumulator
from sweepmill.client import Client
from sweepmill.coordinates import coordinates
from sweepmill.messages import Estimate, Range
from sweepmill.statistics import summarize
from sweepmill.sweep import Sweep
from sweepmill_service.cost import Costs
from sweepmill_service.database import open_database
from sweepmill_service.estimate import estimate
from sweepmill_service.finish import Share
from sweepmill_service.following import Follower
from sweepmill_service.migrations import migrate
from sweepmill_service.plan.plan import Plan
from sweepmill_service.plan.task import SizeRules, Task
from sweepmill_service.store import Store
from sweepmill_service.store.results import BatchResult
from sweepmill_worker.sample import sample_plain
from sweepmill_worker.warm import warm

sys.path.insert(0, str(Path(__file__).parents[1]))

from support.services import service, until

ENTROPY = {"quantity": "entropy"}
AVERAGED = {"quantity": "entropy", "average_translations": True}
I3 = {"quantity": "tripartite-information", "average_translations": True, "name": "i3"}
RECORD = {"quantity": "outcome-randomness"}


class Case(NamedTuple):
    """One sweep in two variants: a circuit, observations, trajectories per ensemble, rules."""

    name: str
    circuits: tuple[dict[str, Any], dict[str, Any]]
    observe: list[dict[str, Any]]
    trajectories: int
    rules: dict[str, Any] | None = None


def chain(sites: Any, rate: Any, **more: Any) -> dict[str, Any]:
    """Brickwork with measurements."""
    return {"family": "hybrid-clifford", "sites": sites, "measurement_rate": rate, **more}


def drum(sites: int, rate: float) -> dict[str, Any]:
    """A circuit written as data: the same gates in every period."""
    measured = {"measure": "Z", "on": "sites", "rate": rate}
    bricks = [{"apply": "uniform-clifford", "on": f"bonds-from-{n}", "fixed": "trajectory"} for n in (0, 1)]
    return {"family": "layered", "sites": sites, "repeat": [[gates, measured] for gates in bricks]}


def competing(sites: int, rate: float) -> dict[str, Any]:
    """A circuit of measurements only, written as data."""
    steps = [{"measure": "ZZ", "on": "bonds", "rate": rate}, {"measure": "X", "on": "sites", "rate": 1 - rate}]
    return {"family": "layered", "sites": sites, "initial_state": "plus", "repeat": [steps]}


def ising(sites: Any, rate: Any, **more: Any) -> dict[str, Any]:
    """Competing projective measurements."""
    return {"family": "projective-ising", "sites": sites, "bond_rate": rate, **more}


SQUARE, FAR = "hybrid-clifford-square", "hybrid-clifford-long-range"
CASES = (
    Case("half entropy", (chain([32, 64], [0.1, 0.2]), chain([48, 96], [0.08, 0.15])), [ENTROPY], 2000),
    Case("averaged i3", (chain([32, 64], [0.14, 0.18]), chain([48, 72], [0.16, 0.2])), [I3, AVERAGED, RECORD], 1000),
    Case("volume law", (chain([64], [0.02, 0.05]), chain([96], [0.03, 0.06])), [I3, AVERAGED], 400),
    Case("area law", (chain([128], [0.3, 0.5]), chain([160], [0.25, 0.4])), [AVERAGED], 500),
    Case("series", (chain([32], [0.1, 0.2]), chain([48], [0.12, 0.3])), [AVERAGED | {"at": {"every": 4}}], 1000),
    Case(
        "all intervals",
        (chain([32], [0.16]), chain([48], [0.2])),
        [{"quantity": "entropy", "region": "every-interval", "at": {"average_over": {"last": 0.5}}}],
        2000,
    ),
    Case(
        "purification",
        (chain([32], [0.1, 0.2], initial_state="mixed"), chain([48], [0.12, 0.25], initial_state="mixed")),
        [{"quantity": "global-entropy", "at": {"log_spaced": 12}}],
        2000,
    ),
    Case(
        "one reference",
        (chain([32], [0.16], references=1, scrambling_layers=64), chain([48], [0.2], references=1)),
        [{"quantity": "reference-entropy"}],
        3000,
    ),
    Case(
        "until the rule holds",
        (chain([16, 32], [0.14, 0.18]), chain([24, 48], [0.15, 0.17])),
        [I3],
        20_000,
        {"of": "i3", "below": 0.02},
    ),
    Case(
        "lattice",
        (
            {"family": SQUARE, "width": [6, 8], "height": 8, "measurement_rate": 0.3},
            {"family": SQUARE, "width": [8, 10], "height": 10, "measurement_rate": 0.4},
        ),
        [ENTROPY],
        1000,
    ),
    Case(
        "random pairs",
        (
            {"family": FAR, "sites": [32], "exponent": [0, 2], "measurement_rate": 0.2},
            {"family": FAR, "sites": [48], "exponent": [1, 3], "measurement_rate": 0.3},
        ),
        [ENTROPY],
        1000,
    ),
    Case(
        "clusters", (ising([128, 512], [0.5]), ising([256], [0.4, 0.5])), [ENTROPY, {"quantity": "cluster-order"}], 300
    ),
    Case(
        "edge and sideways",
        ({"family": "edge-bath", "sites": [64, 128]}, {"family": "rotated-clifford", "sites": [48, 64]}),
        [ENTROPY],
        500,
    ),
    Case("drum", (drum(32, 0.1), drum(64, 0.2)), [AVERAGED], 2000),
    Case("measurements only", (competing(32, 0.5), competing(48, 0.4)), [ENTROPY], 500),
    Case(
        "reference engine",
        (chain([8], [0.1, 0.2], engine="reference"), chain([12], [0.15], engine="reference")),
        [{"quantity": "pauli-expectation", "pauli": "ZZ", "sites": [0, 1]}],
        60,
    ),
)


@contextmanager
def fresh_store() -> Iterator[Store]:
    """A store on a SQLite file that is deleted afterwards."""
    with tempfile.TemporaryDirectory() as home:
        engine = open_database(f"sqlite:///{Path(home) / 'bench.sqlite'}")
        migrate(engine)
        yield Store(engine)
        engine.dispose()


def sweep_of(case: Case, variant: int, scale: float) -> Sweep:
    """The specification, with so many times the trajectories."""
    number = max(20, round(scale * case.trajectories))
    stop: dict[str, Any] = {"trajectories": number}
    if case.rules is not None:
        stop |= {"at_least": min(200, number), "standard_error": case.rules}
    return Sweep.parse({"circuit": case.circuits[variant], "observe": case.observe, "stop": stop})


def predicted(sweep: Sweep, store: Store) -> Estimate:
    """The estimate for a pool of one core with nothing else to do."""
    costs = Costs.of(
        [point.ensemble for point in sweep.points], [item.observation for item in sweep.observations], store
    )
    return estimate(sweep, costs, store, Share(0.0, (), 1), None)


def sampled(sweep: Sweep, store: Store) -> float:
    """Sample a sweep to its end in this process; the core-seconds it took."""
    store.submit(sweep, "bench")
    plan = Plan(SizeRules(batch_seconds=0.5, first_batch_seconds=0.05))
    follower = Follower(store, plan)
    follower.look()
    while (task := plan.choose(1)) is not None:
        result = _result(task, sample_plain(*follower.arguments(task)))
        outcome = store.commit([result])
        plan.landed(task, result.seconds)
        follower.apply(outcome)
    return store.sweep_status(sweep.key).core_seconds


def _result(task: Task, plain: dict[str, Any]) -> BatchResult:
    kept = {name: plain[name] for name in ("first", "count", "accumulators", "digests", "seconds", "versions")}
    return BatchResult(ensemble=task.ensemble, worker="bench", sweep=task.sweep, owner=task.owner, **kept)


def largest_errors(sweep: Sweep, store: Store) -> dict[str, float]:
    """By name, the largest standard error over ensembles and coordinates."""
    found: dict[str, float] = {}
    ensembles = [point.ensemble for point in sweep.points]
    for entry in store.table_entries(sweep.key):
        for item in sweep.observations:
            if item.observation.key == entry.observation_key and entry.accumulator is not None:
                places = coordinates(ensembles[entry.ordinal], item.observation)
                errors = [one.standard_error for one in summarize(Accumulator.from_bytes(entry.accumulator), places)]
                known = [error for error in errors if math.isfinite(error)]
                found[item.name] = max([found.get(item.name, 0.0), *known])
    return found


class Compared(NamedTuple):
    """One number predicted, with its range, and what came."""

    ratio: float
    inside: bool


def compared(value: float, between: Range | None, actual: float) -> Compared:
    """Predicted over actual, and whether the range holds it."""
    return Compared(value / actual, between is not None and between.low <= actual <= between.high)


def summary(what: str, found: Sequence[Compared]) -> None:
    """Median, spread (1.48 times the median distance in logarithms) and share inside."""
    logs = [math.log(one.ratio) for one in found]
    middle = median(logs)
    spread = math.exp(1.48 * median([abs(one - middle) for one in logs]))
    inside = sum(one.inside for one in found) / len(found)
    print(f"{what:<44}{math.exp(middle):>8.2f}   x/: {spread:<6.2f}{100 * inside:>6.0f} % of {len(found)} in range")


def long_sweep(sites: int, replicate: int, trajectories: int) -> Sweep:
    """Some core-seconds of work, never sampled before."""
    circuit = chain([sites], [0.1, 0.16, 0.25], replicate=replicate)
    return Sweep.parse({"circuit": circuit, "observe": [I3], "stop": {"trajectories": trajectories}})


def queued(client: Client, sweep: Sweep) -> bool:
    """Whether the pool has other work, as far as the service knows."""
    return client.estimate(sweep).queued_core_seconds > 0


def times(scale: float) -> list[Compared]:
    """Seconds from submission to the end, predicted over actual: alone, then beside another owner's work."""
    found = []
    with (
        tempfile.TemporaryDirectory() as home,
        service(f"sqlite:///{home}/bench.sqlite", "--workers", "2") as running,
        Client(running.url, owner="ada") as ada,
        Client(running.url, owner="ben") as ben,
    ):
        ada.submit(long_sweep(64, 0, round(scale * 20_000))).wait(progress=False)
        for turn in range(1, 7):
            sweep = long_sweep((32, 64, 96)[turn % 3], turn, round(scale * (40_000, 10_000, 4_000)[turn % 3]))
            if turn > 2:
                ben.submit(long_sweep(48, turn, round(scale * (4_000, 40_000)[turn % 2])))
                until(partial(queued, ada, sweep), "the other owner's work")
            before, begin = ada.estimate(sweep), time.monotonic()
            ada.submit(sweep).wait(progress=False)
            took = time.monotonic() - begin
            found.append(compared(before.seconds or 0.0, before.seconds_range, took))
            beside = f"{before.queued_core_seconds:.1f} core-seconds queued"
            print(f"pool: predicted {before.seconds or 0.0:.1f} s, took {took:.1f} s, {beside}", flush=True)
    return found


def main() -> None:
    """Command line."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument(
        "--seconds", type=float, default=1.0, help="scale of the trajectories: about as many core-seconds a sweep"
    )
    parser.add_argument("--quick", action="store_true", help="a tenth of that")
    parser.add_argument("--pool", action="store_true", help="compare times on a pool of two workers, too")
    given = parser.parse_args()
    warm(256)
    scale = given.seconds * (0.1 if given.quick else 1.0)
    groups: dict[str, list[Compared]] = {}
    print(f"{'sweep':<28}{'used, s':>9}{'cold':>8}{'learned':>9}   predicted / used; * outside its range")
    with fresh_store() as empty, fresh_store() as store:
        for variant in (0, 1):
            for case in CASES:
                sweep = sweep_of(case, variant, scale)
                before = {"cold": predicted(sweep, empty), "learned": predicted(sweep, store)}
                used, errors = sampled(sweep, store), largest_errors(sweep, store)
                row = []
                for how, one in before.items():
                    cost = compared(one.core_seconds_expected or 0.0, one.core_seconds_expected_range, used)
                    groups.setdefault(f"core-seconds, {how}, round {variant + 1}", []).append(cost)
                    row.append(f"{cost.ratio:.2f}{' ' if cost.inside else '*'}")
                    for error in one.standard_errors:
                        if error.largest is not None and errors.get(error.name, 0.0) > 0:
                            kept = groups.setdefault(f"standard errors, {how}, round {variant + 1}", [])
                            kept.append(compared(error.largest, error.largest_range, errors[error.name]))
                print(f"{case.name + ' ' + str(variant + 1):<28}{used:>9.2f}{row[0]:>8}{row[1]:>9}", flush=True)
    if given.pool:
        groups["time on a pool"] = times(scale)
    print()
    for what in sorted(groups):
        summary(what, groups[what])


if __name__ == "__main__":
    main()
