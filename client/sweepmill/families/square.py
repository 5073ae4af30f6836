"""Monitored random Clifford circuits on the square lattice."""

from collections.abc import Mapping
from itertools import product
from typing import Any, ClassVar, Literal

from sweepmill.axes import IntegerAxis, NumberAxis
from sweepmill.ensemble import Ensemble
from sweepmill.errors import Fault
from sweepmill.families.block import Block, Values
from sweepmill.families.checks import Check, even_side
from sweepmill.families.fields import BoundaryAxis, ChainStateAxis, LatticeLayersAxis, PerSide


class HybridCliffordSquare(Block):
    """Uniform two-qubit Cliffords on the four classes of bonds in turn; Z measured at a rate per site and layer.

    Site = y * width + x. Without ``height`` the lattice is as high as wide.
    """

    SIZE: ClassVar[str] = "width"
    CHECKS: ClassVar[tuple[Check, ...]] = (
        Check("width", ("width", "boundary"), even_side),
        Check("height", ("height", "boundary"), even_side),
    )

    family: Literal["hybrid-clifford-square"]
    width: IntegerAxis
    height: IntegerAxis | None = None
    measurement_rate: NumberAxis
    boundary: BoundaryAxis = "periodic"
    initial_state: ChainStateAxis = "zeros"
    layers: LatticeLayersAxis = PerSide(per_side=4)

    def extent(self, values: Mapping[str, Any]) -> int:
        """The longer side."""
        return int(max(values["width"], values["height"] or 0))

    def _extents(self, columns: Mapping[str, Values]) -> list[int]:
        sides = product(columns["width"], columns["height"])
        return list(dict.fromkeys(self.extent({"width": w, "height": h}) for (_, w), (_, h) in sides))

    def ensemble(self, values: dict[str, Any], path: str, faults: list[Fault]) -> Ensemble | None:
        """The ensemble with its height filled in."""
        return super().ensemble(values | {"height": values["height"] or values["width"]}, path, faults)

    def normal_form(self, cap: int) -> dict[str, Any]:
        """A single height that is the single width goes without saying."""
        form = super().normal_form(cap)
        if form.get("height") == form["width"] and not isinstance(form["width"], list):
            del form["height"]
        return form
