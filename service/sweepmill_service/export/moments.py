"""Moments of thousands of stored totals at once, equal to the last bit to those of `sweepmill.statistics`.

Totals of one shape are read as one array. Where an intermediate integer could leave the range in which a double is
exact, or the coordinate is a ratio, the general code takes over.
"""

import struct
from collections import defaultdict
from collections.abc import Sequence
from functools import lru_cache
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from sweepmill.accumulate import Accumulator
from sweepmill.coordinates import Coordinate
from sweepmill.statistics import summarize

_HEAD = struct.Struct("<4sqiiiii")
_NARROW = 8  # bytes of a number; totals of wider ones are rare
_EXACT = 2.0**53  # doubles are exact integers below

Places = tuple[Coordinate, ...]
Moments = NDArray[np.float64]  # [C, 5]: mean, standard error, variance, minimum, maximum


class _Shape(NamedTuple):
    """Coordinates, components, folds and rows of the tally of a total."""

    coordinates: int
    components: int
    folds: int
    entries: int


def moments_of(totals: Sequence[tuple[bytes, Places]]) -> list[Moments]:
    """Moments of each total, nan where a number is undefined."""
    groups: dict[tuple[tuple[int, ...], int], list[int]] = defaultdict(list)
    for index, (data, places) in enumerate(totals):
        groups[_HEAD.unpack_from(data)[2:6], id(places)].append(index)
    found: list[Any] = [None] * len(totals)
    for (shape, _), members in groups.items():
        places = totals[members[0]][1]
        together = _together(_Shape(*shape), places, [totals[index][0] for index in members])
        for index, moments in zip(members, together, strict=True):
            found[index] = _alone(*totals[index]) if moments is None else moments
    return found


def _alone(data: bytes, places: Places) -> Moments:
    rows = summarize(Accumulator.from_bytes(data), places)
    return np.array([(m.mean, m.standard_error, m.variance, m.minimum, m.maximum) for m in rows])


def _together(shape: _Shape, places: Places, blobs: list[bytes]) -> list[Moments | None]:
    """Moments of totals of one shape; None for those the general code must take."""
    if shape.components != 1:
        return [None] * len(blobs)
    record, widths = _record(shape)
    end = _HEAD.size + record.itemsize
    narrow = [len(data) >= end and all(data[offset] == _NARROW for offset in widths) for data in blobs]
    fitting = [data[:end] for data, fits in zip(blobs, narrow, strict=True) if fits]
    body = np.frombuffer(b"".join(data[_HEAD.size :] for data in fitting), record)
    count = np.array([_HEAD.unpack_from(data)[1] for data in fitting], dtype=np.float64)[:, None]
    scale = np.array([place.scale for place in places], dtype=np.float64)
    varied = np.unpackbits(body["varied"], axis=1, count=shape.coordinates).astype(bool)
    moments, exact = _plain(count, body, scale, varied)
    computed = iter(zip(moments, exact, strict=True))
    return [_if_exact(*next(computed)) if fits else None for fits in narrow]


def _if_exact(moments: Moments, exact: np.bool_) -> Moments | None:
    return moments if exact else None


def _plain(count: Moments, body: Any, scale: Moments, varied: NDArray[np.bool_]) -> tuple[Moments, NDArray[np.bool_]]:
    """The formulas of `statistics`, whose integers must stay below 2^53 to be rounded alike."""
    total, squares = (body[name][:, :, 0].astype(np.float64) for name in ("sums", "products"))
    top, bottom = count * squares - total * total, count * (count - 1) * scale * scale
    exact = (np.maximum(count * squares, bottom) < _EXACT).all(axis=1)
    with np.errstate(divide="ignore", invalid="ignore"):
        variance = np.where(count > 1, top / bottom, np.nan)
        error = np.sqrt((variance + np.where(varied, 0.0, 1.0 / count)) / count)
    least, most = (body[name][:, :, 0] / scale for name in ("minimum", "maximum"))
    return np.stack([total / (count * scale), error, variance, least, most], axis=-1), exact


@lru_cache(maxsize=1024)
def _record(shape: _Shape) -> tuple[np.dtype[np.void], tuple[int, ...]]:
    """Where the arrays of a total lie (see `Accumulator.to_bytes`), and the bytes that give their widths."""
    coordinates, components, folds, entries = shape
    arrays = {
        "sums": (coordinates, components),
        "products": (coordinates, components * (components + 1) // 2),
        "minimum": (coordinates, components),
        "maximum": (coordinates, components),
        "fold_counts": (folds,),
        "fold_sums": (folds, coordinates, components),
        "rows": (entries, components + 2),
    }
    fields: list[tuple[str, str, tuple[int, ...]]] = []
    for name, size in arrays.items():
        fields += [(f"{name}_width", "u1", ()), (name, "<i8", size)]
    record = np.dtype([*fields, ("varied", "u1", ((coordinates + 7) // 8,))])
    assert record.fields is not None
    return record, tuple(_HEAD.size + record.fields[f"{name}_width"][1] for name in arrays)
