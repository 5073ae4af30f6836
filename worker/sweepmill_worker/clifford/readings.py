"""Answer the probes of a plan from a state: the one function that reads, whatever made the state."""

import numpy as np
from numpy.typing import NDArray

from sweepmill_worker.clifford.commutators import Matrix, half_rank, toggle
from sweepmill_worker.clifford.elimination import Desk, clip, mark
from sweepmill_worker.clifford.informations import read_informations
from sweepmill_worker.clifford.intervals import add_around, count_lengths, count_rows, read_arcs, sum_line
from sweepmill_worker.clifford.prefixes import rank_prefixes
from sweepmill_worker.clifford.roads import Others, Plan
from sweepmill_worker.clifford.state import Lanes, State, address
from sweepmill_worker.clifford.vectors import load, store
from sweepmill_worker.jit import part, step


@step
def read(state: State, desk: Desk, matrix: Matrix, plan: Plan, out: NDArray[np.int32], lanes: Lanes) -> None:
    """out[place] = the integers of the plan; the state is left as it is.

    The state may have more sites than the chain: reference qubits, behind it.
    """
    out[:] = 0
    read_cuts(state, desk, plan, out, lanes)
    read_inside(state, desk, matrix, plan, out, lanes)
    read_around(state, desk, plan, out, lanes)
    read_informations(state, desk, plan.informations, out, lanes)
    read_others(state, matrix, plan.others, out, lanes)


@part
def read_cuts(state: State, desk: Desk, plan: Plan, out: NDArray[np.int32], lanes: Lanes) -> None:
    """Regions [0, x)."""
    if len(plan.cuts.places) == 0:
        return
    rank_prefixes(state, desk, plan.sites, lanes)
    for at in range(len(plan.cuts.places)):
        length = plan.cuts.beyonds[at]
        out[plan.cuts.places[at]] = desk.ranks[length] - length


@part
def read_inside(state: State, desk: Desk, matrix: Matrix, plan: Plan, out: NDArray[np.int32], lanes: Lanes) -> None:
    """What the clipped gauge of the stabilizers answers, on the line of the chain with its reference qubits."""
    summed = plan.line >= 0 or plan.ring >= 0
    if not (summed or plan.lengths >= 0 or len(plan.inside.places) > 0 or len(plan.negativities.places) > 0):
        return
    clip(state, desk, state.sites, state.stabilizers, lanes)
    read_arcs(desk, plan.inside, 0, out)
    if plan.line >= 0:
        sum_line(desk, plan.sites, plan.line, out)
    if plan.ring >= 0:
        sum_line(desk, plan.sites, plan.ring, out)
        if not plan.mixed:
            add_around(desk, plan.sites, 0, plan.ring, out)
    if plan.lengths >= 0:
        count_lengths(desk, plan.sites, plan.lengths, out)
    if len(plan.negativities.places) > 0:
        keep_chain(desk, plan.sites, lanes)
        read_others(desk.copy, matrix, plan.negativities, out, lanes)


@part
def read_around(state: State, desk: Desk, plan: Plan, out: NDArray[np.int32], lanes: Lanes) -> None:
    """Arcs that contain the cut, where the chain is mixed: by all rows, cut down to the chain."""
    if len(plan.around.places) == 0 and not (plan.mixed and plan.ring >= 0):
        return
    clip(state, desk, plan.sites, state.logicals, lanes)
    excess = count_rows(desk) - plan.sites
    read_arcs(desk, plan.around, excess, out)
    if plan.ring >= 0:
        add_around(desk, plan.sites, excess, plan.ring, out)


@part
def keep_chain(desk: Desk, sites: int, lanes: Lanes) -> None:
    """Erase from the copy all rows that do not lie on the chain."""
    copy = desk.copy
    for row in range(len(desk.left)):
        if desk.right[row] >= sites:
            desk.left[row] = -1
    mark(desk, desk.rows, sites)
    for chunk in range(copy.chunks):
        kept = load(desk.rows, chunk * len(lanes), lanes)
        for column in range(2 * copy.sites):
            at = address(copy, chunk, column, lanes)
            store(copy.columns, at, load(copy.columns, at, lanes) & kept)


@step
def read_others(state: State, matrix: Matrix, others: Others, out: NDArray[np.int32], lanes: Lanes) -> None:
    """Half the rank of the rows' commutators on any regions, one after the other."""
    if len(others.places) == 0:
        return
    matrix.rows[:] = 0
    begin = 0
    for ordinal in range(len(others.ends)):
        for at in range(begin, others.ends[ordinal]):
            toggle(state, matrix, others.toggles[at], lanes)
        begin = others.ends[ordinal]
        others.values[ordinal] = half_rank(state, matrix, lanes)
    for at in range(len(others.places)):
        out[others.places[at]] = others.values[others.ordinals[at]]
