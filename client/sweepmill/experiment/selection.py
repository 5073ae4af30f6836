"""What post-selecting on some outcomes of a record costs."""

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from sweepmill.analysis.estimate import Estimate
from sweepmill.experiment.record import Record


@dataclass(frozen=True)
class Selection:
    """Keeping only the runs with given values of the first k outcomes in time.

    `random` of them are random, so that typically one run in 2^random is kept (log2_runs_per_kept_one), and an
    observable with values between -1 and 1 is known to `precision` after 2^random / precision^2 runs. Any k chosen
    outcomes cost at most 2^min(k, all random ones): `at_most`.
    """

    measurements: int
    random: Estimate
    precision: float
    at_most: float

    @property
    def log2_for_observable(self) -> float:
        """log2 of the runs that an observable takes: 1 / precision^2 kept ones suffice, whatever its variance."""
        return self.random.value - 2 * float(np.log2(self.precision))

    def to_dict(self) -> dict[str, Any]:
        """Plain values."""
        return {
            "measurements": self.measurements,
            "random_among_them": self.random.to_dict(),
            "log2_runs_per_kept_one": self.random.value,
            "log2_runs_for_observable": self.log2_for_observable,
            "precision": self.precision,
            "log2_runs_at_most_for_chosen_ones": self.at_most,
        }


def select_first(records: Sequence[Record], k: int, precision: float) -> Selection | None:
    """From the depths of one ensemble; None where so many measurements are not made, or their number is unknown.

    Between two depths the random ones are counted in proportion. Raises ValueError for other k and precisions.
    """
    if k < 1:
        raise ValueError(f"at least one outcome is selected, got {k}")
    if not 0 < precision < 1:
        raise ValueError(f"a precision lies between 0 and 1, got {precision:g}")
    known = [one for one in records if one.measurements]
    made = np.array([0.0, *(one.measurements or 0.0 for one in known)])
    if not known or k > made[-1]:
        return None
    bits = np.interp(k, made, [0.0, *(one.again.value for one in known)])
    error = np.interp(k, made, [0.0, *(one.again.statistical for one in known)])
    return Selection(k, Estimate(float(bits), float(error)), precision, min(float(k), known[-1].again.value))
