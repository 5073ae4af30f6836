"""How much memory a batch takes on a worker, so that no ensemble takes one down.

Readings are made in blocks of trajectories that fit a fixed space; what remains is a single trajectory's readings,
the engine's own arrays and the totals, all bounded by the limits of a server.
"""

from collections.abc import Sequence
from typing import Any, Final

import numpy as np

from sweepmill.coordinates import accumulator_bytes, kept_bytes
from sweepmill.ensemble import Ensemble
from sweepmill.times import Reading, readings
from sweepmill_worker.clifford.engine import working_bytes as column_bytes
from sweepmill_worker.clusters.engine import working_bytes as cluster_bytes
from sweepmill_worker.crossed import program_from
from sweepmill_worker.engines import CHAIN, CLUSTERS, SIGNED, engine_of, program_of
from sweepmill_worker.kept import BATCH_BYTES
from sweepmill_worker.observables.plan import ProbePlan, plan_probes
from sweepmill_worker.program.compile import Program

BLOCK_BYTES: Final = 16_000_000
"""Room for the readings of one block of trajectories, and for the values made of them."""
OPERATION_BYTES: Final = 48
KEPT_COPIES: Final = 12
"""Kept values of one batch are held narrow and, while they are packed, as wide integers."""
SIGNED_SPARE: Final = 64
"""Qubits of the signed simulation besides the system and as many of its environment."""


def times_of(ensemble: Ensemble, observations: Sequence[Any]) -> list[tuple[Reading, ...]]:
    """The readings of each observation."""
    return [readings(item.at, ensemble.layers, ensemble.cell) for item in observations]


def plan_of(ensemble: Ensemble, observations: Sequence[Any]) -> ProbePlan:
    """What an engine reads for them."""
    return plan_probes(ensemble.sites, ensemble.references, ensemble.periodic, tuple(observations))


def read_layers(times: Sequence[tuple[Reading, ...]], plan: ProbePlan) -> list[int]:
    """Layers at which the state is read; outcome counts come for every layer anyway."""
    needed = [when for when, indices in zip(times, plan.indices, strict=True) if indices is not None]
    return sorted({n for when in needed for reading in when for n in reading.layers})


def trajectory_bytes(ensemble: Ensemble, observations: Sequence[Any]) -> int:
    """Readings of one trajectory, and the values made of them."""
    times, plan = times_of(ensemble, observations), plan_of(ensemble, observations)
    terms = sum(i.size * len(when) for i, when in zip(plan.indices, times, strict=True) if i is not None)
    counts = 16 + 32 * bool(plan.probes.against)  # per layer; those of other initial states come besides
    return 8 * len(read_layers(times, plan)) * plan.probes.size + 16 * terms + counts * ensemble.layers


def block_size(ensemble: Ensemble, observations: Sequence[Any]) -> int:
    """Trajectories sampled at a time."""
    return max(1, BLOCK_BYTES // trajectory_bytes(ensemble, observations))


def engine_bytes(ensemble: Ensemble) -> int:
    """Arrays of the engine."""
    engine = engine_of(ensemble)
    if engine is CLUSTERS:
        return cluster_bytes(ensemble.sites)
    if engine is CHAIN:
        return column_bytes(ensemble.sites, ensemble.parameters["initial_state"] == "mixed")
    return _signed_bytes(ensemble) if engine is SIGNED else _program_bytes(program_of(ensemble))


def _signed_bytes(ensemble: Ensemble) -> int:
    """Bit matrices of the tableau, its inverse and copies."""
    return 4 * (2 * (ensemble.sites + ensemble.references) + SIGNED_SPARE) ** 2


def _program_bytes(program: Program) -> int:
    tables = sum(table.nbytes for table in program.tables if isinstance(table, np.ndarray))
    tables += program.places.nbytes + 8 * program.words + OPERATION_BYTES * program.most_operations
    return column_bytes(program.total + 1, program.mixed) + 2 * tables


def _other_states_bytes(ensemble: Ensemble, states: Sequence[str]) -> int:
    """The circuit from other initial states, to compare records: beside it with signs, one after another without."""
    if not states or ensemble.signed:
        return len(states) * _signed_bytes(ensemble)
    return _program_bytes(program_from(ensemble, "mixed"))


def peak_bytes(ensemble: Ensemble, observations: Sequence[Any]) -> int:
    """Upper estimate of what one batch adds to an idle worker, in bytes."""
    block = max(BLOCK_BYTES, trajectory_bytes(ensemble, observations))
    totals = sum(accumulator_bytes(ensemble, item) for item in observations)
    engines = engine_bytes(ensemble) + _other_states_bytes(ensemble, plan_of(ensemble, observations).probes.against)
    return engines + 3 * block + 3 * totals + KEPT_COPIES * _kept(ensemble, observations)


def _kept(ensemble: Ensemble, observations: Sequence[Any]) -> int:
    """Values that a batch carries, whose size the plan bounds."""
    each = sum(kept_bytes(ensemble, item) for item in observations)
    return max(BATCH_BYTES, each) if each else 0
