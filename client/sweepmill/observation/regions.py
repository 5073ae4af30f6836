"""Regions of a chain as fields of observations: named or listed, their labels and what can be wrong with them."""

from typing import Annotated, Any, Literal

from pydantic import AfterValidator, BeforeValidator, Discriminator, Field, Tag

from sweepmill.axes import Integer, nonempty
from sweepmill.ensemble import Ensemble
from sweepmill.times import as_tuple, distinct_sorted

Sites = Annotated[
    tuple[Annotated[Integer, Field(ge=0)], ...],
    BeforeValidator(as_tuple),
    AfterValidator(nonempty),
    AfterValidator(distinct_sorted),
]


def _in_order(regions: Any) -> Any:
    """I(A:B) and I3 do not depend on the order of their regions: one spelling, one key."""
    return tuple(sorted(regions))


def word_or_sites(value: Any) -> str:
    """Whether a region is named or listed: the tag of the union member that parses it."""
    return "region-word" if isinstance(value, str) else "region-sites"


REGION_TAGS = frozenset({"region-word", "region-sites"})
Two = Annotated[tuple[Sites, Sites], BeforeValidator(as_tuple), AfterValidator(_in_order)]
Three = Annotated[tuple[Sites, Sites, Sites], BeforeValidator(as_tuple), AfterValidator(_in_order)]
HalfOrSites = Annotated[
    Annotated[Literal["half"], Tag("region-word")] | Annotated[Sites, Tag("region-sites")],
    Discriminator(word_or_sites),
]
CutOrSites = Annotated[
    Annotated[Literal["half", "every-cut"], Tag("region-word")] | Annotated[Sites, Tag("region-sites")],
    Discriminator(word_or_sites),
]
CutIntervalOrSites = Annotated[
    Annotated[Literal["half", "every-cut", "every-interval"], Tag("region-word")]
    | Annotated[Sites, Tag("region-sites")],
    Discriminator(word_or_sites),
]
AntipodalOrTwo = Annotated[
    Annotated[Literal["antipodal"], Tag("region-word")] | Annotated[Two, Tag("region-sites")],
    Discriminator(word_or_sites),
]
QuartersOrThree = Annotated[
    Annotated[Literal["quarters"], Tag("region-word")] | Annotated[Three, Tag("region-sites")],
    Discriminator(word_or_sites),
]

Fault = tuple[str, str]
"""Field and message."""
NOT_DISJOINT = "the regions must be disjoint"


def region_label(region: str | tuple[int, ...]) -> str:
    """What a table says of a region."""
    return region if isinstance(region, str) else sites_label(region)


def sites_label(region: tuple[int, ...]) -> str:
    """A site list in short: ``0-3,7``."""
    parts: list[list[int]] = []
    for site in region:
        if parts and parts[-1][-1] == site - 1:
            parts[-1][1:] = [site]
        else:
            parts.append([site])
    return ",".join("-".join(map(str, part)) for part in parts)


def outside(region: tuple[int, ...], sites: int) -> str | None:
    """What is wrong with an ascending site list on a chain of ``sites`` sites."""
    if region[-1] >= sites:
        return f"site {region[-1]} is outside a chain of {sites} sites (0 to {sites - 1})"
    return None


def region_fault(region: str | tuple[int, ...], ensemble: Ensemble) -> Fault | None:
    """The fault of a field ``region``."""
    message = outside(region, ensemble.sites) if isinstance(region, tuple) else None
    return ("region", message) if message else None


def regions_fault(regions: tuple[tuple[int, ...], ...], ensemble: Ensemble) -> Fault | None:
    """The fault of a field ``regions``: several disjoint ones."""
    for index, region in enumerate(regions):
        if message := outside(region, ensemble.sites):
            return f"regions[{index}]", message
    if len({site for region in regions for site in region}) < sum(map(len, regions)):
        return "regions", NOT_DISJOINT
    return None
