"""Where a step acts: its places in order, or the law by which they are drawn."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from fractions import Fraction
from functools import lru_cache
from typing import Any

from sweepmill_worker.program.exact import exact
from sweepmill_worker.program.operations import WIDEST
from sweepmill_worker.program.tables import NO_STREAM, PAIRS, SEQUENCE

Places = tuple[tuple[int, ...], ...]


@dataclass(frozen=True)
class Where:
    """`count` places of `width` sites: those of `fixed`, or drawn."""

    width: int
    count: int
    fixed: Places = ()
    stream: int = NO_STREAM
    source: Places = ()
    """Sequence: the places it draws from."""
    exponent: Fraction = Fraction(0)
    """Pairs: the weight of distance r is r ** -exponent."""


def where(on: Any, sites: int, periodic: bool) -> Where:
    """Raises ValueError for what does not fit the chain."""
    return _named(on, sites, periodic) if isinstance(on, str) else _where(on, sites, periodic)


def _where(on: Any, sites: int, periodic: bool) -> Where:
    if isinstance(on, Mapping) and "random_pairs" in on:
        return _pairs(on["random_pairs"], sites)
    if isinstance(on, Mapping) and "random_sequential" in on:
        rule = on["random_sequential"]
        source = _fixed(rule["of"], sites, periodic)
        return Where(len(source[0]), int(rule["count"]), stream=SEQUENCE, source=source)
    places = _fixed(on, sites, periodic)
    _check(places, sites)
    return Where(len(places[0]) if places else 1, len(places), fixed=places)


_named = lru_cache(maxsize=64)(_where)
"""Thousands of layers may act on the same bonds."""


def _pairs(rule: Mapping[str, Any], sites: int) -> Where:
    count = sites // 2 if rule.get("count", "all") == "all" else int(rule["count"])
    if not 0 <= 2 * count <= sites:
        raise ValueError(f"random_pairs: {sites} sites make at most {sites // 2} pairs, got {count}")
    return Where(2, count, stream=PAIRS, exponent=exact(rule.get("exponent", 0)))


def _fixed(on: Any, sites: int, periodic: bool) -> Places:
    if isinstance(on, Mapping):
        return _listed(on, sites, periodic)
    match on:
        case "sites":
            return tuple((site,) for site in range(sites))
        case "bonds":
            return _bonds(range(sites if periodic else sites - 1), sites)
        case "bonds-from-0":
            return _bonds(range(0, sites - 1, 2), sites)
        case "bonds-from-1":
            if periodic and sites % 2:
                raise ValueError(f"bonds-from-1 on a ring needs an even number of sites, got {sites}")
            return _bonds(range(1, sites if periodic else sites - 1, 2), sites)
    raise ValueError(f"on: unknown places {on!r}")


def _bonds(lefts: Sequence[int], sites: int) -> Places:
    return tuple((left, (left + 1) % sites) for left in lefts)


def _listed(on: Mapping[str, Any], sites: int, periodic: bool) -> Places:
    if "places" in on:
        return tuple(tuple(int(site) for site in place) for place in on["places"])
    if "sublattice" in on:
        rule = on["sublattice"]
        return tuple((site,) for site in range(int(rule.get("from", 0)), sites, int(rule["every"])))
    if "blocks" in on:
        rule = on["blocks"]
        width = int(rule["width"])
        starts = range(int(rule.get("from", 0)), sites if periodic else sites - width + 1, int(rule.get("every", 1)))
        return tuple(tuple((start + i) % sites for i in range(width)) for start in starts)
    raise ValueError(f"on: unknown places {dict(on)!r}")


def _check(places: Places, sites: int) -> None:
    for place in places:
        if len(place) != len(places[0]) or len(set(place)) != len(place):
            raise ValueError(f"on: places have distinct sites, all the same number of them, got {place}")
        if not 1 <= len(place) <= WIDEST:
            raise ValueError(f"on: a place has 1 .. {WIDEST} sites, got {place}")
        if not all(0 <= site < sites for site in place):
            raise ValueError(f"on: sites are 0 .. {sites - 1}, got {place}")
