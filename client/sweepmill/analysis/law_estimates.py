"""Parameters of a law with both parts of their errors."""

import math

from sweepmill.analysis.drift import Row, excess_spread
from sweepmill.analysis.estimate import Estimate
from sweepmill.analysis.law_fit import FittedLaw


def estimates_of(fitted: FittedLaw, rows: tuple[Row, ...], faults: tuple[str, ...]) -> dict[str, Estimate]:
    """Estimates by name; the spread is that of the windows. Errors are withheld where there are faults.

    Without folds, errors are scaled by sqrt(chi^2/dof) where that exceeds 1.
    """
    scale = 1.0
    if fitted.replicas is None and fitted.goodness.dof > 0:
        scale = max(1.0, math.sqrt(fitted.goodness.ratio))
    return {
        name: Estimate(
            float(fitted.values[index]),
            scale * math.sqrt(fitted.variances[index]),
            excess_spread(rows, name, float(fitted.variances[index])),
            faults[0] if faults else "",
        )
        for index, name in enumerate(fitted.names)
    }
