"""Predicted cost of a trajectory before anything of its ensemble was measured."""

from typing import Any

from sweepmill.ensemble import LAYERED, Ensemble
from sweepmill.language.geometry import number_of_places

# Core-seconds of the stabilizer engine on one core, to within a factor of 2 from 8 to 1024 sites and for rates from
# 0.02 to 0.5: a constant per trajectory, and per site and layer a part that grows with the length of the vectors.
PER_TRAJECTORY = 5e-6
PER_PLACE = 2.5e-8
PER_PLACE_AND_SITE = 1.5e-11
PER_CLUSTER_PLACE = 3e-8  # the cluster engine is nearly linear in the places
REFERENCE = 200.0  # the signed simulation over the stabilizer engine
BRICKWORK = 1.5  # places per site of a layer of the family that the constants were measured on


def default_seconds_per_trajectory(ensemble: Ensemble) -> float:
    """Core-seconds of one trajectory, to within a small factor."""
    places = ensemble.layers * _places_of_a_layer(ensemble)
    if ensemble.parameters["engine"] == "reference":
        return PER_TRAJECTORY + REFERENCE * places * PER_PLACE
    if ensemble.family == "projective-ising":
        return PER_TRAJECTORY + places * PER_CLUSTER_PLACE
    return PER_TRAJECTORY + places * (PER_PLACE + PER_PLACE_AND_SITE * (ensemble.sites + ensemble.references))


def _places_of_a_layer(ensemble: Ensemble) -> float:
    """Places in units of those that brickwork has per site."""
    if ensemble.family != LAYERED:
        return ensemble.sites
    layers = ensemble.parameters["repeat"]
    return sum(_places(step, ensemble) for layer in layers for step in layer) / len(layers) / BRICKWORK


def _places(step: Any, ensemble: Ensemble) -> int:
    return number_of_places(step["on"], ensemble.sites, ensemble.periodic)


class Calibration:
    """What this machine and these observations really take over the default, learned from first batches."""

    def __init__(self) -> None:
        self.factor = 1.0

    def note(self, default: float, measured: float) -> None:
        """Follow half of the way, in logarithms, from one batch of an ensemble not measured before."""
        if default > 0 and measured > 0:
            self.factor = (self.factor * measured / default) ** 0.5
