"""What else describes data that a scaling form does not: a richer form, fewer sizes, a narrower window."""

from collections.abc import Iterator, Sequence
from dataclasses import replace

import numpy as np

from sweepmill.analysis.collapse import Collapse, fit_collapse
from sweepmill.analysis.law_fit import FittedLaw
from sweepmill.analysis.laws import Law
from sweepmill.analysis.points import Points
from sweepmill.analysis.scaling import Scaling
from sweepmill.analysis.shapes import Polynomial

_RICHER = 5  # degree of the richer polynomial
_STARTS, _FEWEST = 8, 5  # windows tried for laws, points in the last of them


def alternatives(points: Points, form: Scaling) -> tuple[list[str], list[list[str]]] | tuple[()]:
    """Head and rows of a table: options of the command, and what the fit they lead to gives. Empty if none fits."""
    fits = [(options, fit_collapse(some, other, drift=False)) for options, some, other in _choices(points, form)]
    good = [(options, one) for options, one in fits if not one.flags]
    if not good:
        return ()
    names = [name for name in ("p_c", "nu", "zeta") if name in good[0][1].estimates]
    rows = [[options, *(str(one[name]) for name in names), _goodness(one)] for options, one in good]
    return ["options", *names, "chi2/dof"], rows


def later_start(points: Points, laws: Sequence[Law], ring: float | None) -> float | None:
    """The smallest x, of a few tried, from which on some law describes the data; None where there is none."""
    starts: list[float] = sorted(set(points.x.tolist()))[1:]
    for start in starts[:: max(1, len(starts) // _STARTS)]:
        part = points.taken(points.x >= start)
        if len(part) < _FEWEST:
            return None
        if any(not FittedLaw.of(part, law, ring).faults() for law in laws if law.parameters < len(part)):
            return start
    return None


def _goodness(fit: Collapse) -> str:
    return f"{fit.goodness.chi2:.1f}/{fit.goodness.dof:.4g}"


def _choices(points: Points, form: Scaling) -> Iterator[tuple[str, Points, Scaling]]:
    for size_options, some in _fewer_sizes(points):
        for window_options, data in _narrower(some):
            for form_options, other in _forms(form):
                options = " ".join(filter(None, (size_options, window_options, form_options)))
                if options and len(data) > other.parameters() and len(data.distinct_sizes()) > 2:
                    yield options, data, other


def _forms(form: Scaling) -> Iterator[tuple[str, Scaling]]:
    for options, one in (("", form), (f"--degree {_RICHER}", replace(form, shape=Polynomial(_RICHER)))):
        yield options, one
        if not form.corrected:
            yield f"{options} --corrections".strip(), replace(one, corrected=True, omega=None)


def _fewer_sizes(points: Points) -> Iterator[tuple[str, Points]]:
    sizes = points.distinct_sizes()
    yield "", points
    if len(sizes) > 3:
        yield f"--sizes {','.join(f'{size:g}' for size in sizes[1:])}", points.taken(points.sizes > sizes[0])


def _narrower(points: Points) -> Iterator[tuple[str, Points]]:
    """All, and the half of the range of x in its middle, with its ends on values that there are."""
    yield "", points
    low, high = float(points.x.min()), float(points.x.max())
    inside = points.x[np.abs(points.x - (low + high) / 2) <= (high - low) / 4 * (1 + 1e-9)]
    if len(set(inside.tolist())) >= 5:
        a, b = inside.min(), inside.max()
        yield f"--window {a:g} {b:g}", points.taken((points.x >= a) & (points.x <= b))
