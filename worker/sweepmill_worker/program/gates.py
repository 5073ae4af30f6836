"""Gates by name: the classes a random one is drawn from, and the class and Pauli frame of a definite one."""

from functools import cache
from itertools import product
from typing import Final

import numpy as np
import stim
from numpy.typing import NDArray

from sweepmill_worker.clifford.classes import GATE_CLASSES
from sweepmill_worker.program.operations import ONE_SITE_CLASSES

_BLOCK_RANKS: Final = {
    "identity-class": (2, 0),
    "cnot-class": (2, 1),
    "iswap-class": (1, 2),
    "swap-class": (0, 2),
}
"""Ranks of the blocks left -> left and left -> right of a class's matrix: they tell the four kinds of gates apart."""

_STIM_NAMES: Final = {
    "id": "I",
    "sdg": "S_DAG",
    "sx": "SQRT_X",
    "sxdg": "SQRT_X_DAG",
    "sy": "SQRT_Y",
    "sydg": "SQRT_Y_DAG",
    "sz": "S",
    "szdg": "S_DAG",
}


@cache
def random_classes(name: str, sites: int) -> NDArray[np.int32] | None:
    """The classes a random gate is drawn from, ascending; None for a name of a definite gate.

    Raises ValueError for a kind of gate that does not act on this number of sites.
    """
    if name == "uniform-clifford":
        if sites not in (1, 2):
            raise ValueError(f"uniform-clifford acts on 1 or 2 sites, not {sites}")
        return np.arange(720 if sites == 2 else 6, dtype=np.int32)
    if name not in _BLOCK_RANKS:
        return None
    if sites != 2:
        raise ValueError(f"{name} acts on 2 sites, not {sites}")
    same, across = (_ranks(GATE_CLASSES[:, :2, at : at + 2]) for at in (0, 2))
    wanted = _BLOCK_RANKS[name]
    return np.flatnonzero((same == wanted[0]) & (across == wanted[1])).astype(np.int32)


def _ranks(blocks: NDArray[np.uint8]) -> NDArray[np.int64]:
    """Rank over GF(2) of 2 x 2 matrices [n, 2, 2]."""
    regular = (blocks[:, 0, 0] & blocks[:, 1, 1]) ^ (blocks[:, 0, 1] & blocks[:, 1, 0])
    return blocks.any(axis=(1, 2)).astype(np.int64) + regular


@cache
def named_gate(name: str, sites: int) -> tuple[int, int]:
    """(class, frame) of a definite gate: the class with all signs positive, followed by the Pauli frame.

    The tableaus are stim's.  Raises ValueError for an unknown name and a wrong number of sites.
    """
    try:
        tableau = stim.Tableau.from_named_gate(_STIM_NAMES.get(name, name.upper().replace("_DG", "_DAG")))
    except IndexError as error:
        raise ValueError(f"no Clifford gate is called {name}") from error
    if len(tableau) != sites:
        raise ValueError(f"{name} acts on {len(tableau)} sites, not {sites}")
    return _class_and_frame(tableau)


@cache
def bell_class() -> int:
    """The gate that turns |00> into a Bell pair."""
    return _class_and_frame(stim.Circuit("H 0\nCX 0 1").to_tableau())[0]


def _class_and_frame(tableau: stim.Tableau) -> tuple[int, int]:
    sites = len(tableau)
    images = [image for q in range(sites) for image in (tableau.x_output(q), tableau.z_output(q))]
    matrix = np.array([[bit for q in range(sites) for bit in _bits(image[q])] for image in images], dtype=np.uint8)
    table = GATE_CLASSES if sites == 2 else ONE_SITE_CLASSES
    number = int(np.flatnonzero((table == matrix).all(axis=(1, 2)))[0])
    return number, _frame(images, sites)


def _bits(pauli: int) -> tuple[int, int]:
    """(x, z) of a stim letter 0 I, 1 X, 2 Y, 3 Z."""
    return int(pauli in (1, 2)), int(pauli in (2, 3))


def _frame(images: list[stim.PauliString], sites: int) -> int:
    """The Pauli that anticommutes with exactly the images whose sign is negative."""
    for frame, letters in enumerate(product("IXYZ", repeat=sites)):
        pauli = stim.PauliString("".join(letters))
        if all(pauli.commutes(image) == (image.sign == 1) for image in images):
            return frame
    raise AssertionError("independent images leave no sign pattern without a Pauli")
