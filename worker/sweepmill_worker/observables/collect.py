"""Collect regions, each once, as numbers: arcs as (first, length) in one integer, other regions by their ordinal."""

import numpy as np
from numpy.typing import NDArray

from sweepmill_worker.observables.probes import Region, arc_of
from sweepmill_worker.observables.terms import Terms

Codes = NDArray[np.int64]


class Regions:
    """Codes of regions: first * (L + 1) + length of an arc, -1 - ordinal of another region."""

    def __init__(self, sites: int) -> None:
        self.sites = sites
        self._sets: dict[Region, int] = {}
        self._arcs: Codes = np.zeros(0, dtype=np.int64)  # ascending, each once

    def codes(self, rows: list[Terms], translations: int) -> Codes:
        """[positions, translations, K] codes of all translations of some rows of K regions."""
        offsets = np.arange(translations)
        found = np.array([[self._shifted(region, offsets) for region in terms] for terms in rows], dtype=np.int64)
        found = np.moveaxis(found, 2, 1)
        ascending = np.sort(np.concatenate([self._arcs, found[found >= 0]]))
        self._arcs = ascending[np.diff(ascending, prepend=-1) > 0]
        return found

    def _shifted(self, region: Region | range, offsets: Codes) -> Codes:
        arc = (region.start, len(region)) if isinstance(region, range) else arc_of(region, self.sites)
        if arc is None:
            return np.array([-1 - self._ordinal(shifted(region, by, self.sites)) for by in offsets.tolist()])
        first, length = arc
        whole = length in (0, self.sites)  # then it does not matter where it begins
        return (0 if whole else 1) * ((first + offsets) % self.sites) * (self.sites + 1) + length

    def _ordinal(self, region: Region) -> int:
        return self._sets.setdefault(region, len(self._sets))

    @property
    def sets(self) -> tuple[Region, ...]:
        """Regions that are not arcs."""
        return tuple(self._sets)

    def arcs(self) -> NDArray[np.int64]:
        """[n, 2]: first site and length."""
        return np.stack(np.divmod(self._arcs, self.sites + 1), axis=1)

    def indices(self, codes: Codes) -> Codes:
        """Where the regions stand in the list of all arcs, then all sets."""
        return np.where(codes >= 0, np.searchsorted(self._arcs, codes), len(self._arcs) - 1 - codes)


def shifted(region: Region | range, offset: int, sites: int) -> Region:
    """The region moved along the ring."""
    return tuple(sorted((site + offset) % sites for site in region)) if offset else tuple(region)
