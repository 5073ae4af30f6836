"""Core-seconds for a critical point: rounds that follow its error against an even grid, with one estimator.

`python tests/benchmarks/bench_answer.py ising|hybrid|wide [--replicates N] [--first R] [--below E] [--even N]`

Sizes, bounds, step and the grid of 13 values are fixed below.  Every replicate samples rounds from its own starting
values until the error asked for is quoted, and an even grid of N trajectories per ensemble, both judged by the same
procedure.  What is compared is core-seconds times the squared deviation from the known value; a trajectory counts with
the processor time measured once per size before the first replicate, so other load on the machine does not matter.

ising: measurement-only chains, p_c = 1/2 exactly (Entanglement transition in the projective transverse field Ising
model, Phys. Rev. B 102, 094204 (2020)).  A last layer of ZZ at rate 0.42 before the tripartite information is read
halves what the end of the circuit adds to the crossing of small sizes.  hybrid: random Clifford brickwork, for which an
independent simulation and fit gave 0.1598(2); wide: the same with larger sizes in wider bounds.
"""

import argparse
import time
from collections.abc import Callable
from dataclasses import dataclass
from statistics import median

import numpy as np
from numpy.typing import NDArray

from sweepmill.accumulate import Accumulator
from sweepmill.analysis import Estimate, Points
from sweepmill.analysis.design import Place, advise_critical_point
from sweepmill.coordinates import coordinates
from sweepmill.ensemble import Ensemble
from sweepmill.folds import fold_ratios
from sweepmill.observation import observation_from_normal_form
from sweepmill.presets import layered_form
from sweepmill.statistics import summarize
from sweepmill_worker.sample import sample

GRID = 13
FIRST = 200
MOST = 10**6
BATCH = 2000
Counts = NDArray[np.int64]


def ising(sites: int, rate: float, replicate: int) -> Ensemble:
    """A ring of ZZ and X measurements with a last, partial layer of ZZ."""
    form = layered_form(Ensemble.of("projective-ising", sites=sites, bond_rate=rate, layers=2 * sites))
    last = {**form["repeat"][0][0], "rate": 0.42}
    return Ensemble.from_normal_form(form | {"after": [[last]]} | ({"replicate": replicate} if replicate else {}))


def hybrid(sites: int, rate: float, replicate: int) -> Ensemble:
    """A ring of Clifford brickwork with measurements."""
    parameters = {"measurement_rate": rate, "layers": 4 * sites, "replicate": replicate}
    return Ensemble.of("hybrid-clifford", sites=sites, **parameters)


@dataclass(frozen=True)
class Task:
    """A transition to be found: sizes, bounds, step, starting values, the error asked for and what is known."""

    ensemble: Callable[[int, float, int], Ensemble]
    sizes: tuple[int, ...]
    low: float
    high: float
    step: float
    starts: int
    below: float
    even: int
    known: float
    at: str

    def values(self) -> list[float]:
        """All values on the step."""
        return [round(self.low + i * self.step, 9) for i in range(round((self.high - self.low) / self.step) + 1)]

    def starting(self) -> list[float]:
        """The values of the first round."""
        values = self.values()
        return [values[round(i)] for i in np.linspace(0, len(values) - 1, self.starts)]

    def grid(self) -> list[float]:
        """The even grid."""
        return [round(float(x), 9) for x in np.linspace(self.low, self.high, GRID)]


TASKS = {
    "ising": Task(ising, (16, 32, 64), 0.40, 0.60, 0.005, 5, 0.001, 500, 0.5, "end"),
    "hybrid": Task(hybrid, (32, 64), 0.13, 0.19, 0.001, 5, 0.001, 600, 0.1598, "last-cell"),
    "wide": Task(hybrid, (32, 64, 128), 0.10, 0.22, 0.001, 7, 0.0007, 300, 0.1598, "last-cell"),
}


class Sweep:
    """Ensembles of one replicate as they are sampled."""

    def __init__(self, task: Task, values: list[float], replicate: int, costs: dict[int, float]) -> None:
        self.places = [(size, x) for size in task.sizes for x in values]
        self.ensembles = [task.ensemble(size, x, replicate) for size, x in self.places]
        fields = {"quantity": "tripartite-information", "average_translations": True, "at": task.at}
        self.item = observation_from_normal_form({"revision": 1, **fields})
        self.parts: list[Accumulator | None] = [None] * len(self.places)
        self.costs = np.array([costs[size] for size, _ in self.places])

    @property
    def have(self) -> Counts:
        """Trajectories so far."""
        return np.array([0 if part is None else part.count for part in self.parts])

    @property
    def spent(self) -> float:
        """Core-seconds so far."""
        return float(self.have @ self.costs)

    def grow(self, targets: Counts) -> None:
        """Sample what is missing."""
        for index, (have, target) in enumerate(zip(self.have.tolist(), targets.tolist(), strict=True)):
            for first in range(have, target, BATCH):
                count = min(BATCH, target - first)
                new = sample(self.ensembles[index], [self.item], first, count).accumulators[self.item.key]
                old = self.parts[index]
                self.parts[index] = new if old is None else old.merge(new)

    def points(self) -> Points:
        """Means, errors and replicas of what was sampled."""
        on = [(place, part) for place, part in enumerate(self.parts) if part is not None]
        rows, errors, means = [], [], []
        for place, part in on:
            where = coordinates(self.ensembles[place], self.item)
            sums, counts = (column[:, 0] for column in fold_ratios(part, where))
            rows.append((sums.sum() - sums) / (counts.sum() - counts))
            moments = summarize(part, where)[0]
            means.append(moments.mean)
            errors.append(moments.standard_error)
        sizes, x = zip(*(self.places[place] for place, _ in on), strict=True)
        keys = [self.ensembles[place].key for place, _ in on]
        return Points.of(sizes, x, means, errors, np.stack(rows, axis=1), keys)

    def candidates(self) -> list[Place]:
        """All places; costs to the nearest power of two, as a service has them."""
        rounded = np.exp2(np.round(np.log2(self.costs))).tolist()
        rows = zip(self.places, rounded, self.have.tolist(), strict=True)
        return [Place(size, x, cost, count, MOST) for (size, x), cost, count in rows]


def measured_costs(task: Task) -> dict[int, float]:
    """Core-seconds of one trajectory of every size, near the middle of the bounds."""
    costs = {}
    for size in task.sizes:
        sweep = Sweep(task, [task.values()[len(task.values()) // 2]], 10**6, dict.fromkeys(task.sizes, 1.0))
        index = task.sizes.index(size)
        sample(sweep.ensembles[index], [sweep.item], 0, 2)
        times = []
        for turn in range(5):
            began = time.process_time()
            sample(sweep.ensembles[index], [sweep.item], turn * FIRST, FIRST)
            times.append((time.process_time() - began) / FIRST)
        costs[size] = median(times)
    return costs


def by_rounds(task: Task, replicate: int, costs: dict[int, float]) -> tuple[Estimate, float, int]:
    """The estimate when the rule is met, core-seconds and the number of rounds."""
    sweep, starts = Sweep(task, task.values(), replicate, costs), set(task.starting())
    targets, rounds = np.array([FIRST if x in starts else 0 for _, x in sweep.places]), 0
    while True:
        sweep.grow(targets)
        rounds += 1
        advice = advise_critical_point(sweep.points(), sweep.candidates(), task.below)
        targets = np.array(advice.targets)
        if advice.met or (targets <= sweep.have).all():
            return advice.estimate, sweep.spent, rounds


def by_grid(task: Task, replicate: int, costs: dict[int, float]) -> tuple[Estimate, float]:
    """The estimate from the even grid and its core-seconds."""
    sweep = Sweep(task, task.grid(), replicate, costs)
    sweep.grow(np.full(len(sweep.places), task.even))
    return advise_critical_point(sweep.points(), sweep.candidates(), task.below).estimate, sweep.spent


def summary(name: str, known: float, found: list[tuple[Estimate, float]]) -> float:
    """Print a line on the replicates and return core-seconds times the mean squared deviation."""
    quoted = [(one, spent) for one, spent in found if one.error is not None]
    z = np.array([one.sigmas_from(known) for one, _ in quoted])
    off = np.array([one.value - known for one, _ in quoted])
    spent, rms = float(np.mean([cost for _, cost in found])), float(np.sqrt(np.mean(off**2)))
    errors = float(np.sqrt(np.mean([one.error**2 for one, _ in quoted if one.error is not None])))
    band = np.sqrt(0.683 * 0.317 / len(z))
    print(
        f"{name}: {len(z)} of {len(found)} quoted; core-seconds {spent:.2f}; RMS {rms:.5f} (mean {off.mean():+.5f}, "
        f"quoted {errors:.5f}); within 1 sigma {np.mean(np.abs(z) < 1):.2f} (0.68 +- {band:.2f}); "
        f"within 2 {np.mean(np.abs(z) < 2):.2f}; core-seconds x RMS^2 {spent * rms**2:.3g}, "
        f"x quoted^2 {spent * errors**2:.3g}",
        flush=True,
    )
    return spent * rms**2


def main() -> None:
    """Print every replicate and the comparison."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0] if __doc__ else None)
    parser.add_argument("task", choices=TASKS)
    parser.add_argument("--replicates", type=int, default=20)
    parser.add_argument("--first", type=int, default=0)
    parser.add_argument("--below", type=float)
    parser.add_argument("--even", type=int)
    options = parser.parse_args()
    plain = TASKS[options.task]
    task = Task(**{**vars(plain), "below": options.below or plain.below, "even": options.even or plain.even})
    costs = measured_costs(task)
    print("core-seconds of a trajectory:", ", ".join(f"{size}: {cost:.2e}" for size, cost in costs.items()), flush=True)
    rounds, grid = [], []
    for replicate in range(options.first, options.first + options.replicates):
        estimate, spent, number = by_rounds(task, replicate, costs)
        rounds.append((estimate, spent))
        grid.append(by_grid(task, replicate, costs))
        even, cost = grid[-1]
        print(f"{replicate:3}: {estimate} in {number} rounds, {spent:.2f}; even {even}, {cost:.2f}", flush=True)
    ratio = summary("rounds", task.known, rounds) / summary("even  ", task.known, grid)
    uncertain = ratio * np.sqrt(2 / len(rounds) + 2 / len(grid))
    print(f"core-seconds to the same RMS error, rounds over even grid: {ratio:.2f} +- {uncertain:.2f}")


if __name__ == "__main__":
    main()
