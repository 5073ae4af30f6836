"""The fits that `sweepmill fit` knows by name: what each takes for its abscissa, and what it has to say."""

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, fields
from pathlib import Path
from typing import TYPE_CHECKING, Any, Protocol

import numpy as np

from sweepmill.analysis.alternatives import alternatives, later_start
from sweepmill.analysis.choosing import Choice, Chosen, chosen
from sweepmill.analysis.collapse import fit_collapse
from sweepmill.analysis.compare import Candidate, fit_laws
from sweepmill.analysis.crossings import fit_crossings
from sweepmill.analysis.drift import drift_text, first_row
from sweepmill.analysis.estimate import with_error
from sweepmill.analysis.free_energy import fit_central_charge
from sweepmill.analysis.goodness import ACCEPTABLE
from sweepmill.analysis.laws import DECAY, ENTANGLEMENT, GROWTH, TIMES, Law
from sweepmill.analysis.model_free import fit_model_free
from sweepmill.analysis.points import Points
from sweepmill.analysis.purities import Purities, chosen_purities
from sweepmill.analysis.scaling import Scaling
from sweepmill.analysis.selecting import NotOneCurve
from sweepmill.analysis.shapes import Polynomial
from sweepmill.analysis.times import purification_times
from sweepmill.table import Table
from sweepmill.text import aligned, wrapped

if TYPE_CHECKING:
    from matplotlib.figure import Figure

_FEWEST = 8  # points a curve is thinned to at least


class Result(Protocol):
    """What every fit gives: it prints as a sentence, serializes, and plots itself."""

    def to_json(self) -> str: ...
    def plot(self, path: str | Path | None = None, x_label: str = ..., y_label: str = ...) -> "Figure": ...


@dataclass(frozen=True)
class Options:
    """Settings of the fits; each kind takes those that mean something to it."""

    zeta: float | None = 0.0
    degree: int = 3
    corrections: bool = False
    ring: float | None = None
    threshold: float = 1.0
    rate: float | None = None
    anisotropy: float = 1.0

    def changed(self) -> list[str]:
        """Names of those that are not as by default."""
        plain = Options()
        return [one.name for one in fields(self) if getattr(self, one.name) != getattr(plain, one.name)]

    def form(self) -> Scaling:
        """The scaling form of a collapse."""
        omega = None if self.corrections else 1.0
        return Scaling(Polynomial(self.degree), self.zeta, corrected=self.corrections, omega=omega)


@dataclass(frozen=True, eq=False)
class Report:
    """A result with the tables and notes that belong under its sentence.

    `labels` are those of the axes of its figure where it does not show the data themselves.
    """

    result: Result
    tables: tuple[str, ...] = ()
    notes: tuple[str, ...] = ()
    labels: tuple[str, str] | None = None


@dataclass(frozen=True)
class Kind:
    """A fit: `abscissae` are the columns it takes for x by default, before the only axis there is.

    `settings` are the options that mean something to it.
    """

    what: str
    run: Callable[[Chosen, Options], Report]
    settings: tuple[str, ...] = ()
    abscissae: tuple[str, ...] = ()
    choose: Callable[[Table, Choice, tuple[str, ...]], Chosen] = chosen


def _collapse(data: Chosen, options: Options) -> Report:
    result = fit_collapse(data.points, options.form())
    others = alternatives(data.points, options.form()) if result.flags else ()
    more = (f"These choices do describe the data:\n{aligned(*others)}",) if others else ()
    advice = ("Choose by what is known of the data, not by the answer, and quote the spread.",) if others else ()
    return Report(result, (result.drift_text(), *more), (*result.notes, *advice))


def _crossings(data: Chosen, options: Options) -> Report:
    result = fit_crossings(data.points, options.degree, None if options.corrections else 1.0)
    rows = [[what, str(p_c)] for what, p_c in result.drift]
    drift = (aligned(["fit", "p_c"], rows),) if rows else ()
    hint = "where a local polynomial does not describe its points, a narrower --window or a higher --degree helps"
    return Report(result, (result.text(), *drift), (hint,) if any(one.fault for one in result.table) else ())


def _model_free(data: Chosen, options: Options) -> Report:
    result = fit_model_free(data.points, options.zeta)
    return Report(result, (result.text(),) if result.windows else ())


def _law(data: Chosen, options: Options) -> Report:
    points, notes = _half_ring(_one_curve(data, "position"), data, options.ring)
    return _compared(points, data.x, ENTANGLEMENT, options.ring, notes)


def _growth(data: Chosen, _: Options) -> Report:
    return _compared(_one_curve(data, "layer"), data.x, GROWTH)


def _decay(data: Chosen, options: Options) -> Report:
    points, notes = _half_ring(_one_curve(data, "position"), data, options.ring)
    return _compared(points, data.x, DECAY, options.ring, notes)


def _times(data: Chosen, options: Options) -> Report:
    times = purification_times(data.points, options.threshold)
    rows = [[f"{size:g}", with_error(*one)] for size, *one in zip(times.sizes, times.mean, times.error, strict=True)]
    left = sorted(set(data.points.distinct_sizes()) - set(times.distinct_sizes()))
    notes = tuple(f"L = {size:g} gives no time: its curve does not cross the threshold" for size in left)
    report = _compared(times, "L", TIMES, None, notes)
    left_over = "1 bit is" if options.threshold == 1 else f"{options.threshold:g} bits are"
    labels = "L", f"layers until {left_over} left"
    return Report(report.result, (aligned(labels, rows), *report.tables), report.notes, labels)


def _central_charge(data: Chosen, options: Options) -> Report:
    rate = options.rate if options.rate is not None else _measured(data)
    result = fit_central_charge(data.points, rate, options.anisotropy)
    return Report(result, (result.drift_text(),))


def _purity(data: Chosen, _: Options) -> Report:
    result = Purities.of(data)
    return Report(result, (result.text(),))


KINDS: Mapping[str, Kind] = {
    one.what: one
    for one in (
        Kind("collapse", _collapse, ("zeta", "degree", "corrections")),
        Kind("crossings", _crossings, ("degree", "corrections")),
        Kind("model-free", _model_free, ("zeta",)),
        Kind("law", _law, ("ring",), ("position", "sites")),
        Kind("growth", _growth, (), ("layer",)),
        Kind("times", _times, ("threshold",), ("layer",)),
        Kind("decay", _decay, ("ring",), ("position", "sites")),
        Kind("central-charge", _central_charge, ("rate", "anisotropy"), ("sites",)),
        Kind("purity", _purity, (), ("position",), chosen_purities),
    )
}


def _compared(
    points: Points, x: str, laws: Sequence[Law], ring: float | None = None, notes: tuple[str, ...] = ()
) -> Report:
    few, thinned = _few(points, x)
    result = fit_laws(few, laws, ring)
    best = result.shown
    rows = [[one.name, one.fitted.law.formula, _parameters(one), *_fit(one)] for one in result.candidates]
    table = aligned(["law", "formula", "parameters", "chi2/dof", "p", "weight"], rows)
    scan = f"{best.name} in windows:\n{drift_text(first_row(best.fitted, ACCEPTABLE), best.drift)}"
    start = later_start(few, laws, ring) if all(one.faults for one in result.candidates) else None
    more = () if start is None else (_from(start, few, laws, ring),)
    return Report(result, (table, scan, *more), (*result.notes, *thinned, *notes))


def _from(start: float, points: Points, laws: Sequence[Law], ring: float | None) -> str:
    later = fit_laws(points.taken(points.x >= start), laws, ring)
    return f"With --window {start:g} {points.x.max():g}:\n{wrapped(str(later))}"


def _parameters(candidate: Candidate) -> str:
    """Without errors where they are withheld; the coefficient of log2 is left to the sentence."""
    found = ((n, v) for n, v in candidate.estimates.items() if not n.endswith("_log2"))
    return ", ".join(f"{name} = {f'{one.value:.4g}' if one.withheld else one}" for name, one in found)


def _fit(candidate: Candidate) -> list[Any]:
    goodness = candidate.fitted.goodness
    return [f"{goodness.chi2:.1f}/{goodness.dof:.4g}", f"{goodness.p_value:.2g}", f"{candidate.weight:.2g}"]


def _one_curve(data: Chosen, within: str) -> Points:
    """The points, if they are one curve: along `within` an ensemble, several sizes are several curves."""
    sizes = data.points.distinct_sizes()
    if data.x == within and len(sizes) > 1:
        shown = ", ".join(f"{size:g}" for size in sizes)
        raise NotOneCurve(f"there is one curve for each size: choose one of {shown} with --sizes")
    return data.points


def _half_ring(points: Points, data: Chosen, ring: float | None) -> tuple[Points, tuple[str, ...]]:
    """Positions up to half a ring, beyond which the same intervals come again, with a note where they are."""
    size = ring or float(points.sizes[0])
    if data.x != "position" or not (ring or data.table.constants.get("boundary") == "periodic"):
        return points, ()
    advice = () if ring else (f"the chain is a ring: --ring {size:g} takes chords for lengths",)
    return points.taken(points.x <= size / 2), advice


def _few(points: Points, x: str) -> tuple[Points, tuple[str, ...]]:
    """So few points of an ensemble that its folds can whiten them, and a note where some were left out."""
    largest, most = int(np.bincount(points.blocks()).max()), points.folds // 4
    if largest <= points.folds // 2 or most < _FEWEST or (points.x <= 0).any():
        return points, ()
    few = points.thinned(most)
    return few, (f"{len(few)} of {len(points)} values of {x} are fitted: {points.folds} folds whiten no more",)


def _measured(data: Chosen) -> float:
    table = data.table
    values = set(table.values("measurement_rate")) if "measurement_rate" in table else set()
    values |= {table.constants["measurement_rate"]} if "measurement_rate" in table.constants else set()
    if len(values) != 1:
        raise NotOneCurve("the number of measurements per site and layer is not known: give it with --rate")
    return float(values.pop())
