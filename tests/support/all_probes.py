"""Everything that can be read off a state without signs, for comparisons of engines."""

import random

import numpy as np

from sweepmill.observation.distances import distances
from sweepmill_worker.observables.probes import Information, Probes, Region


def all_probes(sites: int, references: int = 0, seed: int = 0, most: int = 10**9) -> Probes:
    """All probes of a chain; drawn arcs and informations of smaller regions if they should not be many."""
    draw = random.Random(seed)
    arcs = [(first, length) for first in range(sites) for length in range(1, sites + 1)]
    total = sites + references
    sets = [tuple(sorted(draw.sample(range(total), draw.randint(1, total)))) for _ in range(8)]
    sets += [tuple(range(sites, total))] if references else []
    largest = min(sites - 1, most)
    parts = [sorted(draw.sample(range(sites), draw.randint(1, largest))) for _ in range(4)]
    parts += [list(range(sites // 2))[:largest], list(range(sites - 1))[-largest:]]
    regions: list[Region] = [tuple(part) for part in parts]
    return Probes(
        sites=sites,
        references=references,
        arcs=np.array(draw.sample(arcs, min(len(arcs), most)), dtype=np.int64),
        sets=tuple(sets),
        line=most > sites,
        ring=most > sites,
        informations=tuple(Information(r, tuple(distances(r, sites, True).tolist())) for r in regions),
        negativities=(*regions, tuple(range(sites))),
        lengths=most > sites,
    )
