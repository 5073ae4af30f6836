"""The strongest route to the same numbers on stim that we know: what the kernel is measured against.

Per trajectory one circuit is parsed from text joined out of a precomputed table of named gates for every bond and
class; the measurements of a layer are one instruction; the entropies of all cuts come from one packed elimination of
the simulator's tableau.  Appending to a circuit object, or applying a tableau per gate, is several times slower.
"""

from functools import cache
from itertools import product

import numpy as np
import stim
from numpy.typing import NDArray

from sweepmill_worker.clifford.engine import GATE_CLASSES

ONE_SITE = ("", "H", "S", "H_YZ", "C_XYZ", "C_ZYX")
CORES = ("", "CX", "ISWAP", "SWAP")


def _symplectic(circuit: str) -> bytes:
    tableau = stim.Tableau.from_circuit(stim.Circuit(f"I 0 1\n{circuit}"))
    xx, xz, zx, zz, _, _ = tableau.to_numpy()
    rows = np.empty((4, 4), dtype=np.uint8)
    rows[0::2, 0::2], rows[0::2, 1::2], rows[1::2, 0::2], rows[1::2, 1::2] = xx, xz, zx, zz
    return rows.tobytes()


def _text(template: tuple[str, str, str, str, str], left: int, right: int) -> str:
    a, b, core, c, d = template
    parts = [(a, f"{left}"), (b, f"{right}"), (core, f"{left} {right}"), (c, f"{left}"), (d, f"{right}")]
    return "".join(f"{name} {targets}\n" for name, targets in parts if name)


@cache
def templates() -> list[tuple[str, str, str, str, str]]:
    """Per class the shortest product of named gates."""
    found: dict[bytes, tuple[str, str, str, str, str]] = {}
    for a, b, core, c, d in product(ONE_SITE, ONE_SITE, CORES, ONE_SITE, ONE_SITE):
        template = (a, b, core, c, d)
        key = _symplectic(_text(template, 0, 1))
        if key not in found or sum(map(bool, template)) < sum(map(bool, found[key])):
            found[key] = template
    return [found[matrix.tobytes()] for matrix in GATE_CLASSES]


class StimRoute:
    """Open chain of L sites, depth 2L."""

    def __init__(self, sites: int, rate: float, seed: int) -> None:
        self.sites, self.rate = sites, rate
        self.draw = np.random.default_rng(seed)
        self.table = [[_text(t, left, left + 1) for t in templates()] for left in range(sites - 1)]
        self.names = [str(site) for site in range(sites)]

    def trajectory(self) -> tuple[NDArray[np.int64], int]:
        """Entropies of all cuts at the end, and the number of measurements."""
        text: list[str] = []
        measurements = 0
        for layer in range(2 * self.sites):
            lefts = range(layer % 2, self.sites - 1, 2)
            classes = self.draw.integers(720, size=len(lefts)).tolist()
            text += [self.table[left][chosen] for left, chosen in zip(lefts, classes, strict=True)]
            measured = np.flatnonzero(self.draw.random(self.sites) < self.rate).tolist()
            if measured:
                text.append("M " + " ".join([self.names[site] for site in measured]) + "\n")
                measurements += len(measured)
        simulator = stim.TableauSimulator()
        simulator.do_circuit(stim.Circuit("".join(text)))
        tableau = simulator.current_inverse_tableau().inverse(unsigned=True)
        _, _, zx, zz, _, _ = tableau.to_numpy()
        return cut_entropies(zx, zz), measurements


def cut_entropies(xs: NDArray[np.bool_], zs: NDArray[np.bool_]) -> NDArray[np.int64]:
    """S of the first x sites, x = 0 .. L: ranks by one elimination of bit-packed rows."""
    sites = len(xs)
    bits = np.empty((sites, 2 * sites), dtype=bool)
    bits[:, 0::2], bits[:, 1::2] = xs, zs
    rows = np.packbits(bits, axis=1)
    rows = np.pad(rows, ((0, 0), (0, -rows.shape[1] % 8))).view(np.uint64)
    bytes_view = rows.view(np.uint8)
    rank, ranks = 0, [0]
    for column in range(2 * sites):
        if rank < sites:
            has = (bytes_view[rank:, column >> 3] >> (7 - (column & 7))) & 1
            hits = np.flatnonzero(has)
            if len(hits):
                pivot = rank + hits[0]
                rows[[rank, pivot]] = rows[[pivot, rank]]
                others = rank + hits[1:]
                rows[others] ^= rows[rank]
                rank += 1
        if column & 1:
            ranks.append(rank)
    return np.array(ranks) - np.arange(sites + 1)
