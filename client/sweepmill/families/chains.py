"""Families of monitored random Clifford circuits on a chain."""

from typing import ClassVar, Literal

from sweepmill.axes import IntegerAxis, NumberAxis
from sweepmill.families.block import Block
from sweepmill.families.checks import Check, enough_sites, even, even_ring
from sweepmill.families.fields import BoundaryAxis, ChainStateAxis, EndsAxis, LayersAxis, PerSite


class HybridClifford(Block):
    """Brickwork of independent uniform two-qubit Cliffords on a chain; Z measured at a rate per site and layer.

    ``references`` qubits start as Bell partners of equally spaced sites; ``scrambling_layers`` of brickwork without
    measurements follow before the layers are counted.
    """

    CHECKS: ClassVar[tuple[Check, ...]] = (
        Check("sites", ("sites", "boundary"), even_ring),
        Check("references", ("references", "sites"), enough_sites),
    )

    family: Literal["hybrid-clifford"]
    sites: IntegerAxis
    measurement_rate: NumberAxis
    boundary: BoundaryAxis = "periodic"
    initial_state: ChainStateAxis = "zeros"
    references: IntegerAxis = 0
    scrambling_layers: IntegerAxis = 0
    layers: LayersAxis = PerSite(per_site=4)


class HybridCliffordLongRange(Block):
    """In every layer disjoint random pairs, a partner at (ring) distance r with weight r^-exponent; then Z at a rate.

    Exponent 0 pairs all with all.
    """

    CHECKS: ClassVar[tuple[Check, ...]] = (Check("sites", ("sites",), even("pairing all sites")),)

    family: Literal["hybrid-clifford-long-range"]
    sites: IntegerAxis
    exponent: NumberAxis
    measurement_rate: NumberAxis
    boundary: BoundaryAxis = "periodic"
    initial_state: ChainStateAxis = "zeros"
    layers: LayersAxis = PerSite(per_site=4)


class ProjectiveIsing(Block):
    """No gates: in every layer ZZ on each bond at ``bond_rate``, then X on each site at 1 - ``bond_rate``.

    The chain starts with every site in |+>.
    """

    family: Literal["projective-ising"]
    sites: IntegerAxis
    bond_rate: NumberAxis
    boundary: BoundaryAxis = "periodic"
    layers: LayersAxis = PerSite(per_site=4)


class EdgeBath(Block):
    """Brickwork of uniform two-qubit Cliffords on an open chain; site 0 is depolarised after every layer."""

    family: Literal["edge-bath"]
    sites: IntegerAxis
    layers: LayersAxis = PerSite(per_site=4)


class RotatedClifford(Block):
    """Brickwork of Clifford gates read sideways: the sites are time slices, the layers columns of the circuit."""

    CHECKS: ClassVar[tuple[Check, ...]] = (Check("sites", ("sites",), even("a rotated circuit")),)

    family: Literal["rotated-clifford"]
    sites: IntegerAxis
    ends: EndsAxis = "open"
    layers: LayersAxis = PerSite(per_site=4)
