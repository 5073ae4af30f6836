"""Which law do the data follow: weights, a verdict, and where there is none what would give one."""

import json
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any

from sweepmill.analysis.drift import Row
from sweepmill.analysis.estimate import Estimate, finite
from sweepmill.analysis.goodness import ACCEPTABLE, weights
from sweepmill.analysis.law_drift import LogSlope, law_rows, log_slopes, slopes_text, window_text
from sweepmill.analysis.law_estimates import estimates_of
from sweepmill.analysis.law_fit import FittedLaw
from sweepmill.analysis.laws import ENTANGLEMENT, GROWTH, Law
from sweepmill.analysis.points import Points
from sweepmill.analysis.tell import DECISIVE, Need, what_would_tell

if TYPE_CHECKING:
    from matplotlib.figure import Figure

_AS_GOOD = 2.72  # ratio of weights at a difference of 2 in AICc: no reason to prefer the heavier (common practice)


@dataclass(frozen=True, eq=False)
class Candidate:
    """One law on the data: its weight among those compared, its estimates, its window scan and its faults."""

    fitted: FittedLaw
    weight: float
    estimates: dict[str, Estimate]
    drift: tuple[Row, ...]
    faults: tuple[str, ...]

    @property
    def name(self) -> str:
        """Name of the law."""
        return self.fitted.law.name

    def __getitem__(self, name: str) -> Estimate:
        return self.estimates[name]

    def __str__(self) -> str:
        values = ", ".join(f"{name} = {estimate}" for name, estimate in self.estimates.items())
        return f"{self.name} ({self.fitted.law.formula}): {values}; {self.fitted.goodness}; weight {self.weight:.2g}"

    def to_dict(self) -> dict[str, Any]:
        """Plain values."""
        goodness = self.fitted.goodness
        return {
            "law": self.name,
            "formula": self.fitted.law.formula,
            "estimates": {name: estimate.to_dict() for name, estimate in self.estimates.items()},
            "chi2": finite(goodness.chi2),
            "dof": goodness.dof,
            "p_value": finite(goodness.p_value),
            "judged_by": goodness.kind,
            "weight": self.weight,
            "faults": list(self.faults),
            "drift": [row.to_dict() for row in self.drift],
        }


@dataclass(frozen=True, eq=False)
class Comparison:
    """Result of `fit_laws`: all candidates, heaviest first, and the verdict (None: cannot tell, or none fits).

    `needs` name what would tell the undecided laws apart. `slopes` are the slopes by ln x between points.
    """

    points: Points
    candidates: tuple[Candidate, ...]
    verdict: str | None
    needs: tuple[Need, ...]
    slopes: tuple[LogSlope, ...]
    notes: tuple[str, ...]

    def __getitem__(self, law: str) -> Candidate:
        return next(one for one in self.candidates if one.name == law)

    @property
    def best(self) -> Candidate:
        """The heaviest law, whether or not it is the verdict."""
        return self.candidates[0]

    @property
    def shown(self) -> Candidate:
        """The verdict, or the heaviest law where there is none."""
        return self[self.verdict] if self.verdict else self.best

    def __str__(self) -> str:
        data = f"{len(self.points)} points, {self.points.x.min():g} <= x <= {self.points.x.max():g}"
        if self.verdict:
            said = f"The data ({data}) follow the law {self.shown}."
        elif all(one.faults for one in self.candidates):
            said = f"None of the laws describes the data ({data}); the least bad is {self.best}."
        else:
            said = f"The data ({data}) cannot tell. " + "; ".join(map(str, self._open())) + "."
            said += " To tell: " + "; ".join(map(str, self.needs)) + "." if self.needs else ""
        return " ".join([said, *self._drift_statement()])

    def _open(self) -> list[Candidate]:
        return [one for one in self.candidates if not one.faults and one.weight * DECISIVE > self.best.weight]

    def _drift_statement(self) -> list[str]:
        said = [window_text(one.fitted, one.drift) for one in self._open() if one.fitted.law.logarithm]
        if any(one.fitted.law.coefficients == ("a", "b") and one.fitted.law.logarithm for one in self._open()):
            said.append(slopes_text(self.slopes))
        return said + (["A logarithm at finite size is not evidence of a phase."] if said else [])

    def text(self) -> str:
        """All candidates, one a line."""
        return "\n".join(f"{one}{''.join(f'; {fault}' for fault in one.faults)}" for one in self.candidates)

    def to_dict(self) -> dict[str, Any]:
        """Everything as plain values, with the keys of the ensembles it rests on."""
        return {
            "analysis": "laws",
            "verdict": self.verdict,
            "candidates": [one.to_dict() for one in self.candidates],
            "needs": [vars(need) for need in self.needs],
            "log_slopes": [vars(slope) for slope in self.slopes],
            "notes": list(self.notes),
            "points": len(self.points),
            "folds": self.points.folds,
            "ensembles": self.points.ensembles,
        }

    def to_json(self) -> str:
        """`to_dict` as JSON text."""
        return json.dumps(self.to_dict(), indent=1, allow_nan=False)

    def plot(self, path: str | Path | None = None, x_label: str = "l", y_label: str = "S (bits)") -> "Figure":
        """Data with the laws that describe them, residuals and drift in one figure, written to `path` if given."""
        from sweepmill.analysis.plot_laws import plot_laws

        return plot_laws(self, path, x_label, y_label)


def fit_laws(
    points: Points, laws: Sequence[Law] = ENTANGLEMENT, ring: float | None = None, acceptable: float = ACCEPTABLE
) -> Comparison:
    """Compare the means, as a function of x, with several laws.

    Weights are exp(-AICc/2) on whitened residuals. Laws count if they describe the data (p-value at least
    `acceptable`) and are not lighter than the heaviest by a factor of 20. The verdict is the simplest of them if all
    others contain it as a special case and it is about as heavy as the heaviest (AICc within 2); else there is none.
    `ring`: logarithms and powers take the chord length on a ring of so many sites. Raises ValueError if x is not
    positive or no law has fewer parameters than there are points.
    """
    usable = [law for law in laws if law.parameters <= len(points)]
    if not usable:
        raise ValueError(f"{len(points)} points are too few for any of the laws")
    fits = [FittedLaw.of(points, law, ring) for law in usable]
    shares = weights([fit.information for fit in fits])
    order = sorted(
        range(len(fits)), key=lambda i: (bool(fits[i].faults(acceptable)), -shares[i], fits[i].goodness.chi2)
    )
    candidates = tuple(_candidate(fits[i], shares[i], acceptable) for i in order)
    verdict, needs = _decide(candidates)
    note = fits[0].solution.problem.whitening.note
    return Comparison(points, candidates, verdict, needs, log_slopes(points, ring), (note,) if note else ())


def fit_growth(points: Points, acceptable: float = ACCEPTABLE) -> Comparison:
    """Compare growth in time (x, in layers): bounded, logarithmic, a power, or linear with its velocity v."""
    return fit_laws(points, GROWTH, None, acceptable)


def _candidate(fitted: FittedLaw, weight: float, acceptable: float) -> Candidate:
    faults = tuple(fitted.faults(acceptable))
    rows = law_rows(fitted, acceptable)
    return Candidate(fitted, weight, estimates_of(fitted, rows, faults), rows, faults)


def _decide(candidates: tuple[Candidate, ...]) -> tuple[str | None, tuple[Need, ...]]:
    best = candidates[0]
    if best.faults:
        return None, ()
    near = [one for one in candidates if not one.faults and one.weight * DECISIVE > best.weight]
    for one in sorted(near, key=lambda each: each.fitted.law.parameters):
        others = [other for other in near if other is not one]
        if one.weight * _AS_GOOD >= best.weight and all(one.name in other.fitted.law.contains for other in others):
            return one.name, ()
    against = [one for one in near[1:] if best.name not in one.fitted.law.contains]
    return None, tuple(what_would_tell(best.fitted, one.fitted) for one in against)
