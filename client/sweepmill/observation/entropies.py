"""Entropies and their combinations."""

from typing import Annotated, Literal

from pydantic import Field

from sweepmill.axes import Flag, Integer
from sweepmill.ensemble import Ensemble
from sweepmill.observation.base import Averageable, BaseObservation
from sweepmill.observation.regions import (
    AntipodalOrTwo,
    CutIntervalOrSites,
    Fault,
    QuartersOrThree,
    region_fault,
    region_label,
    regions_fault,
    sites_label,
)

NOT_ANTIPODAL = "only antipodal regions have a size"


class Entropy(Averageable):
    """Entropy S of a region in bits.

    ``every-cut`` reads all regions [0, x), x = 1 … L-1; ``every-interval`` the mean over all windows of l sites for
    l = 1 … L: the L - l + 1 windows of the open line, or with ``average_translations`` the L windows of the ring.
    """

    quantity: Literal["entropy"]
    region: CutIntervalOrSites = "half"

    def region_label(self) -> str:
        return region_label(self.region)

    def _region_fault(self, ensemble: Ensemble) -> Fault | None:
        if self.histogram and self.region == "every-interval":
            return "histogram", "every-interval is a mean over windows: it has no histogram"
        return region_fault(self.region, ensemble) or super()._region_fault(ensemble)


class GlobalEntropy(BaseObservation):
    """Entropy of the whole chain in bits."""

    quantity: Literal["global-entropy"]
    histogram: Flag = False


class ReferenceEntropy(BaseObservation):
    """Entropy of all reference qubits in bits: what the chain still knows of them."""

    quantity: Literal["reference-entropy"]
    histogram: Flag = False

    def region_label(self) -> str:
        return "references"

    def _region_fault(self, ensemble: Ensemble) -> Fault | None:
        return None if ensemble.references else ("quantity", "the ensemble has no reference qubits")


class MutualInformation(Averageable):
    """I(A:B) = S_A + S_B - S_AB in bits; ``antipodal``: two intervals of ``size`` sites centered L/2 apart."""

    quantity: Literal["mutual-information"]
    regions: AntipodalOrTwo = "antipodal"
    size: Annotated[Integer, Field(ge=1)] | None = None

    def region_label(self) -> str:
        if isinstance(self.regions, str):
            return self.regions if self.size is None else f"antipodal {self.size}"
        return " : ".join(map(sites_label, self.regions))

    def _region_fault(self, ensemble: Ensemble) -> Fault | None:
        if isinstance(self.regions, tuple):
            if self.size is not None:
                return "size", NOT_ANTIPODAL
            return regions_fault(self.regions, ensemble) or super()._region_fault(ensemble)
        return self._antipodal_fault(ensemble.sites) or super()._region_fault(ensemble)

    def _antipodal_fault(self, sites: int) -> Fault | None:
        if sites % 2:
            return "regions", f"antipodal regions need an even number of sites, got {sites}"
        if self.size is None and sites % 8:
            return "size", f"the default size L/8 needs sites divisible by 8, got {sites}: give a size"
        if self.size is not None and self.size > sites // 2:
            return "size", f"two regions of {self.size} sites overlap on {sites} sites"
        return None


class TripartiteInformation(Averageable):
    """I3 = S_A + S_B + S_C + S_ABC - S_AB - S_BC - S_AC in bits, on three of four quarters or given regions."""

    quantity: Literal["tripartite-information"]
    regions: QuartersOrThree = "quarters"

    def region_label(self) -> str:
        return self.regions if isinstance(self.regions, str) else " : ".join(map(sites_label, self.regions))

    def _region_fault(self, ensemble: Ensemble) -> Fault | None:
        if isinstance(self.regions, tuple):
            return regions_fault(self.regions, ensemble) or super()._region_fault(ensemble)
        if ensemble.sites % 4:
            return "regions", f"quarters need sites divisible by 4, got {ensemble.sites}"
        return super()._region_fault(ensemble)
