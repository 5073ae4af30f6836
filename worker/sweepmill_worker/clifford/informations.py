"""The information between a site x of a region A and everything outside A.

I = S_x + S_A - S_(A without x).  With S = sites - rank of the group inside, the last two differ by
1 - (rank on x of the group inside A), and 1 + S_x is the rank on x of all rows; derived here.
"""

import numpy as np
from numpy.typing import NDArray

from sweepmill_worker.clifford.elimination import Desk, copy_rows, cut_open, leave_inside
from sweepmill_worker.clifford.roads import Depths
from sweepmill_worker.clifford.state import Lanes, State, Words, column_chunk
from sweepmill_worker.clifford.vectors import any_bit, load
from sweepmill_worker.jit import part, step


@step
def read_informations(state: State, desk: Desk, asked: Depths, out: NDArray[np.int32], lanes: Lanes) -> None:
    """Add up the informations of the sites of each depth, region after region."""
    for region in range(len(asked.places)):
        cut_open(state, desk, state.sites, lanes)
        copy_rows(desk.copy.stabilizers, state.stabilizers, state.stabilizers)
        copy_rows(desk.rows, state.stabilizers, state.logicals)
        depths = asked.depths[region]
        leave_inside(desk, depths, lanes)
        for site in range(state.sites):
            if depths[site] > 0:
                inside = rank_on(desk.copy, site, desk.copy.stabilizers, lanes)
                out[asked.places[region] + depths[site] - 1] += rank_on(state, site, desk.rows, lanes) - inside


@part
def rank_on(state: State, site: int, rows: Words, lanes: Lanes) -> int:
    """Rank of some rows cut down to a site: 0, 1 or 2."""
    has_x, has_z, differ = False, False, False
    for chunk in range(state.chunks):
        chosen = load(rows, chunk * len(lanes), lanes)
        x = column_chunk(state, chunk, 2 * site, lanes) & chosen
        z = column_chunk(state, chunk, 2 * site + 1, lanes) & chosen
        has_x |= any_bit(x)
        has_z |= any_bit(z)
        differ |= any_bit(x ^ z)
    return 2 if has_x and has_z and differ else int(has_x or has_z)
