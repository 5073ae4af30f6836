"""Which regions an observation needs, and how their entropies combine into it."""

from dataclasses import dataclass
from functools import lru_cache
from typing import Any

import numpy as np
from numpy.typing import NDArray

from sweepmill.coordinates import translations
from sweepmill.observation import Entropy, GlobalEntropy, MutualInformation, TripartiteInformation

Region = tuple[int, ...]

# S_A + S_B - S_AB, and S_A + S_B + S_C + S_ABC - S_AB - S_BC - S_AC (tripartite combination of Topological entanglement
# entropy, Physical Review Letters 96, 110404 (2006), from memory)
MUTUAL_SIGNS = (1, 1, -1)
TRIPARTITE_SIGNS = (1, 1, 1, 1, -1, -1, -1)


@dataclass(frozen=True)
class Combination:
    """One reading = sum of ``signs`` [K] times the entropies of ``regions`` [positions][offsets][K]."""

    regions: tuple[tuple[tuple[Region, ...], ...], ...]
    signs: tuple[int, ...]


def combination(sites: int, observation: Any) -> Combination | None:
    """The regions of an observation, or None for one of outcome counts."""
    if not isinstance(observation, Entropy | GlobalEntropy | MutualInformation | TripartiteInformation):
        return None
    base, signs = _base(sites, observation)
    offsets = range(translations(sites, observation))
    shifted = tuple(
        tuple(tuple(_shift(region, offset, sites) for region in terms) for offset in offsets) for terms in base
    )
    return Combination(shifted, signs)


def _base(sites: int, observation: Any) -> tuple[list[tuple[Region, ...]], tuple[int, ...]]:
    if isinstance(observation, GlobalEntropy):
        return [(tuple(range(sites)),)], (1,)
    if isinstance(observation, MutualInformation):
        a, b = _pair(sites, observation)
        return [(a, b, _union(a, b))], MUTUAL_SIGNS
    if isinstance(observation, TripartiteInformation):
        a, b, c = _three(sites, observation)
        return [(a, b, c, _union(a, b, c), _union(a, b), _union(b, c), _union(a, c))], TRIPARTITE_SIGNS
    if observation.region == "half":
        return [(tuple(range(sites // 2)),)], (1,)
    if observation.region == "every-cut":
        return [(tuple(range(x)),) for x in range(1, sites)], (1,)
    return [(observation.region,)], (1,)


def _pair(sites: int, observation: MutualInformation) -> tuple[Region, Region]:
    if observation.regions != "antipodal":
        return observation.regions
    size = sites // 8 if observation.size is None else observation.size
    return tuple(range(size)), tuple(range(sites // 2, sites // 2 + size))


def _three(sites: int, observation: TripartiteInformation) -> tuple[Region, Region, Region]:
    if observation.regions != "quarters":
        return observation.regions
    quarter = sites // 4
    return tuple(range(quarter)), tuple(range(quarter, 2 * quarter)), tuple(range(2 * quarter, 3 * quarter))


def _union(*regions: Region) -> Region:
    return tuple(sorted(site for region in regions for site in region))


def _shift(region: Region, offset: int, sites: int) -> Region:
    return tuple(sorted((site + offset) % sites for site in region)) if offset else region


@dataclass(frozen=True)
class RegionPlan:
    """All regions a task reads, once each, and per observation the indices [positions, offsets, K] into them."""

    regions: tuple[Region, ...]
    indices: tuple[NDArray[np.int64] | None, ...]
    signs: tuple[tuple[int, ...], ...]


@lru_cache(maxsize=64)
def plan_regions(sites: int, observations: tuple[Any, ...]) -> RegionPlan:
    """Collect the regions of several observations on a chain; shared ones are read once."""
    index: dict[Region, int] = {}
    indices: list[NDArray[np.int64] | None] = []
    signs: list[tuple[int, ...]] = []
    for observation in observations:
        found = combination(sites, observation)
        signs.append(found.signs if found else ())
        if found is None:
            indices.append(None)
            continue
        numbers = [[[index.setdefault(r, len(index)) for r in terms] for terms in row] for row in found.regions]
        indices.append(np.array(numbers, dtype=np.int64))
    return RegionPlan(tuple(index), tuple(indices), tuple(signs))
