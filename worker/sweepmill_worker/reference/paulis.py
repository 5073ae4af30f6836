"""Rows of a circuit as stim's objects: gates with their signs, Pauli products with their letters."""

from collections.abc import Sequence
from functools import lru_cache
from typing import Any, Final

import stim

from sweepmill_worker.clifford.classes import GATE_CLASSES
from sweepmill_worker.program.operations import CLASS, FRAME, LETTERS, ONE_SITE_CLASSES, SITE, SITES

LETTER_NAMES: Final = "IXYZ"

Row = Sequence[int]
"""One operation, see `program/operations.py`: a list, since columns are taken one by one."""
Pauli = tuple[str, tuple[int, ...]]
"""A product of Paulis: letters, and the qubit of each."""


def letters_of(number: int, sites: int) -> str:
    """The Pauli letters of base-4 digits, the first site most significant."""
    return "".join(LETTER_NAMES[number >> 2 * (sites - 1 - i) & 3] for i in range(sites))


def row_sites(row: Row) -> tuple[int, ...]:
    """The sites a row acts on."""
    return tuple(row[SITE : SITE + row[SITES]])


def swapped(row: Row) -> tuple[int, int]:
    """The site and the reference qubit of a swap, which stands behind the sites of its row."""
    return row[SITE], row[SITE + 1]


def row_pauli(row: Row) -> Pauli:
    """The Pauli product of a row: one letter X, Y or Z per site, sites with an identity left out."""
    pairs = zip(letters_of(row[LETTERS], row[SITES]), row_sites(row), strict=True)
    kept = [(letter, site) for letter, site in pairs if letter != "I"]
    return "".join(letter for letter, _ in kept), tuple(site for _, site in kept)


def row_tableau(row: Row) -> Any:
    """The signed gate of a row, as `stim.Tableau`."""
    return gate_tableau(row[CLASS], row[FRAME], row[SITES])


@lru_cache(maxsize=16 * 720 + 24)
def gate_tableau(gate_class: int, frame: int, sites: int) -> Any:
    """The gate of a class whose images have positive signs, followed by the Pauli frame, as `stim.Tableau`."""
    images = (GATE_CLASSES if sites == 2 else ONE_SITE_CLASSES)[gate_class].astype(bool)
    strings = [stim.PauliString.from_numpy(xs=image[0::2].copy(), zs=image[1::2].copy()) for image in images]
    gate = stim.Tableau.from_conjugated_generators(xs=strings[0::2], zs=strings[1::2])
    return gate.then(stim.PauliString(letters_of(frame, sites)).to_tableau())
