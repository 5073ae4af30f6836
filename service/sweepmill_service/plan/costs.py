"""Predicted cost of a trajectory before anything of its ensemble was measured."""

from sweepmill.ensemble import Ensemble

# Core-seconds of the stabilizer engine on one core, to within a factor of 2 from 8 to 1024 sites and for rates from
# 0.02 to 0.5: a constant per trajectory, and per site and layer a part that grows with the length of the vectors.
PER_TRAJECTORY = 5e-6
PER_PLACE = 2.5e-8
PER_PLACE_AND_SITE = 1.5e-11


def default_seconds_per_trajectory(ensemble: Ensemble) -> float:
    """Core-seconds of one trajectory, to within a small factor."""
    places = ensemble.layers * ensemble.sites
    return PER_TRAJECTORY + places * (PER_PLACE + PER_PLACE_AND_SITE * ensemble.sites)


class Calibration:
    """What this machine and these observations really take over the default, learned from first batches."""

    def __init__(self) -> None:
        self.factor = 1.0

    def note(self, default: float, measured: float) -> None:
        """Follow half of the way, in logarithms, from one batch of an ensemble not measured before."""
        if default > 0 and measured > 0:
            self.factor = (self.factor * measured / default) ** 0.5
