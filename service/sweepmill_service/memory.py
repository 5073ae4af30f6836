"""What a batch of a sweep may take of a worker's memory."""

import re
from typing import NamedTuple

from sweepmill.ensemble import PROGRAM, Ensemble
from sweepmill.errors import Fault
from sweepmill.sweep import Sweep
from sweepmill_worker.memory import peak_bytes


class Largest(NamedTuple):
    """The ensemble whose batches take most, and how much an idle worker needs for one, in bytes."""

    ensemble: Ensemble
    bytes: int


def largest(sweep: Sweep) -> Largest:
    """Over all ensembles of a sweep; those of one shape, and one circuit but for its numbers, need the same.

    Raises ValueError, naming the field, for an ensemble that its engine does not take.
    """
    observations = [item.observation for item in sweep.observations]
    shapes = {(point.ensemble.shape, _steps(point.ensemble)): point.ensemble for point in sweep.points}
    return max((Largest(one, peak_bytes(one, observations)) for one in shapes.values()), key=lambda item: item.bytes)


def _steps(ensemble: Ensemble) -> str:
    """A circuit written as data without its numbers."""
    return re.sub(r"-?\d[\d.e-]*", "", repr([ensemble.parameters.get(part) for part in PROGRAM]))


def memory_fault(sweep: Sweep, limit: int) -> Fault | None:
    """The fault of a sweep whose batches do not fit into a worker, or that no engine takes."""
    try:
        found = largest(sweep)
    except ValueError as error:  # of an engine, naming the field
        return Fault("circuit", str(error))
    if found.bytes <= limit:
        return None
    return Fault(
        "observe",
        f"a batch at {found.ensemble.sites} sites and {found.ensemble.layers} layers takes {found.bytes} bytes of a "
        f"worker, this server gives {limit}: read fewer layers, cuts or regions, or fewer sites",
    )
