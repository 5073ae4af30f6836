"""Where to sample next for one derived quantity: a critical point, or a coefficient of a law.

Pure functions: from what was measured at all candidates to a verdict and to the trajectories of the next round.
"""

from sweepmill.analysis.design.critical_point import advise_critical_point
from sweepmill.analysis.design.law import advise_law
from sweepmill.analysis.design.place import Advice, Place

__all__ = ["Advice", "Place", "advise_critical_point", "advise_law"]
