"""Where the curves of two sizes cross, and the exponent their slopes give there."""

import math
from dataclasses import dataclass

import numpy as np
from scipy.optimize import brentq

from sweepmill.analysis.arrays import Vector
from sweepmill.analysis.goodness import ACCEPTABLE
from sweepmill.analysis.jackknife import jackknife_error
from sweepmill.analysis.local_curve import LocalCurve
from sweepmill.analysis.points import Points

_GRID = 400  # places at which the difference of two curves is looked at for changes of sign
_NUDGE = 1e-3  # of an error: steps of the numerical derivative by a mean


@dataclass(frozen=True, eq=False)
class Crossing:
    """The crossing of the curves of sizes `small` and `large` at p = `place`, where nu = `nu` by their slopes.

    ln(large/small)/nu is the logarithm of the ratio of slopes (Z. Phys. B 43, 119 (1981), from memory). Errors are one
    standard error; `gradient` [n] is the derivative of the place by every mean, `replicas` [F] the place without each
    fold. `fault` tells what is wrong, if anything.
    """

    small: float
    large: float
    place: float
    place_error: float
    nu: float
    nu_error: float
    gradient: Vector
    replicas: Vector | None
    fault: str


def crossing(points: Points, small: float, large: float, degree: int, acceptable: float = ACCEPTABLE) -> Crossing:
    """The crossing of two sizes by local polynomials. Where there is none, its numbers are nan and `fault` says so."""
    pair = _Pair.of(points, small, large, degree)
    roots = pair.roots()
    if not roots:
        nan, fault = math.nan, "the curves do not cross within the data"
        return Crossing(small, large, nan, nan, nan, nan, np.zeros(len(points)), None, fault)
    center = (pair.low + pair.high) / 2
    place, nu = pair.at(min(roots, key=lambda root: abs(root - center)))
    gradients = _gradients(pair, points, place)
    errors, replicas = np.sqrt(np.sum((gradients * points.error) ** 2, axis=1)), None
    if points.replicas is not None:
        found = np.array([pair.through(y).at(place) for y in points.replicas])
        errors, replicas = jackknife_error(found), found[:, 0]
    fault = pair.fault(acceptable) or ("they cross several times: points are too far or too noisy" if roots[1:] else "")
    return Crossing(small, large, place, float(errors[0]), nu, float(errors[1]), gradients[0], replicas, fault)


@dataclass(frozen=True, eq=False)
class _Pair:
    first: LocalCurve
    second: LocalCurve
    masks: tuple[np.ndarray, np.ndarray]
    ratio: float

    @classmethod
    def of(cls, points: Points, small: float, large: float, degree: int) -> "_Pair":
        masks = (points.sizes == small, points.sizes == large)
        curves = [LocalCurve.of(points.x[m], points.mean[m], points.error[m], degree) for m in masks]
        return cls(curves[0], curves[1], masks, large / small)

    def through(self, y: Vector) -> "_Pair":
        first, second = self.first.through(y[self.masks[0]]), self.second.through(y[self.masks[1]])
        return _Pair(first, second, self.masks, self.ratio)

    @property
    def low(self) -> float:
        return max(self.first.low, self.second.low)

    @property
    def high(self) -> float:
        return min(self.first.high, self.second.high)

    def gap(self, x: float) -> float:
        return self.second.value(x) - self.first.value(x)

    def roots(self) -> list[float]:
        places = np.linspace(self.low, self.high, _GRID)
        gaps = np.array([self.gap(x) for x in places])
        changes = np.flatnonzero(np.sign(gaps[:-1]) * np.sign(gaps[1:]) < 0)
        return [float(brentq(self.gap, places[i], places[i + 1], xtol=1e-15)) for i in changes]

    def at(self, near: float) -> tuple[float, float]:
        """The crossing near a place by a few Newton steps, and nu there."""
        place = near
        for _ in range(4):
            place -= self.gap(place) / (self.second.slope(place) - self.first.slope(place))
        ratio = self.second.slope(place) / self.first.slope(place)
        return place, math.log(self.ratio) / math.log(ratio) if ratio > 0 and ratio != 1 else math.nan

    def fault(self, acceptable: float) -> str:
        worst = min(self.first.p_value, self.second.p_value)
        return f"a local polynomial does not describe its points (p = {worst:.2g})" if worst < acceptable else ""


def _gradients(pair: _Pair, points: Points, place: float) -> Vector:
    """Derivatives [2, n] of the place and of nu by every mean."""
    gradients = np.zeros((2, len(points)))
    for index in np.flatnonzero(pair.masks[0] | pair.masks[1]):
        nudge = np.zeros(len(points))
        nudge[index] = _NUDGE * points.error[index]
        ahead, behind = (np.array(pair.through(points.mean + sign * nudge).at(place)) for sign in (1, -1))
        gradients[:, index] = (ahead - behind) / (2 * nudge[index])
    return gradients
