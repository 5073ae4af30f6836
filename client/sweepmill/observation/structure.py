"""Quantities that say more of a state than the entropies of its regions."""

from typing import Literal

from sweepmill.axes import Flag
from sweepmill.ensemble import Ensemble
from sweepmill.observation.base import LATTICE, BaseObservation
from sweepmill.observation.regions import CutOrSites, Fault, HalfOrSites, region_fault, region_label


class SiteEnvironmentInformation(BaseObservation):
    """I(x : E) = S_x + S_A - S_(A without x) in bits, x in A and E everything outside A, its purifier included.

    A function of the distance of x from the nearest site outside A (1 at the boundary; along the ring where the chain
    is periodic): the mean over the sites at that distance.
    """

    quantity: Literal["site-environment-information"]
    region: HalfOrSites = "half"

    def region_label(self) -> str:
        return region_label(self.region)

    def _region_fault(self, ensemble: Ensemble) -> Fault | None:
        if ensemble.family == LATTICE:
            return "quantity", "distances from the boundary are those of a chain, and this is a lattice"
        if isinstance(self.region, tuple) and len(self.region) >= ensemble.sites:
            return region_fault(self.region, ensemble) or ("region", "the region must leave a site outside")
        return region_fault(self.region, ensemble)


class Negativity(BaseObservation):
    """Logarithmic negativity in bits between a region and the rest of the chain.

    For a stabilizer state, half the rank of the commutators of its stabilizers cut down to the region: Entanglement
    negativity and stabilizer states (from memory).  In a pure state it is the entropy of the region.
    """

    quantity: Literal["negativity"]
    region: CutOrSites = "half"
    histogram: Flag = False

    def region_label(self) -> str:
        return region_label(self.region)

    def _region_fault(self, ensemble: Ensemble) -> Fault | None:
        return region_fault(self.region, ensemble)


class GeneratorLengths(BaseObservation):
    """Number of stabilizer generators of each length l = 1 … L in the clipped gauge of the chain cut open at site 0.

    A generator from site a to site b has length b - a + 1: Quantum entanglement growth under random unitary dynamics,
    Physical Review X 7, 031016 (2017).
    """

    quantity: Literal["generator-lengths"]

    def _region_fault(self, ensemble: Ensemble) -> Fault | None:
        if ensemble.family == LATTICE:
            return "quantity", "lengths are those on a chain, and this is a lattice"
        return None


class ClusterOrder(BaseObservation):
    """Sum of the squared cluster sizes over L^2: 1 for a single cluster of all sites, 1/L for L clusters."""

    quantity: Literal["cluster-order"]
