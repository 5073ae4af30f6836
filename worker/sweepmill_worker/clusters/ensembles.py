"""The chain of clusters of an ensemble of the family `projective-ising`."""

from typing import Any

from sweepmill.ensemble import Ensemble
from sweepmill.presets import layered_form
from sweepmill_worker.clusters.engine import ClusterChain
from sweepmill_worker.program.exact import exact


def cluster_chain(ensemble: Ensemble) -> ClusterChain:
    """The law of the ensemble, with the rates of its layered form: both engines then decide alike, word by word."""
    bonds, sites = layered_form(ensemble)["repeat"][0]
    return ClusterChain(ensemble.sites, ensemble.layers, ensemble.periodic, _threshold(bonds), _threshold(sites))


def _threshold(step: dict[str, Any]) -> int:
    return int(exact(step.get("rate", 1)) * 2**32)
