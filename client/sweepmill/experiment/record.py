"""What seeing one record again costs, at one depth of one ensemble."""

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np

from sweepmill.analysis.estimate import Estimate, finite
from sweepmill.experiment.birthday import log2_until_repeated
from sweepmill.experiment.counted import measurements_until
from sweepmill.experiment.spots import Spot

LOW, HIGH = 0.05, 0.95
_NORMAL = 1.6448536269514722  # the 95 % quantile of a standard normal deviate


@dataclass(frozen=True)
class Band:
    """Median and the middle nine tenths of the random outcomes over trajectories; `exact` if from a histogram."""

    low: float
    median: float
    high: float
    exact: bool


@dataclass(frozen=True)
class Record:
    """Cost of the record of one ensemble at one depth; repetitions as log2.

    `again`: until a given record is met again, typically: log2 of 2^r averaged over trajectories, which is E[r] itself.
    `mean_of_power`: log2 E[2^r] and `from_few`, the share that a hundredth of the trajectories carries; None without a
    histogram. `any_twice`: until any record of a fixed circuit occurs twice. `measurements` made on average, and the
    `random` share of them (None where the circuit does not tell). `sites` is None where only files were given.
    """

    key: str
    labels: Mapping[str, Any]
    layer: int | None
    trajectories: int
    again: Estimate
    band: Band
    any_twice: Estimate
    mean_of_power: Estimate | None
    from_few: float | None
    measurements: float | None
    random: Estimate | None
    sites: int | None = None

    def to_dict(self) -> dict[str, Any]:
        """Plain values."""
        return {
            "ensemble": self.key,
            **self.labels,
            "sites": self.sites if self.sites is not None else self.labels.get("sites"),
            "layer": self.layer,
            "trajectories": self.trajectories,
            "random_outcomes": self.again.to_dict(),
            "median": self.band.median,
            "quantiles": {str(LOW): self.band.low, str(HIGH): self.band.high},
            "quantiles_from": "histogram" if self.band.exact else "variance",
            "log2_repetitions_again": finite(self.again.value),
            "log2_repetitions_any_twice": self.any_twice.to_dict(),
            "log2_mean_repetitions": None if self.mean_of_power is None else self.mean_of_power.to_dict(),
            "carried_by_a_hundredth": self.from_few,
            "measurements": self.measurements,
            "random_share": None if self.random is None else self.random.to_dict(),
        }


def record_of(spot: Spot) -> Record:
    """The cost at one depth."""
    power, few = (None, None) if spot.law is None else spot.law.log2_mean_power()
    known = spot.ensemble is not None and spot.layer is not None
    measured = measurements_until(spot.ensemble, spot.layer) if known and spot.ensemble and spot.layer else None
    random = Estimate(spot.bits.value / measured, spot.bits.statistical / measured) if measured else None
    any_twice = _any_twice(spot)
    place = spot.key, spot.labels, spot.layer, spot.trajectories
    sites = None if spot.ensemble is None else spot.ensemble.sites
    return Record(*place, spot.bits, _band(spot), any_twice, power, few, measured, random, sites)


def _band(spot: Spot) -> Band:
    """From the histogram; without one, from the variance, as if the number were normal."""
    if spot.law is not None:
        low, median, high = (float(spot.law.quantile(share)) for share in (LOW, 0.5, HIGH))
        return Band(low, median, high, exact=True)
    middle, half = spot.bits.value, _NORMAL * spot.deviation
    return Band(max(0.0, middle - half), middle, middle + half, exact=False)


def _any_twice(spot: Spot) -> Estimate:
    """Mean over trajectories of the log2; without a histogram at the mean, where the log2 is nearly linear."""
    if spot.law is not None:
        return spot.law.mean(log2_until_repeated)
    return Estimate(float(log2_until_repeated(np.array([spot.bits.value]))[0]), spot.bits.statistical / 2)
