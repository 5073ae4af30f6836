"""Measured times of the evolution by kind of work: nanoseconds per site and layer, by size and rate."""

import math
from bisect import bisect_right
from collections.abc import Mapping, Sequence
from functools import lru_cache
from typing import Final, NamedTuple


class Table(NamedTuple):
    """Rows of times by number of sites, columns by rate."""

    rates: tuple[float, ...]
    rows: Mapping[int, tuple[float, ...]]


def nanoseconds(kind: str, sites: int, rate: float) -> float:
    """Time per site and layer: logarithms are interpolated, and continued beyond the largest size."""
    rates, row = _row(kind, sites)
    left, share = _between(rates, min(math.log(max(rate, 0.0) + SOFT), rates[-1]))
    return math.exp((1 - share) * row[left] + share * row[left + 1])


@lru_cache(maxsize=4096)
def _row(kind: str, sites: int) -> tuple[tuple[float, ...], tuple[float, ...]]:
    """Logarithms of the rates of a table, and of its times at so many sites."""
    table = TABLES[kind]
    sizes = sorted(table.rows)
    low, part = _between([math.log(size) for size in sizes], math.log(sites))
    pairs = zip(table.rows[sizes[low]], table.rows[sizes[low + 1]], strict=True)
    times = tuple((1 - part) * math.log(one) + part * math.log(other) for one, other in pairs)
    return tuple(math.log(rate + SOFT) for rate in table.rates), times


SOFT: Final = 0.03
"""Rates far below it cost as little as none."""


def _between(known: Sequence[float], value: float) -> tuple[int, float]:
    """Position of a value among ascending ones: the interval, and how far into it; sizes go beyond the last one."""
    low = min(max(bisect_right(known, value) - 1, 0), len(known) - 2)
    return low, max((value - known[low]) / (known[low + 1] - known[low]), 0.0)


# On one core of a server processor that had other work besides; rows for 1024 sites and more by growth.
TABLES: Final[Mapping[str, Table]] = {
    "local": Table(
        (0.02, 0.08, 0.16, 0.3, 0.6),
        {
            8: (9.0, 12.0, 17.5, 20.0, 27.0),
            16: (6.7, 12.1, 16.1, 19.3, 23.7),
            32: (6.7, 9.6, 12.6, 18.2, 25.6),
            64: (6.6, 9.7, 13.5, 15.8, 24.8),
            128: (8.4, 13.1, 16.5, 21.3, 33.7),
            256: (7.7, 11.1, 21.3, 28.6, 32.3),
            512: (9.8, 17.3, 21.3, 23.8, 33.8),
            1024: (17.2, 28.4, 35.5, 29.2, 41.5),
            2048: (27.8, 41.4, 43.4, 30.4, 43.2),
            4096: (92.3, 92.7, 61.0, 36.3, 51.6),
        },
    ),
    "channels": Table(
        (0.02, 0.08, 0.16, 0.3, 0.6),
        {
            8: (11.0, 15.0, 19.0, 24.0, 28.0),
            16: (6.8, 13.0, 18.5, 25.5, 32.0),
            32: (7.5, 11.2, 16.6, 21.8, 31.4),
            64: (6.4, 12.7, 14.3, 21.1, 31.6),
            128: (9.6, 12.9, 19.0, 22.4, 32.5),
            256: (9.5, 16.7, 24.3, 22.1, 34.3),
            512: (10.3, 18.2, 22.4, 25.0, 35.5),
            1024: (18.1, 29.8, 37.3, 30.7, 43.6),
            2048: (29.2, 43.5, 45.6, 31.9, 45.4),
            4096: (96.9, 97.3, 64.0, 38.1, 54.2),
        },
    ),
    "spread": Table(
        (0.02, 0.08, 0.16, 0.3, 0.6),
        {
            8: (44.5, 43.5, 43.3, 67.3, 73.6),
            16: (38.0, 32.7, 47.8, 57.5, 72.4),
            32: (32.1, 38.8, 46.9, 53.7, 74.2),
            64: (33.4, 46.2, 41.5, 60.4, 69.2),
            128: (37.5, 50.2, 63.5, 74.1, 91.5),
            256: (51.0, 67.4, 78.7, 117.3, 132.3),
            512: (77.4, 158.2, 202.6, 266.3, 327.9),
        },
    ),
    "lattice": Table(
        (0.02, 0.08, 0.16, 0.3, 0.6),
        {
            16: (19.3, 22.9, 28.9, 38.6, 51.6),
            64: (18.6, 18.4, 26.1, 42.1, 49.6),
            144: (32.8, 39.4, 52.9, 62.7, 65.1),
            256: (34.7, 43.8, 50.0, 61.0, 59.3),
            576: (98.7, 145.8, 183.2, 150.1, 157.2),
            1024: (217.1, 320.8, 403.0, 330.2, 345.8),
        },
    ),
    "clusters": Table(
        (0.1, 0.3, 0.5, 0.7, 0.9),
        {
            8: (23.2, 28.3, 29.4, 21.9, 27.6),
            32: (16.4, 16.1, 15.9, 16.7, 15.9),
            128: (14.3, 12.3, 13.3, 14.0, 13.8),
            1024: (8.8, 10.1, 9.9, 11.7, 12.1),
            8192: (9.9, 9.5, 10.1, 10.9, 10.8),
        },
    ),
}
