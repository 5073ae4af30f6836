"""What all observations share: fields, identity, and whether an ensemble has them."""

from functools import cached_property
from typing import Annotated, Any, ClassVar

from pydantic import Field

from sweepmill.axes import Flag
from sweepmill.ensemble import Ensemble
from sweepmill.identity import key_of
from sweepmill.observation.engines import engine_fault
from sweepmill.observation.regions import Fault
from sweepmill.revisions import QUANTITY_REVISIONS
from sweepmill.times import At, Strict, check_cells, readings

NAME_PATTERN = r"^[A-Za-z][A-Za-z0-9_.-]{0,63}$"


class BaseObservation(Strict):
    """Fields and identity common to all quantities."""

    quantity: str
    name: Annotated[str, Field(pattern=NAME_PATTERN)] | None = Field(None, exclude=True)
    at: At = "last-cell"
    keep_values: Flag = False  # of every trajectory, besides their sums

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

    def fault(self, ensemble: Ensemble) -> Fault | None:
        """Field and message if this observation cannot be read off that ensemble."""
        try:
            check_cells(self.at, readings(self.at, ensemble.layers, ensemble.cell), ensemble.repeated)
        except ValueError as error:
            return "at", str(error)
        return engine_fault(self.quantity, ensemble) or self._region_fault(ensemble)

    def _region_fault(self, ensemble: Ensemble) -> Fault | None:
        return None


class Averageable(BaseObservation):
    """A quantity of regions of a chain."""

    average_translations: Flag = False
    histogram: Flag = False

    def _region_fault(self, ensemble: Ensemble) -> Fault | None:
        if not self.average_translations:
            return None
        if ensemble.family == LATTICE:
            return "average_translations", "translations are those of a ring, and this is a lattice"
        if not ensemble.periodic:
            return "average_translations", "only a periodic chain has translations, and this one is open"
        return None


LATTICE = "hybrid-clifford-square"
"""The family whose sites are numbered row by row: neighbors in number need not be neighbors."""
