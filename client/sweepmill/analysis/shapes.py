"""Smooth functions of one variable, linear in their coefficients: what a scaling function is fitted by."""

from dataclasses import dataclass
from functools import cache
from typing import Protocol

import numpy as np
from scipy.interpolate import CubicSpline

from sweepmill.analysis.arrays import Matrix, Vector


class Shape(Protocol):
    """A family of functions on [-1, 1] and a little beyond."""

    @property
    def coefficients(self) -> int:
        """Number of linear coefficients."""
        ...

    def basis(self, v: Vector) -> Matrix:
        """Values [n, coefficients] of the basis functions at v [n]."""
        ...

    def varied(self) -> "list[Shape]":
        """The next simpler and the next richer shape, as far as there are."""
        ...


@dataclass(frozen=True)
class Polynomial:
    """A polynomial of the given degree, at least 1, in Legendre's basis."""

    degree: int = 3

    def __post_init__(self) -> None:
        if self.degree < 1:
            raise ValueError(f"a scaling function needs degree 1 or more, got {self.degree}")

    @property
    def coefficients(self) -> int:
        """One more than the degree."""
        return self.degree + 1

    def basis(self, v: Vector) -> Matrix:
        """Legendre polynomials, by their recursion."""
        columns = [np.ones_like(v), v]
        for n in range(1, self.degree):
            columns.append(((2 * n + 1) * v * columns[n] - n * columns[n - 1]) / (n + 1))
        return np.stack(columns, axis=1)

    def varied(self) -> list[Shape]:
        """One degree less (down to 2) and one more."""
        return [Polynomial(degree) for degree in (self.degree - 1, self.degree + 1) if degree >= 2]

    def __str__(self) -> str:
        return f"polynomial of degree {self.degree}"


@dataclass(frozen=True)
class NaturalSpline:
    """A natural cubic spline with evenly spaced knots, at least 3, both ends included."""

    knots: int = 6

    def __post_init__(self) -> None:
        if self.knots < 3:
            raise ValueError(f"a natural cubic spline needs 3 knots or more, got {self.knots}")

    @property
    def coefficients(self) -> int:
        """One value per knot."""
        return self.knots

    def basis(self, v: Vector) -> Matrix:
        """Cardinal splines: 1 at one knot and 0 at the others; straight lines beyond the ends."""
        spline, inside = _cardinal(self.knots), np.clip(v, -1.0, 1.0)
        return np.asarray(spline(inside) + (v - inside)[:, None] * spline(inside, 1), dtype=np.float64)

    def varied(self) -> list[Shape]:
        """One knot less (down to 3) and one more."""
        return [NaturalSpline(knots) for knots in (self.knots - 1, self.knots + 1) if knots >= 3]

    def __str__(self) -> str:
        return f"natural cubic spline with {self.knots} knots"


@cache
def _cardinal(knots: int) -> CubicSpline:
    return CubicSpline(np.linspace(-1.0, 1.0, knots), np.eye(knots), bc_type="natural")
