"""Sample trajectories of a compiled circuit."""

from collections.abc import Sequence
from itertools import pairwise
from operator import lt
from typing import Final

import numpy as np

from sweepmill_worker.clifford.commutators import new_matrix
from sweepmill_worker.clifford.elimination import new_desk as new_reading_desk
from sweepmill_worker.clifford.engine import MASKS, Readings
from sweepmill_worker.clifford.roads import Plan, plan
from sweepmill_worker.clifford.state import aligned
from sweepmill_worker.clifford.trajectories import Results
from sweepmill_worker.observables.probes import Probes, Region, of_regions
from sweepmill_worker.program.compile import Program
from sweepmill_worker.program.execute import INITIAL_STATES, Circuit, run_trajectories
from sweepmill_worker.program.kinds import ENSEMBLE_TRAJECTORY
from sweepmill_worker.program.listing import new_desk
from sweepmill_worker.program.operations import ONE_SITE_CLASSES
from sweepmill_worker.program.products import roomy_state

SINGLE_MASKS: Final = aligned(4 * len(ONE_SITE_CLASSES), np.uint32)
SINGLE_MASKS[:] = np.where(ONE_SITE_CLASSES.transpose(0, 2, 1), np.uint32(0xFFFFFFFF), np.uint32(0)).reshape(-1)


def run_program(
    program: Program,
    key_words: tuple[int, int],
    first: int,
    count: int,
    read_layers: Sequence[int],
    regions: Sequence[Region],
) -> Readings:
    """Sample trajectories first .. first + count - 1.

    key_words: the first two 32-bit words of the ensemble key.  read_layers: ascending, 1 .. program.layers.  regions:
    sorted tuples of distinct sites, references included.  Raises ValueError, naming the argument, for anything out of
    range.
    """
    for region in regions:
        if not all(map(lt, region, region[1:])):
            raise ValueError(f"regions: sites must ascend, got {region}")
        if region and not 0 <= region[0] <= region[-1] < program.total:
            raise ValueError(f"regions: sites are 0 .. {program.total - 1}, got {region}")
    probes = of_regions(program.sites, regions, program.references)
    return run_probes(program, key_words, first, count, read_layers, probes)


def run_probes(
    program: Program, key_words: tuple[int, int], first: int, count: int, read_layers: Sequence[int], probes: Probes
) -> Readings:
    """`run_program` with any probes instead of regions: the last axis of `entropies` is that of their layout."""
    _check(program, key_words, first, count, read_layers)
    return run_plan(program, key_words, first, count, read_layers, plan(probes, program.mixed))


def run_plan(
    program: Program, key_words: tuple[int, int], first: int, count: int, read_layers: Sequence[int], chosen: Plan
) -> Readings:
    """`run_probes` with the roads already chosen and nothing checked."""
    state, lanes = roomy_state(program.total, program.mixed)
    spare, _ = roomy_state(program.total, program.mixed)
    results = Results(
        entropies=np.zeros((count, len(read_layers), chosen.size), dtype=np.int32),
        random=np.zeros((count, program.layers), dtype=np.int32),
        measured=np.zeros((count, program.layers), dtype=np.int32),
    )
    run_trajectories(
        state,
        new_reading_desk(spare),
        new_matrix(state, lanes, wanted=len(chosen.others.ends) + len(chosen.negativities.ends) > 0),
        circuit_of(program, key_words),
        program.tables,
        new_desk(program, key_words),
        chosen,
        np.array(read_layers, dtype=np.int64),
        np.uint64(first),
        results,
        lanes,
    )
    return Readings(*results)


def circuit_of(program: Program, key_words: tuple[int, int]) -> Circuit:
    """What the executor knows besides the tables."""
    return Circuit(
        layers=program.layers,
        initial=INITIAL_STATES[program.initial_state],
        loses=program.mixed,
        ring=program.periodic and program.references == 0,
        masks=MASKS,
        single_masks=SINGLE_MASKS,
        classes=np.zeros(program.sites // 2 + 1, dtype=np.int64),
        key=key_words,
    )


def _check(program: Program, key_words: tuple[int, int], first: int, count: int, read_layers: Sequence[int]) -> None:
    if not all(0 <= word < 2**32 for word in key_words):
        raise ValueError(f"key_words: must be two 32-bit words, got {key_words}")
    if first < 0 or count < 0 or first + count > ENSEMBLE_TRAJECTORY:
        raise ValueError(f"first, count: trajectories are numbered 0 .. 2**64 - 2, got {first}, {count}")
    if any(not 1 <= layer <= program.layers for layer in read_layers):
        raise ValueError(f"read_layers: layers are 1 .. {program.layers}, got {list(read_layers)}")
    if any(a >= b for a, b in pairwise(read_layers)):
        raise ValueError(f"read_layers: must ascend, got {list(read_layers)}")
