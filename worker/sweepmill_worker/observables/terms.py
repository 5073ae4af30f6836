"""The regions whose entropies make up an observation, and their signs."""

from sweepmill.observation import (
    Entropy,
    GlobalEntropy,
    MutualInformation,
    Observation,
    ReferenceEntropy,
    TripartiteInformation,
)
from sweepmill_worker.observables.probes import Region

Terms = tuple[Region | range, ...]
"""Regions of one position; a range is an arc that begins at any site of the chain."""

# S_A + S_B - S_AB, and S_A + S_B + S_C + S_ABC - S_AB - S_BC - S_AC (tripartite combination of Topological entanglement
# entropy, Physical Review Letters 96, 110404 (2006), from memory)
MUTUAL_SIGNS = (1, 1, -1)
TRIPARTITE_SIGNS = (1, 1, 1, 1, -1, -1, -1)


def entropy_terms(sites: int, references: int, observation: Observation) -> tuple[list[Terms], tuple[int, ...]] | None:
    """Regions per position, and signs; None for what is no sum of entropies."""
    match observation:
        case GlobalEntropy():
            return [(range(sites),)], (1,)
        case ReferenceEntropy():
            return [(tuple(range(sites, sites + references)),)], (1,)
        case MutualInformation():
            a, b = _pair(sites, observation)
            return [(a, b, _union(a, b))], MUTUAL_SIGNS
        case TripartiteInformation():
            a, b, c = _three(sites, observation)
            return [(a, b, c, _union(a, b, c), _union(a, b), _union(b, c), _union(a, c))], TRIPARTITE_SIGNS
        case Entropy(region="every-cut"):
            return [(range(cut),) for cut in range(1, sites)], (1,)
        case Entropy():
            return [(named(sites, observation.region),)], (1,)
    return None


def named(sites: int, region: str | Region) -> Region | range:
    """The sites of a region given by `half` or by a list."""
    return range(sites // 2) if isinstance(region, str) else region


def _pair(sites: int, observation: MutualInformation) -> tuple[Region, Region]:
    if isinstance(observation.regions, tuple):
        return observation.regions
    size = sites // 8 if observation.size is None else observation.size
    return tuple(range(size)), tuple(range(sites // 2, sites // 2 + size))


def _three(sites: int, observation: TripartiteInformation) -> tuple[Region, Region, Region]:
    if isinstance(observation.regions, tuple):
        return observation.regions
    quarter = sites // 4
    return tuple(range(quarter)), tuple(range(quarter, 2 * quarter)), tuple(range(2 * quarter, 3 * quarter))


def _union(*regions: Region) -> Region:
    return tuple(sorted(site for region in regions for site in region))
