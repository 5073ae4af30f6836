"""Observations: what is read off every trajectory. One model per quantity."""

from collections.abc import Mapping
from functools import cached_property
from typing import Annotated, Any, ClassVar, Literal

from pydantic import AfterValidator, BeforeValidator, Discriminator, Field, Tag, TypeAdapter

from sweepmill.axes import Integer, nonempty
from sweepmill.ensemble import Ensemble
from sweepmill.identity import key_of
from sweepmill.revisions import QUANTITY_REVISIONS
from sweepmill.times import At, Strict, as_tuple, distinct_sorted, readings

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
CutOrSites = Annotated[
    Annotated[Literal["half", "every-cut"], Tag("region-word")] | Annotated[Sites, Tag("region-sites")],
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


NAME_PATTERN = r"^[A-Za-z][A-Za-z0-9_.-]{0,63}$"


class _Observation(Strict):
    """Fields and identity common to all quantities."""

    quantity: str
    name: Annotated[str, Field(pattern=NAME_PATTERN)] | None = Field(None, exclude=True)
    at: At = "last-cell"

    COMPONENTS: ClassVar[int] = 1

    def normal_form(self) -> dict[str, Any]:
        """What the key is the hash of: fields that differ from their defaults, and the quantity's revision."""
        form = self.model_dump(mode="json", exclude_defaults=True)
        return form | {"quantity": self.quantity, "revision": QUANTITY_REVISIONS[self.quantity]}

    @cached_property
    def key(self) -> str:
        """SHA-256 of the canonical normal form."""
        return key_of(self.normal_form())

    def region_label(self) -> str:
        """What the table's column ``region`` says."""
        return "all"

    def fault(self, ensemble: Ensemble) -> tuple[str, str] | None:
        """Field and message if this observation cannot be read off that ensemble."""
        try:
            readings(self.at, ensemble.layers)
        except ValueError as error:
            return "at", str(error)
        return self._region_fault(ensemble)

    def _region_fault(self, ensemble: Ensemble) -> tuple[str, str] | None:
        return None


class _Averageable(_Observation):
    """A quantity of regions of a chain."""

    average_translations: bool = False
    histogram: bool = False

    def _region_fault(self, ensemble: Ensemble) -> tuple[str, str] | None:
        if self.average_translations and not ensemble.periodic:
            return "average_translations", "only a periodic chain has translations, got boundary = 'open'"
        return None


class Entropy(_Averageable):
    """Entropy of a region in bits; ``every-cut`` reads all regions [0, x), x = 1 … L-1."""

    quantity: Literal["entropy"]
    region: CutOrSites = "half"

    def region_label(self) -> str:
        return self.region if isinstance(self.region, str) else sites_label(self.region)

    def _region_fault(self, ensemble: Ensemble) -> tuple[str, str] | None:
        if isinstance(self.region, tuple) and (message := outside(self.region, ensemble.sites)):
            return "region", message
        return super()._region_fault(ensemble)


class GlobalEntropy(_Observation):
    """Entropy of the whole chain in bits."""

    quantity: Literal["global-entropy"]
    histogram: bool = False


class MutualInformation(_Averageable):
    """I(A:B) = S_A + S_B - S_AB in bits; ``antipodal``: two intervals of ``size`` sites centered L/2 apart."""

    quantity: Literal["mutual-information"]
    regions: AntipodalOrTwo = "antipodal"
    size: Annotated[Integer, Field(ge=1)] | None = None

    def region_label(self) -> str:
        if isinstance(self.regions, str):
            return self.regions if self.size is None else f"antipodal {self.size}"
        return " : ".join(map(sites_label, self.regions))

    def _region_fault(self, ensemble: Ensemble) -> tuple[str, str] | None:
        if isinstance(self.regions, tuple):
            if self.size is not None:
                return "size", "only antipodal regions have a size"
            return _regions_fault(self.regions, ensemble) or super()._region_fault(ensemble)
        if ensemble.sites % 2:
            return "regions", f"antipodal regions need an even number of sites, got {ensemble.sites}"
        if self.size is None and ensemble.sites % 8:
            return (
                "size",
                f"the default size L/8 needs sites divisible by 8, got {ensemble.sites}: give a size",
            )
        if self.size is not None and self.size > ensemble.sites // 2:
            return "size", f"two regions of {self.size} sites overlap on {ensemble.sites} sites"
        return super()._region_fault(ensemble)


class TripartiteInformation(_Averageable):
    """I3 = S_A + S_B + S_C + S_ABC - S_AB - S_BC - S_AC in bits, on three of four quarters or given regions."""

    quantity: Literal["tripartite-information"]
    regions: QuartersOrThree = "quarters"

    def region_label(self) -> str:
        return self.regions if isinstance(self.regions, str) else " : ".join(map(sites_label, self.regions))

    def _region_fault(self, ensemble: Ensemble) -> tuple[str, str] | None:
        if isinstance(self.regions, tuple):
            return _regions_fault(self.regions, ensemble) or super()._region_fault(ensemble)
        if ensemble.sites % 4:
            return "regions", f"quarters need sites divisible by 4, got {ensemble.sites}"
        return super()._region_fault(ensemble)


class RecordBits(_Observation):
    """Random outcomes so far: the record of a Clifford circuit has probability 2^-record-bits."""

    quantity: Literal["record-bits"]
    histogram: bool = False


class OutcomeRandomness(_Observation):
    """Random outcomes over measurements, of single layers or all layers so far (``cumulative``)."""

    COMPONENTS: ClassVar[int] = 2

    quantity: Literal["outcome-randomness"]
    cumulative: bool = False


Observation = Annotated[
    Entropy | GlobalEntropy | MutualInformation | TripartiteInformation | RecordBits | OutcomeRandomness,
    Field(discriminator="quantity"),
]
QUANTITIES: tuple[str, ...] = tuple(QUANTITY_REVISIONS)
_ADAPTER: TypeAdapter[Any] = TypeAdapter(Observation)


def observation_from_normal_form(form: Mapping[str, Any]) -> Observation:
    """The inverse of ``normal_form``. Raises ValueError for another revision of the quantity."""
    fields = {name: value for name, value in form.items() if name != "revision"}
    current = QUANTITY_REVISIONS.get(str(form.get("quantity")))
    if form.get("revision") != current:
        raise ValueError(f"{form.get('quantity')} has revision {current} here, not {form.get('revision')}")
    observation: Observation = _ADAPTER.validate_python(fields)
    return observation


def wants_histogram(observation: Observation) -> bool:
    """Whether the exact integer histogram of single readings is kept."""
    return bool(getattr(observation, "histogram", False))


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
    """What is wrong with a site list on a chain of ``sites`` sites."""
    if region[-1] >= sites:
        return f"site {region[-1]} is outside a chain of {sites} sites (0 to {sites - 1})"
    return None


def _regions_fault(regions: tuple[tuple[int, ...], ...], ensemble: Ensemble) -> tuple[str, str] | None:
    for index, region in enumerate(regions):
        if message := outside(region, ensemble.sites):
            return f"regions[{index}]", message
    if len({site for region in regions for site in region}) < sum(map(len, regions)):
        return "regions", "the regions must be disjoint"
    return None
