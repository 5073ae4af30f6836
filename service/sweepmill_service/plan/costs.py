"""Predicted cost of a trajectory before anything of its ensemble was measured."""

from collections.abc import Callable
from typing import Final

from sweepmill.ensemble import Ensemble
from sweepmill_service.plan.tables import TABLES, nanoseconds
from sweepmill_service.plan.work import BRICKWORK, Work, work_of

PER_TRAJECTORY: Final = 1.5e-6
DRAW: Final = 5e-8
"""Seconds to draw one place."""
OUTCOME: Final = 1.1e-7
"""Seconds of a measurement with nothing but measurements between: each outcome is random."""
SIGNED_LAYER, SIGNED_GATE, SIGNED_OUTCOME = 3.2e-4, 1.2e-5, 3.5e-5
KINDS: Final = (*TABLES, "signed")


def seconds_of(work: Work) -> float:
    """Core-seconds of the evolution of one trajectory, to within a small factor."""
    if work.kind == "signed":
        return work.layers * (SIGNED_LAYER + work.sites * (SIGNED_GATE * work.gates + SIGNED_OUTCOME * work.rate))
    return PER_TRAJECTORY + work.sites * work.layers * (_per_site(work) + DRAW * work.drawn)


def _per_site(work: Work) -> float:
    """Seconds per site and layer: of the gates, and of measurements among so many gates."""
    if work.kind == "clusters":
        return 1e-9 * nanoseconds(work.kind, work.sites, work.rate)
    idle, top = 1e-9 * nanoseconds(work.kind, work.sites, 0.0), TABLES[work.kind].rates[-1]
    measured = 1e-9 * nanoseconds(work.kind, work.sites, min(work.rate, top)) - idle
    share = min(work.gates / BRICKWORK, 1.0)
    return (
        idle * max(work.gates / BRICKWORK, 1.0)
        + measured * max(work.rate / top, 1.0) * share
        + OUTCOME * work.rate * (1 - share)
    )


def default_seconds_per_trajectory(ensemble: Ensemble) -> float:
    """Core-seconds of the evolution of one trajectory of an ensemble, to within a small factor."""
    return seconds_of(work_of(ensemble))


def what_would_pass(work: Work, factor: float, limit: float) -> tuple[int, int]:
    """Most layers at these sites, and most sites at as many layers per site, within ``limit`` seconds.

    ``factor``: what trajectories take over the default cost. Zero where nothing passes.
    """

    def passes(sites: int, layers: int) -> bool:
        return factor * seconds_of(work._replace(sites=sites, layers=layers)) <= limit

    layers = _largest(work.layers, lambda n: passes(work.sites, n))
    return layers, _largest(work.sites, lambda n: passes(n, max(1, round(n * work.layers / work.sites))))


def _largest(upper: int, passes: Callable[[int], bool]) -> int:
    """The largest number up to ``upper`` that passes, 0 if none does; whoever passes, so do the smaller ones."""
    low, high = 0, upper
    while low < high:
        middle = (low + high + 1) // 2
        low, high = (middle, high) if passes(middle) else (low, middle - 1)
    return low


class Calibration:
    """What this machine and these observations really take over the default, learned from first batches."""

    def __init__(self) -> None:
        self.factor = 1.0

    def note(self, default: float, measured: float) -> None:
        """Follow half of the way, in logarithms, from one batch of an ensemble not measured before."""
        if default > 0 and measured > 0:
            self.factor = (self.factor * measured / default) ** 0.5
