"""What the clipped gauge says of all intervals of the line.

A group of rank r on n sites has as many independent elements inside an interval as clipped rows lie inside it: for the
stabilizers S = length - rows inside.  (Clipped gauge: Quantum entanglement growth under random unitary dynamics,
Physical Review X 7, 031016 (2017).)  For an arc that contains the cut, all rows are cut down to the chain, logical ones
included: they generate what commutes with the chain's stabilizers, their rank on any region is its size plus its
entropy, and their rank on the arc falls short of that on the chain by the rows inside the complement.  Hence
S(arc) = S(chain) + size of the complement - rows inside the complement; derived here.
"""

import numpy as np
from numpy.typing import NDArray

from sweepmill_worker.clifford.elimination import Desk
from sweepmill_worker.clifford.roads import Arcs
from sweepmill_worker.clifford.vectors import item, put
from sweepmill_worker.jit import part, step


@part
def count_rows(desk: Desk) -> int:
    """Number of clipped rows."""
    count = 0
    for row in range(len(desk.left)):
        count += desk.left[row] >= 0
    return count


@step
def read_arcs(desk: Desk, arcs: Arcs, excess: int, out: NDArray[np.int32]) -> None:
    """excess + length - rows inside, for each interval: from the last first position down, rows join by their ends."""
    if len(arcs.firsts) == 0:
        return
    sort_by_left(desk)
    desk.counts[:] = 0
    begin, at = len(desk.heads), 0
    while at < len(arcs.firsts):
        first = arcs.firsts[at]
        for position in range(first, begin):
            row = desk.heads[position]
            while row >= 0:
                desk.counts[desk.right[row]] += 1
                row = desk.following[row]
        begin, end, inside = first, first, 0
        while at < len(arcs.firsts) and arcs.firsts[at] == first:
            while end < arcs.beyonds[at]:
                inside += desk.counts[end]
                end += 1
            out[arcs.places[at]] = excess + arcs.beyonds[at] - first - inside
            at += 1


@part
def sort_by_left(desk: Desk) -> None:
    """Chain the clipped rows by their first positions."""
    desk.heads[:] = -1
    for row in range(len(desk.left)):
        position = desk.left[row]
        if position >= 0:
            desk.following[row] = desk.heads[position]
            desk.heads[position] = row


@step
def sum_line(desk: Desk, sites: int, place: int, out: NDArray[np.int32]) -> None:
    """out[place + l - 1] = sum of the entropies of the intervals of l sites of the line."""
    count_windows(desk, 0, sites)
    slope, inside = 0, 0
    for length in range(1, sites + 1):
        slope += item(desk.counts, length)
        inside += slope
        put(out, place + length - 1, np.int32((sites - length + 1) * length - inside))


@step
def add_around(desk: Desk, sites: int, excess: int, place: int, out: NDArray[np.int32]) -> None:
    """Add to out[place + l - 1] the entropies of the l - 1 arcs of l sites that contain the cut, by their complements.

    Complements begin after site 0 and end before the last one; `excess` is the entropy of the chain.
    """
    count_windows(desk, 1, sites - 1)
    slope, inside = 0, 0
    for size in range(sites - 1):
        slope += item(desk.counts, size)
        inside += slope
        length = sites - size
        out[place + length - 1] += (length - 1) * (excess + size) - inside


@part
def count_windows(desk: Desk, first: int, beyond: int) -> None:
    """counts[l] = second difference in l of the number of pairs of a clipped row and a window of l sites around it.

    Windows within first .. beyond - 1.  Those around a row from a to b: one at l = b - a + 1, one more for each
    further site until an end of the line is met, and one less for each once both are.
    """
    desk.counts[:] = 0
    for row in range(len(desk.left)):
        a, b = desk.left[row], desk.right[row]
        if a >= first and b < beyond:
            desk.counts[b - a + 1] += 1
            desk.counts[b - first + 2] -= 1
            desk.counts[beyond - a + 1] -= 1


@part
def count_lengths(desk: Desk, sites: int, place: int, out: NDArray[np.int32]) -> None:
    """out[place + l - 1] = number of clipped rows of l sites on the chain."""
    for row in range(len(desk.left)):
        if desk.left[row] >= 0 and desk.right[row] < sites:
            out[place + desk.right[row] - desk.left[row]] += 1
