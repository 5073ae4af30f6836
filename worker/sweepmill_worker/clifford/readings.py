"""Read the entropies of a plan's regions off a state."""

import numpy as np
from numpy.typing import NDArray

from sweepmill_worker.clifford.commutators import Matrix, half_rank, toggle
from sweepmill_worker.clifford.elimination import Desk, clip, read_prefixes, rows_inside
from sweepmill_worker.clifford.roads import GENERAL, INTERVAL, PREFIX, TURNED, Plan
from sweepmill_worker.clifford.state import Lanes, State
from sweepmill_worker.jit import part, step


@step
def read(state: State, desk: Desk, matrix: Matrix, plan: Plan, out: NDArray[np.int32], lanes: Lanes) -> None:
    """out[region] = entropy in bits."""
    read_along(state, desk, plan, out, lanes)
    for kind, origin in ((INTERVAL, 0), (TURNED, state.sites // 2)):
        read_intervals(state, desk, plan, kind, origin, out, lanes)
    read_general(state, matrix, plan, out, lanes)


@part
def has_kind(plan: Plan, kind: int) -> bool:
    """Is any region read by this kind of road?"""
    found = False
    for region in range(len(plan.kinds)):
        found |= plan.kinds[region] == kind
    return found


@part
def read_along(state: State, desk: Desk, plan: Plan, out: NDArray[np.int32], lanes: Lanes) -> None:
    """Regions [0, x)."""
    if not has_kind(plan, PREFIX):
        return
    read_prefixes(state, desk, lanes)
    for region in range(len(out)):
        if plan.kinds[region] == PREFIX:
            length = plan.firsts[region]
            out[region] = desk.ranks[length] - length


@part
def read_intervals(
    state: State, desk: Desk, plan: Plan, kind: int, origin: int, out: NDArray[np.int32], lanes: Lanes
) -> None:
    """Intervals of the chain cut open at the origin."""
    if not has_kind(plan, kind):
        return
    clip(state, desk, origin, lanes)
    for region in range(len(out)):
        if plan.kinds[region] == kind:
            length = plan.lengths[region]
            out[region] = length - rows_inside(desk, plan.firsts[region], length)


@part
def read_general(state: State, matrix: Matrix, plan: Plan, out: NDArray[np.int32], lanes: Lanes) -> None:
    """Any regions, one after the other, by commutators."""
    count = len(plan.toggle_ends)
    if count == 0:
        return
    matrix.rows[:] = 0
    begin = 0
    for ordinal in range(count):
        for at in range(begin, plan.toggle_ends[ordinal]):
            toggle(state, matrix, plan.toggles[at], lanes)
        begin = plan.toggle_ends[ordinal]
        plan.entropies[ordinal] = half_rank(state, matrix, lanes)
    for region in range(len(out)):
        if plan.kinds[region] == GENERAL:
            out[region] = plan.entropies[plan.firsts[region]]
