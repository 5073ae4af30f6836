"""What a batch of a sweep may take of a worker's memory."""

from typing import NamedTuple

from sweepmill.ensemble import Ensemble
from sweepmill.errors import Fault
from sweepmill.sweep import Sweep
from sweepmill_worker.memory import peak_bytes


class Largest(NamedTuple):
    """The ensemble whose batches take most, and how much an idle worker needs for one, in bytes."""

    ensemble: Ensemble
    bytes: int


def largest(sweep: Sweep) -> Largest:
    """Over all ensembles of a sweep; those of one shape need the same."""
    observations = [item.observation for item in sweep.observations]
    shapes = {point.ensemble.shape: point.ensemble for point in sweep.points}
    return max((Largest(one, peak_bytes(one, observations)) for one in shapes.values()), key=lambda item: item.bytes)


def memory_fault(sweep: Sweep, limit: int) -> Fault | None:
    """The fault of a sweep whose batches do not fit into a worker."""
    found = largest(sweep)
    if found.bytes <= limit:
        return None
    return Fault(
        "observe",
        f"a batch at {found.ensemble.sites} sites and {found.ensemble.layers} layers takes {found.bytes} bytes of a "
        f"worker, this server gives {limit}: read fewer layers, cuts or regions, or fewer sites",
    )
