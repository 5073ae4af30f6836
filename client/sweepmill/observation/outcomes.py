"""Quantities of measurement outcomes and of signs."""

from collections.abc import Mapping
from typing import Annotated, Any, ClassVar, Literal

from pydantic import AfterValidator, BeforeValidator, Field, model_validator

from sweepmill.axes import Flag, Integer, nonempty
from sweepmill.ensemble import Ensemble
from sweepmill.observation.base import BaseObservation
from sweepmill.observation.regions import Fault, outside
from sweepmill.times import as_tuple

PAULI_PATTERN = "^[XYZ]+$"
TWICE = "a site stands twice in this list"


class RecordBits(BaseObservation):
    """Random outcomes so far: the record of a Clifford circuit has probability 2^-record-bits.

    Every recorded outcome counts given the earlier ones, forced ones included, which do not count themselves: where
    outcomes are forced, the probability of the record is conditional on them.
    """

    quantity: Literal["record-bits"]
    histogram: Flag = False


class OutcomeRandomness(BaseObservation):
    """Random outcomes over measurements, of single layers or all layers so far (``cumulative``)."""

    COMPONENTS: ClassVar[int] = 2

    quantity: Literal["outcome-randomness"]
    cumulative: Flag = False


class PauliExpectation(BaseObservation):
    """Expectation of a product of Pauli matrices, letter i of ``pauli`` on ``sites[i]``: -1, 0 or 1."""

    quantity: Literal["pauli-expectation"]
    pauli: Annotated[str, Field(pattern=PAULI_PATTERN)]
    sites: Annotated[tuple[Annotated[Integer, Field(ge=0)], ...], BeforeValidator(as_tuple), AfterValidator(nonempty)]
    histogram: Flag = False

    @model_validator(mode="before")
    @classmethod
    def _by_site(cls, fields: Any) -> Any:
        """Factors in the order of their sites: one spelling, one key."""
        if not isinstance(fields, Mapping):
            return fields
        pauli, sites = fields.get("pauli"), fields.get("sites")
        if not isinstance(pauli, str) or not isinstance(sites, list | tuple) or len(pauli) != len(sites):
            return fields
        if not all(isinstance(site, int | float) for site in sites):
            return fields
        pairs = sorted(zip(sites, pauli, strict=True))
        return {**fields, "pauli": "".join(letter for _, letter in pairs), "sites": [site for site, _ in pairs]}

    def region_label(self) -> str:
        return " ".join(f"{letter}{site}" for letter, site in zip(self.pauli, self.sites, strict=False))

    def _region_fault(self, ensemble: Ensemble) -> Fault | None:
        if len(self.pauli) != len(self.sites):
            return "pauli", f"needs a letter for each site, got {len(self.pauli)} for {len(self.sites)} sites"
        if len(set(self.sites)) < len(self.sites):
            return "sites", TWICE
        message = outside(self.sites, ensemble.sites)
        return ("sites", message) if message else None
