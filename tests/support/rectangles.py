"""Bond percolation on the self-dual rectangle of n rows and n + 1 columns, left and right columns wired.

n^2 horizontal and (n - 1)^2 vertical bonds; the probability of a crossing from left to right is 1/2 at p = 1/2 for
every n, and its slope grows as n^(3/4): nu = 4/3 (exact in two dimensions, textbooks).
"""

from functools import cache
from itertools import combinations
from math import comb

import numpy as np
from numpy.typing import NDArray
from scipy.sparse import coo_array
from scipy.sparse.csgraph import breadth_first_order, minimum_spanning_tree


def bonds(n: int) -> NDArray[np.int64]:
    """Ends of all bonds; vertex 0 is the left column, 1 the right one."""

    def vertex(row: int, column: int) -> int:
        return 0 if column == 0 else 1 if column == n else 2 + row * (n - 1) + column - 1

    horizontal = [(vertex(row, column), vertex(row, column + 1)) for row in range(n) for column in range(n)]
    vertical = [(vertex(row, column), vertex(row + 1, column)) for row in range(n - 1) for column in range(1, n)]
    return np.array(horizontal + vertical)


@cache
def crossing_counts(n: int) -> tuple[int, ...]:
    """How many configurations with k open bonds cross, k = 0, 1, …: by going through all of them."""
    ends = bonds(n)
    counts = [0] * (len(ends) + 1)
    for number in range(len(ends) + 1):
        for chosen in combinations(range(len(ends)), number):
            counts[number] += _crosses(ends[list(chosen)].tolist())
    return tuple(counts)


def _crosses(open_bonds: list[list[int]]) -> bool:
    reached, grown = {0}, True
    while grown and 1 not in reached:
        grown = False
        for a, b in open_bonds:
            if (a in reached) != (b in reached):
                reached |= {a, b}
                grown = True
    return 1 in reached


def crossing_probability(n: int, p: float) -> float:
    counts = crossing_counts(n)
    total = len(counts) - 1
    assert all(count <= comb(total, k) for k, count in enumerate(counts))
    return float(sum(count * p**k * (1 - p) ** (total - k) for k, count in enumerate(counts)))


def thresholds(n: int, samples: int, generator: np.random.Generator) -> NDArray[np.float64]:
    """For every sample the p at which a crossing appears when each bond opens at its own uniform number; n > 1.

    It is the largest number on the path from left to right in the minimum spanning tree (common practice).
    """
    ends, vertices = bonds(n), 2 + n * (n - 1)
    found = np.empty(samples)
    for sample in range(samples):
        graph = coo_array((generator.uniform(size=len(ends)), (ends[:, 0], ends[:, 1])), shape=(vertices, vertices))
        tree = minimum_spanning_tree(graph).tocoo()
        before = breadth_first_order(tree, 0, directed=False)[1]
        child = np.where(before[tree.col] == tree.row, tree.col, tree.row)
        opens = np.zeros(vertices)
        opens[child] = tree.data
        vertex = 1
        while vertex != 0:
            found[sample] = max(found[sample], opens[vertex]) if vertex != 1 else opens[vertex]
            vertex = int(before[vertex])
    return found
