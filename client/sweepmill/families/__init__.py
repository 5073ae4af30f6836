"""Circuit families: one model each, expanded into ensembles."""

from typing import Annotated

from pydantic import Field

from sweepmill.families.chains import (
    EdgeBath,
    HybridClifford,
    HybridCliffordLongRange,
    ProjectiveIsing,
    RotatedClifford,
)
from sweepmill.families.layered import Layered
from sweepmill.families.square import HybridCliffordSquare

CircuitBlock = Annotated[
    HybridClifford
    | HybridCliffordSquare
    | HybridCliffordLongRange
    | ProjectiveIsing
    | EdgeBath
    | RotatedClifford
    | Layered,
    Field(discriminator="family"),
]
