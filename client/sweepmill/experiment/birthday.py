"""How many repetitions until two of them have the same record: the birthday problem over equally probable records."""

from functools import lru_cache

import numpy as np

from sweepmill.analysis.arrays import Vector

EXACT_UP_TO = 16
"""Bits of a record up to which the sum is done term by term."""


@lru_cache(maxsize=64)
def exact(records: int) -> float:
    """Expected draws until the first repeated one among so many equally probable records, the repeated one included.

    1 + Q(n), Q(n) = sum over k = 1 .. n of n! / ((n - k)! n^k): the expectation sums the chances that k draws differ
    (The Art of Computer Programming, volume 1, section 1.2.11.3, from memory). Raises ValueError below one record.
    """
    if records < 1:
        raise ValueError(f"there is at least one record, got {records}")
    # terms beyond nine widths of the distribution are below 1e-17
    last = min(records, 9 * int(records**0.5) + 9)
    chances = np.cumprod(1.0 - np.arange(last) / records)
    return float(1.0 + chances.sum())


def log2_until_repeated(bits: Vector) -> Vector:
    """log2 of the expected repetitions until any record occurs twice, among 2^bits equally probable ones.

    Exact for integers up to `EXACT_UP_TO`; beyond, 1 + Q(n) by its asymptotic series sqrt(pi n / 2) - 1/3 +
    sqrt(pi / (288 n)), whose next term is 4 / (135 n).
    """
    return np.array([_log2_one(float(one)) for one in np.atleast_1d(bits)])


def _log2_one(bits: float) -> float:
    if bits <= EXACT_UP_TO and bits == int(bits):
        return float(np.log2(exact(2 ** int(bits))))
    if bits > 100:  # the corrections to the leading term are below one part in 2^50
        return float(bits / 2 + 0.5 * np.log2(np.pi / 2))
    return float(np.log2(asymptotic(2.0**bits)))


def asymptotic(records: float) -> float:
    """The first terms of 1 + Q(n) for many records."""
    return float(1 + (np.pi * records / 2) ** 0.5 - 1 / 3 + (np.pi / (288 * records)) ** 0.5)
