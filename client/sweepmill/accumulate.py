"""Exact accumulators: everything a table needs of a set of trajectories, in integers, mergeable in any order."""

import hashlib
import struct
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np
from numpy.typing import NDArray

from sweepmill.counts import Rows, Tally, histogram_of, merge_rows, tally_of
from sweepmill.errors import AccumulatorMismatch
from sweepmill.exact import IntArray, add, array_from_bytes, array_to_bytes, narrow, sum_first, sum_products

MANY_FOLDS, FEW_FOLDS, FEW_FOLDS_ABOVE = 64, 16, 256
_MAGIC = b"SMA1"
_HEAD = struct.Struct("<4sqiiiii")


def folds_for(coordinates: int) -> int:
    """Number of folds kept: 64 up to 256 coordinates, else 16."""
    return MANY_FOLDS if coordinates <= FEW_FOLDS_ABOVE else FEW_FOLDS


@dataclass(frozen=True, eq=False)
class Accumulator:
    """Sums over trajectories of C coordinates with K components each (K = 2: numerator and denominator).

    Shapes: ``sums``, ``minimum``, ``maximum`` [C, K]; ``products`` [C, P] with P = K(K+1)/2 (squares, or nn, nd, dd);
    ``fold_counts`` [F]; ``fold_sums`` [F, C, K], fold = k mod F; ``histogram`` rows [H, 2 + F] or None.
    Values are raw integers: what a coordinate's ``scale`` divides.
    """

    count: int
    sums: IntArray
    products: IntArray
    minimum: NDArray[np.int64]
    maximum: NDArray[np.int64]
    fold_counts: NDArray[np.int64]
    fold_sums: IntArray
    tally: Tally
    histogram: Rows | None = None

    @classmethod
    def from_values(
        cls, values: NDArray[np.int64], first: int, readings: NDArray[np.int64] | None = None
    ) -> "Accumulator":
        """Accumulate ``values`` [n, C] or [n, C, 2] of trajectories first, first + 1, …

        ``readings`` [n, C, m] are the single integers whose histogram is kept.
        """
        values = np.asarray(values, dtype=np.int64)
        values = values[:, :, None] if values.ndim == 2 else values
        count, coordinates, components = values.shape
        if count == 0:
            raise ValueError("an accumulator needs at least one trajectory")
        pairs = [(i, j) for i in range(components) for j in range(i, components)]
        products = [sum_products(values[..., i], values[..., j]) for i, j in pairs]
        fold_count = folds_for(coordinates)
        folds = (first + np.arange(count, dtype=np.int64)) % fold_count
        return cls(
            count=count,
            sums=sum_first(values),
            products=narrow(np.stack([p.astype(object) for p in products], axis=1)),
            minimum=values.min(axis=0),
            maximum=values.max(axis=0),
            fold_counts=np.bincount(folds, minlength=fold_count).astype(np.int64),
            fold_sums=_fold_sums(values, folds, fold_count),
            tally=tally_of(values),
            histogram=None if readings is None else histogram_of(readings, folds, fold_count),
        )

    @property
    def coordinates(self) -> int:
        """Number of coordinates C."""
        return int(self.sums.shape[0])

    @property
    def components(self) -> int:
        """Number of components K: 1, or 2 for a ratio."""
        return int(self.sums.shape[1])

    def merge(self, other: "Accumulator") -> "Accumulator":
        """The accumulator of both sets of trajectories. Raises AccumulatorMismatch for another shape."""
        if self.sums.shape != other.sums.shape or (self.histogram is None) != (other.histogram is None):
            raise AccumulatorMismatch(f"cannot merge accumulators of shapes {self.sums.shape} and {other.sums.shape}")
        histogram = None
        if self.histogram is not None and other.histogram is not None:
            histogram = merge_rows(np.vstack([self.histogram, other.histogram]), 2)
        return Accumulator(
            count=self.count + other.count,
            sums=add(self.sums, other.sums),
            products=add(self.products, other.products),
            minimum=np.minimum(self.minimum, other.minimum),
            maximum=np.maximum(self.maximum, other.maximum),
            fold_counts=self.fold_counts + other.fold_counts,
            fold_sums=add(self.fold_sums, other.fold_sums),
            tally=self.tally.merge(other.tally),
            histogram=histogram,
        )

    def to_bytes(self) -> bytes:
        """Canonical bytes: equal for equal content on every machine."""
        rows = self.tally.rows
        bins = -1 if self.histogram is None else len(self.histogram)
        sizes = (self.coordinates, self.components, len(self.fold_counts), len(rows), bins)
        parts = [_HEAD.pack(_MAGIC, self.count, *sizes)]
        arrays = [
            self.sums,
            self.products,
            self.minimum,
            self.maximum,
            self.fold_counts,
            self.fold_sums,
            rows,
        ]
        parts += [array_to_bytes(array) for array in arrays]
        parts.append(np.packbits(self.tally.varied).tobytes())
        if self.histogram is not None:
            parts.append(array_to_bytes(self.histogram))
        return b"".join(parts)

    @classmethod
    def from_bytes(cls, data: bytes) -> "Accumulator":
        """The inverse of :meth:`to_bytes`. Raises ValueError for anything else."""
        magic, count, c, k, f, entries, bins = _HEAD.unpack_from(data)
        if magic != _MAGIC:
            raise ValueError("these bytes are not an accumulator of this format")
        shapes = [(c, k), (c, k * (k + 1) // 2), (c, k), (c, k), (f,), (f, c, k), (entries, k + 2)]
        arrays: list[Any] = []
        offset = _HEAD.size
        for shape in shapes:
            array, offset = array_from_bytes(data, offset, shape)
            arrays.append(array)
        packed = np.frombuffer(data, np.uint8, (c + 7) // 8, offset)
        varied = np.unpackbits(packed, count=c).astype(bool)
        histogram = None if bins < 0 else array_from_bytes(data, offset + len(packed), (bins, 2 + f))[0]
        sums, products, minimum, maximum, fold_counts, fold_sums, rows = arrays
        return cls(count, sums, products, minimum, maximum, fold_counts, fold_sums, Tally(varied, rows), histogram)

    @cached_property
    def digest(self) -> str:
        """SHA-256 of the canonical bytes, hexadecimal."""
        return hashlib.sha256(self.to_bytes()).hexdigest()

    @property
    def nbytes(self) -> int:
        """Size of the canonical bytes."""
        return len(self.to_bytes())

    def __eq__(self, other: object) -> bool:
        return isinstance(other, Accumulator) and self.to_bytes() == other.to_bytes()

    __hash__ = None  # type: ignore[assignment]


def merged(parts: "list[Accumulator]") -> Accumulator:
    """All parts together. Raises ValueError for none."""
    if not parts:
        raise ValueError("nothing to merge")
    total = parts[0]
    for part in parts[1:]:
        total = total.merge(part)
    return total


def _fold_sums(values: NDArray[np.int64], folds: NDArray[np.int64], fold_count: int) -> IntArray:
    sums = np.zeros((fold_count, *values.shape[1:]), dtype=object)
    for fold in np.unique(folds):
        sums[fold] = sum_first(values[folds == fold])
    return narrow(sums)
