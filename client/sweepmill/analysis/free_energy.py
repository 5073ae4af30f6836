"""The free energy of the measurement record and the effective central charge in its finite-size correction."""

import json
import math
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from sweepmill.analysis.drift import Row, drift_row, drift_text, excess_spread, first_row
from sweepmill.analysis.estimate import Estimate, finite
from sweepmill.analysis.goodness import ACCEPTABLE, Goodness
from sweepmill.analysis.law_drift import law_rows
from sweepmill.analysis.law_fit import FittedLaw
from sweepmill.analysis.laws import Law
from sweepmill.analysis.points import Points
from sweepmill.analysis.wording import listed

if TYPE_CHECKING:
    from matplotlib.figure import Figure

CASIMIR = Law("1/L^2", "f + B L^-2", ("f", "B"), lambda x, r, g: [np.ones_like(x), x**-2.0])
HIGHER = Law("1/L^4", "f + B L^-2 + D L^-4", ("f", "B", "D"), lambda x, r, g: [np.ones_like(x), x**-2.0, x**-4.0])


@dataclass(frozen=True, eq=False)
class CentralCharge:
    """Result of `fit_central_charge`.

    `c_eff` is c times the anisotropy of space and time divided by `anisotropy`; `outcome_randomness` is f at infinite
    size; `free_energy` is -ln P(record) per site and layer there, in nats.
    """

    fitted: FittedLaw
    rate: float
    anisotropy: float
    c_eff: Estimate
    outcome_randomness: Estimate
    free_energy: Estimate
    drift: tuple[Row, ...]
    flags: tuple[str, ...]

    @property
    def goodness(self) -> Goodness:
        """chi^2, degrees of freedom, p-value."""
        return self.fitted.goodness

    def __str__(self) -> str:
        sizes = listed(self.fitted.points.distinct_sizes())
        what = "c_eff" if self.anisotropy != 1 else "c_eff times anisotropy"
        values = f"{what} = {self.c_eff}, free energy of the record {self.free_energy} nats per site and layer"
        if self.flags:
            return f"Record free energy of L = {sizes} is not to be quoted: {'; '.join(self.flags)} ({values})."
        return f"The record free energy of L = {sizes} gives {values}, with {self.goodness}."

    def drift_text(self) -> str:
        """The window scan as aligned text."""
        return drift_text(first_row(self.fitted, ACCEPTABLE), self.drift)

    def plot(
        self, path: str | Path | None = None, x_label: str = "L", y_label: str = "share of random outcomes"
    ) -> "Figure":
        """Data, the line in 1/L^2, residuals and drift in one figure, written to `path` if given."""
        from sweepmill.analysis.plot_central_charge import plot_central_charge

        return plot_central_charge(self, path, x_label, y_label)

    def to_dict(self) -> dict[str, Any]:
        """Everything as plain values, with the keys of the ensembles it rests on."""
        return {
            "analysis": "record free energy",
            "rate": self.rate,
            "anisotropy": self.anisotropy,
            "c_eff": self.c_eff.to_dict(),
            "outcome_randomness": self.outcome_randomness.to_dict(),
            "free_energy": self.free_energy.to_dict(),
            "p_value": finite(self.goodness.p_value),
            "flags": list(self.flags),
            "drift": [row.to_dict() for row in self.drift],
            "ensembles": self.fitted.points.ensembles,
        }

    def to_json(self) -> str:
        """`to_dict` as JSON text."""
        return json.dumps(self.to_dict(), indent=1, allow_nan=False)


def fit_central_charge(
    points: Points, rate: float, anisotropy: float = 1.0, acceptable: float = ACCEPTABLE
) -> CentralCharge:
    """Fit the share f(L) of random outcomes per measurement on a ring at criticality; x is the size.

    With `rate` measurements per site and layer, -ln P(record) per site and layer is rate ln2 f(L), and
    rate ln2 [f(inf) - f(L)] = pi c a / (6 L^2), with a the ratio of the velocities of space and time (Operator scaling
    dimensions and multifractality at measurement-induced transitions, Phys. Rev. Lett. 128, 050602 (2022), from
    memory). Window scan without the smallest sizes, and with a term L^-4. Raises ValueError for fewer than 2 sizes.
    """
    fitted = FittedLaw.of(points, CASIMIR)
    flags = tuple(fitted.faults(acceptable))
    rows = law_rows(fitted, acceptable)
    if len(points) > HIGHER.parameters:
        rows += (drift_row("shape", HIGHER.formula, fitted, FittedLaw.of(points, HIGHER), acceptable),)
    scale = 1.0 if points.folds else max(1.0, math.sqrt(fitted.goodness.ratio)) if fitted.goodness.dof > 0 else 1.0

    def estimate(name: str, factor: float) -> Estimate:
        index = fitted.names.index(name)
        statistical = scale * math.sqrt(fitted.variances[index])
        spread = excess_spread(rows, name, float(fitted.variances[index]))
        value = factor * float(fitted.values[index])
        return Estimate(value, abs(factor) * statistical, abs(factor) * spread, flags[0] if flags else "")

    nats = rate * math.log(2)
    return CentralCharge(
        fitted,
        rate,
        anisotropy,
        estimate("B", -6 * nats / (math.pi * anisotropy)),
        estimate("f", 1.0),
        estimate("f", nats),
        rows,
        flags,
    )
