"""Circuit blocks of a specification: one model per family, expanded into ensembles."""

from sweepmill.ensemble import FAMILY_PARAMETERS
from sweepmill.families import CircuitBlock
from sweepmill.families.block import MOST_ENSEMBLES, Block
from sweepmill.families.chains import (
    EdgeBath,
    HybridClifford,
    HybridCliffordLongRange,
    ProjectiveIsing,
    RotatedClifford,
)
from sweepmill.families.fields import PerSide, PerSite, resolved_layers
from sweepmill.families.layered import Layered
from sweepmill.families.square import HybridCliffordSquare
from sweepmill.language.rates import SMALLEST_RATE

FAMILIES: tuple[str, ...] = tuple(FAMILY_PARAMETERS)

__all__ = [
    "FAMILIES",
    "MOST_ENSEMBLES",
    "SMALLEST_RATE",
    "Block",
    "CircuitBlock",
    "EdgeBath",
    "HybridClifford",
    "HybridCliffordLongRange",
    "HybridCliffordSquare",
    "Layered",
    "PerSide",
    "PerSite",
    "ProjectiveIsing",
    "RotatedClifford",
    "resolved_layers",
]
