"""Where a step acts: the field ``on`` as written."""

from collections.abc import Mapping
from typing import Annotated, Any, Literal

from pydantic import BaseModel, BeforeValidator, Discriminator, Field, Tag

from sweepmill.axes import MOST_PER_SITE, Integer, Number
from sweepmill.language.numbers import Part, Value
from sweepmill.language.refusal import keys_of, near, refuse, shown
from sweepmill.language.tags import COUNT, PLACES, WORD

WIDEST_PLACE = 4
MOST_RANDOM_PLACES = 1_000_000
WORDS = {"sites": 1, "bonds": 2, "bonds-from-0": 2, "bonds-from-1": 2}
"""Named sets of places with the sites of a place."""


class CountPerSite(Part):
    """A number of places proportional to the number of sites."""

    per_site: Annotated[Number, Field(gt=0, le=MOST_PER_SITE)]


def _count_tag(value: Any) -> str:
    if isinstance(value, str):
        return COUNT["word"]
    return COUNT["per_site"] if isinstance(value, Mapping | BaseModel) else COUNT["number"]


_Fixed = Annotated[Integer, Field(ge=1, le=MOST_RANDOM_PLACES)]
Count = Annotated[
    Annotated[_Fixed, Tag(COUNT["number"])] | Annotated[CountPerSite, Tag(COUNT["per_site"])],
    Discriminator(_count_tag),
]
CountOrAll = Annotated[
    Annotated[Literal["all"], Tag(COUNT["word"])]
    | Annotated[_Fixed, Tag(COUNT["number"])]
    | Annotated[CountPerSite, Tag(COUNT["per_site"])],
    Discriminator(_count_tag),
]


class BlockRule(Part):
    """``width`` consecutive sites starting at ``first``, ``first`` + ``every``, …"""

    width: Annotated[Integer, Field(ge=1, le=WIDEST_PLACE)]
    first: Annotated[Integer, Field(ge=0)] = Field(0, alias="from")
    every: Annotated[Integer, Field(ge=1)] = 1


class SublatticeRule(Part):
    """Single sites ``first``, ``first`` + ``every``, …"""

    first: Annotated[Integer, Field(ge=0)] = Field(0, alias="from")
    every: Annotated[Integer, Field(ge=1)]


class PairsRule(Part):
    """Disjoint random pairs; a partner at (ring) distance r has weight r^-exponent."""

    count: CountOrAll = "all"
    exponent: Value = 0


class SequentialRule(Part):
    """Random sites or bonds one after another, with replacement."""

    count: Count
    of: Literal["sites", "bonds"]


class Blocks(Part):
    """Contiguous blocks; on a ring they wrap around."""

    blocks: BlockRule


class Sublattice(Part):
    """Every so many sites."""

    sublattice: SublatticeRule


def _rows(value: Any) -> Any:
    return tuple(tuple(row) if isinstance(row, list) else row for row in value) if isinstance(value, list) else value


class Places(Part):
    """Listed places, handled in this order."""

    places: Annotated[tuple[tuple[Annotated[Integer, Field(ge=0)], ...], ...], BeforeValidator(_rows)]


class RandomPairs(Part):
    """New random pairs in every layer."""

    random_pairs: PairsRule


class RandomSequential(Part):
    """New random places in every layer."""

    random_sequential: SequentialRule


def _known_form(value: Any) -> Any:
    """One spelling of words and of the names of forms; refuse what is neither."""
    if isinstance(value, str):
        word = value.strip().lower().replace("_", "-")
        if word not in WORDS:
            refuse(f"unknown places {shown(value)}{near(word, WORDS)} ({_forms()})")
        return word
    if isinstance(value, BaseModel):
        return value
    if not isinstance(value, Mapping):
        refuse(f"must say where, got {shown(value)} ({_forms()})")
    table = {str(name).replace("-", "_"): inner for name, inner in value.items()}
    if len(table.keys() & PLACES.keys()) != 1:
        if several := [name for name in table if name in PLACES]:
            refuse(f"exactly one form is allowed, got {' and '.join(several)}")
        missed = next((near(name, PLACES) for name in table if near(name, PLACES)), "")
        refuse(f"must have exactly one form, got {shown(value)}{missed} ({_forms()})")
    return table


def _forms() -> str:
    return f"words: {', '.join(WORDS)}; forms: {', '.join(PLACES)}"


def _on_tag(value: Any) -> str:
    return next((tag for name, tag in PLACES.items() if name in keys_of(value)), WORD)


On = Annotated[
    Annotated[Literal["sites", "bonds", "bonds-from-0", "bonds-from-1"], Tag(WORD)]
    | Annotated[Blocks, Tag(PLACES["blocks"])]
    | Annotated[Sublattice, Tag(PLACES["sublattice"])]
    | Annotated[Places, Tag(PLACES["places"])]
    | Annotated[RandomPairs, Tag(PLACES["random_pairs"])]
    | Annotated[RandomSequential, Tag(PLACES["random_sequential"])],
    Discriminator(_on_tag),
    BeforeValidator(_known_form),
]


def place_width(on: Any) -> int | None:
    """Sites of a place; None for listed places that are none, or not all of one width."""
    match on:
        case str():
            return WORDS[on]
        case Blocks():
            return int(on.blocks.width)
        case Places():
            widths = {len(place) for place in on.places}
            return widths.pop() if len(widths) == 1 else None
        case RandomSequential():
            return WORDS[on.random_sequential.of]
        case RandomPairs():
            return 2
    return 1


def is_random(on: Any) -> bool:
    """Whether the places themselves are drawn."""
    return isinstance(on, RandomPairs | RandomSequential)
