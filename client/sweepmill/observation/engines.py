"""Which engine gives which quantity."""

from typing import Final

from sweepmill.ensemble import Ensemble

CLUSTERS: Final = "projective-ising"
"""The family that is sampled as clusters of sites unless the reference engine is asked for."""


def engine_fault(quantity: str, ensemble: Ensemble) -> tuple[str, str] | None:
    """Field and message if the ensemble's engine does not give the quantity."""
    signed = ensemble.signed
    clusters = ensemble.family == CLUSTERS and not signed
    if quantity == "pauli-expectation" and not signed:
        return "quantity", 'pauli-expectation depends on signs: it needs engine = "reference"'
    if quantity == "cluster-order" and not clusters:
        return "quantity", f'cluster-order belongs to {CLUSTERS} with engine = "auto"'
    return None
