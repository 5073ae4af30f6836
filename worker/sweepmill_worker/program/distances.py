"""Weights of the distance between the partners of a random pair, as integers."""

from fractions import Fraction
from typing import Final

import numpy as np
from numpy.typing import NDArray

from sweepmill.language.rates import LARGEST_EXPONENT
from sweepmill_worker.program.exact import power

CUMULATED_BITS: Final = 50
"""The weight of distance 1 in the cumulated table: all offsets of a chain of 4096 sites stay below 2**63."""
MANTISSA_BITS: Final = 32


def offsets(exponent: Fraction, sites: int, periodic: bool) -> NDArray[np.uint64]:
    """uint64[2 * sites]: cumulated weights of partner = site + offset.

    On a ring entry i is offset i + 1; on an open line offset i - (sites - 1).  Entries beyond the last offset repeat
    the total.
    """
    if periodic:
        distances = [min(offset, sites - offset) for offset in range(1, sites)]
    else:
        distances = [abs(offset) for offset in range(1 - sites, sites)]
    weights = [_weight(distance, exponent, CUMULATED_BITS) if distance else 0 for distance in distances]
    return np.cumsum(np.array(weights + [0] * (2 * sites - len(weights)), dtype=np.uint64))


def scaled(exponent: Fraction, sites: int) -> tuple[NDArray[np.uint64], NDArray[np.int64]]:
    """uint64[sites] mantissas of 32 bits and int64[sites] shifts: weight = mantissa / 2**shift; entry 0 is unused.

    Raises ValueError for an exponent whose weights are beyond decimal arithmetic.
    """
    if not 0 <= exponent <= LARGEST_EXPONENT:
        raise ValueError(f"random_pairs: exponents are 0 to {LARGEST_EXPONENT}, got {float(exponent):g}")
    mantissas, shifts = np.zeros(sites, np.uint64), np.zeros(sites, np.int64)
    for distance in range(1, sites):
        value = power(Fraction(distance), -exponent)
        shift = MANTISSA_BITS + value.denominator.bit_length() - value.numerator.bit_length()
        if value * Fraction(2) ** shift >= 2**MANTISSA_BITS:
            shift -= 1
        mantissas[distance] = int(value * Fraction(2) ** shift)
        shifts[distance] = shift
    return mantissas, shifts


def _weight(distance: int, exponent: Fraction, bits: int) -> int:
    return int(power(Fraction(distance), -exponent) * 2**bits)
