"""Places at one size of the chain: their normal form, and which sites they are.

Normal forms are plain data: a word, or a table with one member. Blocks that are the places of a word take the word.
"""

from collections.abc import Iterator, Mapping
from decimal import Decimal
from functools import lru_cache
from typing import Any

from sweepmill.errors import Fault
from sweepmill.language.places import (
    WORDS,
    Blocks,
    CountPerSite,
    Places,
    RandomPairs,
    RandomSequential,
    Sublattice,
)

SiteList = tuple[tuple[int, ...], ...]


def listed(form: Any, sites: int, periodic: bool) -> SiteList:
    """The places that a normal form stands for, in order; of random ones all that can be drawn.

    For random pairs these are single sites, because any two can be a pair.
    """
    if isinstance(form, str):
        return _word(form, sites, periodic)
    if "places" in form:
        return tuple(map(tuple, form["places"]))
    if "random_sequential" in form:
        return _word(form["random_sequential"]["of"], sites, periodic)
    if "random_pairs" in form:
        return _word("sites", sites, periodic)
    rule = form.get("blocks") or form["sublattice"]
    return _blocks(rule.get("width", 1), rule.get("from", 0), rule.get("every", 1), sites, periodic)


@lru_cache(maxsize=64)
def _word(word: str, sites: int, periodic: bool) -> SiteList:
    if word == "sites":
        return tuple((site,) for site in range(sites))
    first, every = (0, 1) if word == "bonds" else (int(word[-1]), 2)
    last = sites if periodic and word != "bonds-from-0" else sites - 1
    return tuple((left, (left + 1) % sites) for left in range(first, last, every))


@lru_cache(maxsize=64)
def _blocks(width: int, first: int, every: int, sites: int, periodic: bool) -> SiteList:
    last = sites if periodic else sites - width + 1
    return tuple(tuple((start + i) % sites for i in range(width)) for start in range(first, last, every))


def place_faults(on: Any, path: str, sites: int, periodic: bool) -> Iterator[Fault]:
    """What is wrong with places on a chain of this size."""
    match on:
        case "bonds-from-1" if periodic and sites % 2:
            yield Fault(path, f"on a ring bonds-from-1 needs an even number of sites, got {sites}")
        case Places():
            for index, place in enumerate(on.places):
                if place and max(place) >= sites:
                    yield Fault(f"{path}.places[{index}]", _outside(max(place), sites))
        case Blocks():
            yield from _block_faults(on, f"{path}.blocks", sites)
        case Sublattice() if on.sublattice.first >= sites:
            yield Fault(f"{path}.sublattice.from", _outside(on.sublattice.first, sites))
        case RandomPairs():
            yield from _pair_faults(on, f"{path}.random_pairs.count", sites)
        case RandomSequential() if isinstance(on.random_sequential.count, CountPerSite):
            yield from _count_faults(on.random_sequential.count, f"{path}.random_sequential.count", sites)


def _outside(site: int, sites: int) -> str:
    return f"site {site} is outside a chain of {sites} sites (0 to {sites - 1})"


def _block_faults(on: Blocks, path: str, sites: int) -> Iterator[Fault]:
    if on.blocks.width > sites:
        yield Fault(f"{path}.width", f"a block of {on.blocks.width} sites does not fit on {sites}")
    if on.blocks.first >= sites:
        yield Fault(f"{path}.from", _outside(on.blocks.first, sites))


def _pair_faults(on: RandomPairs, path: str, sites: int) -> Iterator[Fault]:
    count = on.random_pairs.count
    if count == "all":
        if sites % 2:
            yield Fault(path, f"pairs of all sites need an even number of them, got {sites}: give a count")
        return
    yield from _count_faults(count, path, sites)
    number = resolved_count(count, sites)
    if number is not None and number > sites // 2:
        yield Fault(path, f"{sites} sites have at most {sites // 2} disjoint pairs, got {number}")


def _count_faults(count: Any, path: str, sites: int) -> Iterator[Fault]:
    if resolved_count(count, sites) is None:
        exact = Decimal(repr(count.per_site)) * sites
        yield Fault(path, f"per_site = {count.per_site:g} gives {exact} at {sites} sites: must be a positive integer")


def resolved_count(count: Any, sites: int) -> int | None:
    """A number of places; None where ``per_site`` does not give a positive integer."""
    if not isinstance(count, CountPerSite):
        return int(count)
    exact = Decimal(repr(count.per_site)) * sites
    return int(exact) if exact % 1 == 0 and exact >= 1 else None


def on_form(on: Any, sites: int, periodic: bool, exponent: float = 0) -> Any:
    """The normal form of places without faults; ``exponent`` is that of random pairs, its parameter resolved."""
    match on:
        case Places():
            return {"places": [list(place) for place in on.places]}
        case Blocks():
            rule = on.blocks
            return _folded(int(rule.width), int(rule.first), int(rule.every), sites, periodic)
        case Sublattice():
            return _folded(1, int(on.sublattice.first), int(on.sublattice.every), sites, periodic)
        case RandomPairs():
            return {"random_pairs": _pairs_form(on, sites, exponent)}
        case RandomSequential():
            drawn = on.random_sequential
            return {"random_sequential": {"count": resolved_count(drawn.count, sites), "of": drawn.of}}
    return on


def word_of(on: Blocks | Sublattice) -> str | None:
    """The word that means the same at every size, if there is one."""
    rule = on.blocks if isinstance(on, Blocks) else on.sublattice
    width = on.blocks.width if isinstance(on, Blocks) else 1
    return {1: "sites", 2: "bonds"}.get(int(width)) if (rule.first, rule.every) == (0, 1) else None


def _folded(width: int, first: int, every: int, sites: int, periodic: bool) -> Any:
    wanted = _blocks(width, first, every, sites, periodic)
    odd_ring = periodic and sites % 2
    for word, size in WORDS.items():
        if size == width and _word(word, sites, periodic) == wanted and not (word == "bonds-from-1" and odd_ring):
            return word
    start: dict[str, int] = {"from": first} if first else {}
    if width == 1:
        return {"sublattice": start | {"every": every}}
    return {"blocks": {"width": width} | start | ({"every": every} if every > 1 else {})}


def _pairs_form(on: RandomPairs, sites: int, exponent: float) -> dict[str, Any]:
    count = on.random_pairs.count
    number = "all" if count == "all" else resolved_count(count, sites)
    form: dict[str, Any] = {} if number in ("all", sites / 2) else {"count": number}
    return form | ({"exponent": exponent} if exponent else {})


def number_of_places(form: Any, sites: int, periodic: bool) -> int:
    """How many places a layer handles."""
    if isinstance(form, Mapping) and "random_sequential" in form:
        return int(form["random_sequential"]["count"])
    if isinstance(form, Mapping) and "random_pairs" in form:
        count = form["random_pairs"].get("count", "all")
        return sites // 2 if count == "all" else int(count)
    return len(listed(form, sites, periodic))
