"""Predicted cost of a trajectory before anything of its ensemble was measured."""

from sweepmill.ensemble import Ensemble

# Seconds per site and layer of the stabilizer engine: a gate plus the row operations of a measurement,
# whose cost grows with the number of 64-site words. Fitted to single-core runs at 32 to 512 sites.
PER_PLACE = 6e-8
PER_PLACE_AND_WORD = 1.2e-7
WORD = 64


def default_seconds_per_trajectory(ensemble: Ensemble) -> float:
    """Core-seconds of one trajectory, to within a small factor."""
    places = ensemble.layers * ensemble.sites
    return places * (PER_PLACE + PER_PLACE_AND_WORD * ensemble.sites / WORD)
