"""Rows of operations written by hand, and random ones of every kind."""

import random
from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from sweepmill_worker.program import operations as op

KIND = 96


def row(
    code: int, sites: Sequence[int], gate: int = 0, frame: int = 0, letters: str = "", flags: int = 0, place: int = 0
) -> list[int]:
    """One row; `letters` as a Pauli string; sites of a swap: the site, then the reference qubit."""
    digits = sum("IXYZ".index(letter) * 4**i for i, letter in enumerate(reversed(letters)))
    padded = [*sites, *[-1] * (op.WIDEST - len(sites))]
    return [code, 1 if code == op.SWAP_IN else len(sites), *padded, gate, frame, digits, flags, KIND, place]


def table(rows: Sequence[list[int]]) -> NDArray[np.int32]:
    """int32[n, 12]."""
    return np.array(rows, dtype=np.int32).reshape(-1, op.COLUMNS)


def random_layer(
    draw: random.Random, sites: int, count: int, forced: bool = True, mixing: bool = True
) -> NDArray[np.int32]:
    """`count` operations of all kinds but references."""
    codes = [op.GATE] * 6 + [op.MEASURE] * 5 + ([op.DEPOLARISE, op.RESET] if mixing else [])
    flags = [op.RECORDED] * 2 + ([op.FORCED | op.RECORDED] if forced else []) + ([0] if mixing else [])
    return table([_random_row(draw, sites, draw.choice(codes), flags, i) for i in range(count)])


def _random_row(draw: random.Random, sites: int, code: int, flags: Sequence[int], place: int) -> list[int]:
    widest = {op.GATE: 2, op.MEASURE: op.WIDEST, op.DEPOLARISE: 1, op.RESET: 1}[code]
    width = draw.randint(1, min(widest, sites))
    where = draw.sample(range(sites), width)
    if code == op.GATE:
        return row(code, where, draw.randrange(720 if width == 2 else 6), draw.randrange(4**width))
    if code == op.MEASURE:
        return row(
            code, where, letters="".join(draw.choices("XYZ", k=width)), flags=draw.choice(list(flags)), place=place
        )
    return row(code, where)
