"""Data collapse with a smooth scaling function: critical point and exponents with errors that can be defended."""

import json
import math
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any

from sweepmill.analysis.collapse_drift import drift_rows
from sweepmill.analysis.drift import Row, drift_text, excess_spread, first_row
from sweepmill.analysis.estimate import Estimate, finite
from sweepmill.analysis.fitted import Fitted
from sweepmill.analysis.goodness import ACCEPTABLE, Goodness
from sweepmill.analysis.points import Points
from sweepmill.analysis.scaling import Scaling
from sweepmill.analysis.wording import listed

if TYPE_CHECKING:
    from matplotlib.figure import Figure


@dataclass(frozen=True, eq=False)
class Collapse:
    """Result of `fit_collapse`.

    `estimates` by name: `p_c`, `nu`, and where they apply `zeta`, `omega`, `bend` (coefficient of (p - p_c)^2 in the
    scaling field) and `y_star` = f(0). `flags` tell why no errors are quoted, `notes` what a reader should know.
    """

    fitted: Fitted
    estimates: dict[str, Estimate]
    flags: tuple[str, ...]
    notes: tuple[str, ...]
    drift: tuple[Row, ...]
    acceptable: float

    @property
    def goodness(self) -> Goodness:
        """chi^2, degrees of freedom, p-value."""
        return self.fitted.goodness

    @property
    def points(self) -> Points:
        """The data."""
        return self.fitted.points

    def __getitem__(self, name: str) -> Estimate:
        return self.estimates[name]

    def __str__(self) -> str:
        points = self.points
        data = (
            f"Collapse of L = {listed(points.distinct_sizes())} ({len(points)} points, "
            f"{points.x.min():g} <= p <= {points.x.max():g}; {self.fitted.frame.form})"
        )
        values = ", ".join(f"{name} = {estimate}" for name, estimate in self.estimates.items())
        if self.flags:
            return f"{data} is not to be quoted: {'; '.join(self.flags)}; the best fit has {values}."
        return f"{data} gives {values} with {self.goodness}; {self._errors()}."

    def _errors(self) -> str:
        how = (
            f"jackknife over {self.points.folds} folds"
            if self.points.folds
            else "propagated from the errors of the points"
        )
        more = " and include the spread between fits" if self.drift else ""
        return f"errors are {how}{more}"

    def drift_text(self) -> str:
        """The drift table as aligned text."""
        return drift_text(first_row(self.fitted, self.acceptable), self.drift)

    def to_dict(self) -> dict[str, Any]:
        """Everything as plain values, with the keys of the ensembles it rests on."""
        points = self.points
        return {
            "analysis": "collapse",
            "form": str(self.fitted.frame.form),
            "estimates": {name: estimate.to_dict() for name, estimate in self.estimates.items()},
            "chi2": finite(self.goodness.chi2),
            "dof": self.goodness.dof,
            "p_value": finite(self.goodness.p_value),
            "judged_by": self.goodness.kind,
            "flags": list(self.flags),
            "notes": list(self.notes),
            "drift": [row.to_dict() for row in self.drift],
            "sizes": points.distinct_sizes(),
            "points": len(points),
            "folds": points.folds,
            "ensembles": points.ensembles,
        }

    def to_json(self) -> str:
        """`to_dict` as JSON text."""
        return json.dumps(self.to_dict(), indent=1, allow_nan=False)

    def plot(self, path: str | Path | None = None, x_label: str = "p", y_label: str = "y") -> "Figure":
        """Data, collapse, residuals and drift in one figure, written to `path` if given."""
        from sweepmill.analysis.plot_collapse import plot_collapse

        return plot_collapse(self, path, x_label, y_label)


def fit_collapse(
    points: Points, form: Scaling | None = None, acceptable: float = ACCEPTABLE, drift: bool = True
) -> Collapse:
    """Fit y(p, L) to a scaling form.

    Errors are one standard error: by jackknife over the folds, or from the errors of the points (then scaled by
    sqrt(chi^2/dof) where that exceeds 1), with the spread between fits to parts of the data and with other shapes as
    far as noise does not explain it. A fit with p-value below `acceptable` is flagged and has no errors: one right
    fit in 1/acceptable is refused by chance. Raises ValueError for too few sizes or points.
    """
    base = Fitted.of(points, form or Scaling())
    flags = tuple(base.faults(acceptable))
    rows = drift_rows(base, acceptable) if drift else ()
    estimates = {name: _estimate(base, index, name, rows, flags) for index, name in enumerate(base.names)}
    return Collapse(base, estimates, flags, tuple(_notes(base, estimates)), rows, acceptable)


def _estimate(base: Fitted, index: int, name: str, rows: tuple[Row, ...], flags: tuple[str, ...]) -> Estimate:
    scale = 1.0
    if base.replicas is None and base.goodness.dof > 0:
        scale = max(1.0, math.sqrt(base.goodness.ratio))
    statistical = scale * math.sqrt(base.variances[index])
    spread = excess_spread(rows, name, float(base.variances[index]))
    return Estimate(float(base.values[index]), statistical, spread, flags[0] if flags else "")


def _notes(base: Fitted, estimates: dict[str, Estimate]) -> list[str]:
    notes = [base.solution.problem.whitening.note]
    if len(base.points.distinct_sizes()) == 2:
        notes.append("two sizes only: corrections to scaling cannot show")
    if base.goodness.p_value > 1 - 1e-3:
        notes.append("chi2 is smaller than noise allows: are the errors overestimated, or the points correlated?")
    moved = [name for name, one in estimates.items() if one.spread > 2 * one.statistical]
    if moved and not any(one.withheld for one in estimates.values()):
        notes.append(f"{listed(moved)} moved between fits by more than noise: the limit may lie beyond the error bar")
    return [note for note in notes if note]
