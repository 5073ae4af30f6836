"""Exact integer arrays: int64 where everything fits, Python integers beyond, at most 127 bits."""

import math
from typing import Any

import numpy as np
from numpy.typing import NDArray

from sweepmill.errors import AccumulatorOverflow

IntArray = NDArray[Any]  # int64, or object holding Python integers

_INT64_LIMIT = 2**63
_WIDE_LIMIT = 2**127


def narrow(array: IntArray) -> IntArray:
    """The same numbers as int64 if they fit, else as Python integers. Raises AccumulatorOverflow beyond 127 bits."""
    if array.dtype != object:
        return array.astype(np.int64, copy=False)
    least, most = min(array.flat, default=0), max(array.flat, default=0)
    if least >= -_INT64_LIMIT and most < _INT64_LIMIT:
        return array.astype(np.int64)
    if least < -_WIDE_LIMIT or most >= _WIDE_LIMIT:
        raise AccumulatorOverflow("a sum needs more than 127 bits")
    return array


def add(a: IntArray, b: IntArray) -> IntArray:
    """a + b without wrap-around."""
    if a.dtype == object or b.dtype == object:
        return narrow(a.astype(object) + b.astype(object))
    total = a + b
    # two's complement: the sum wrapped exactly where both terms differ from it in sign
    if bool((((a ^ total) & (b ^ total)) < 0).any()):
        return narrow(a.astype(object) + b.astype(object))
    return total


def sum_products(a: NDArray[np.int64], b: NDArray[np.int64]) -> IntArray:
    """Sum of a·b over the first axis, exact."""
    bound = _largest(a) * _largest(b) * len(a)
    if bound < _INT64_LIMIT:
        return np.asarray((a * b).sum(axis=0))
    return narrow(np.asarray((a.astype(object) * b.astype(object)).sum(axis=0)))


def sum_first(a: NDArray[np.int64]) -> IntArray:
    """Sum over the first axis, exact."""
    if _largest(a) * len(a) < _INT64_LIMIT:
        return np.asarray(a.sum(axis=0))
    return narrow(np.asarray(a.astype(object).sum(axis=0)))


def _largest(a: NDArray[np.int64]) -> int:
    return max(abs(int(a.max())), abs(int(a.min()))) if a.size else 0


def array_to_bytes(array: IntArray) -> bytes:
    """Width in bytes (8 or 16), then little-endian two's complement: one spelling for equal numbers."""
    if array.dtype != object:
        return b"\x08" + np.ascontiguousarray(array, dtype="<i8").tobytes()
    return b"\x10" + b"".join(int(value).to_bytes(16, "little", signed=True) for value in array.flat)


def array_from_bytes(data: bytes, offset: int, shape: tuple[int, ...]) -> tuple[IntArray, int]:
    """The array stored at ``offset`` and the offset behind it."""
    size = math.prod(shape)
    width = data[offset]
    end = offset + 1 + width * size
    if width == 8:
        return np.frombuffer(data, "<i8", size, offset + 1).reshape(shape), end
    pieces = range(offset + 1, end, 16)
    values = [int.from_bytes(data[at : at + 16], "little", signed=True) for at in pieces]
    return np.array(values, dtype=object).reshape(shape), end
