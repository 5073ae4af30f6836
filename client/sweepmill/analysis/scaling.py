"""The scaling form y = L^(-zeta/nu) [f(u) + L^(-omega) g(u)] with u = (delta + bend delta^2) L^(1/nu), delta = p - p_c.

Corrections to scaling and nonlinear scaling fields as in the literature on phase transitions (common practice).
"""

from dataclasses import dataclass, field

import numpy as np

from sweepmill.analysis.arrays import Matrix, Vector
from sweepmill.analysis.points import Points
from sweepmill.analysis.shapes import Polynomial, Shape

FREE = None  # what a parameter is given as when it is to be fitted
NU = (0.1, 20.0)


@dataclass(frozen=True)
class Scaling:
    """Which scaling form is fitted; a parameter given as None is free.

    `omega` is the exponent of a correction L^(-omega) g(u) with g a polynomial of degree `correction_degree`; it is
    used where `corrected` is true. `nonlinear` adds the square of p - p_c to the scaling field.
    """

    shape: Shape = field(default_factory=Polynomial)
    zeta: float | None = 0.0
    corrected: bool = False
    omega: float | None = 1.0
    correction_degree: int = 1
    nonlinear: bool = False

    def names(self) -> list[str]:
        """Names of the free nonlinear parameters in their order."""
        names = ["p_c", "inverse_nu"]
        names += ["zeta_over_nu"] if self.zeta is None else []
        names += ["omega"] if self.corrected and self.omega is None else []
        return names + (["bend"] if self.nonlinear else [])

    def parameters(self) -> int:
        """Number of all free parameters."""
        return len(self.names()) + self.shape.coefficients + (self.correction_degree + 1 if self.corrected else 0)

    def __str__(self) -> str:
        parts = [str(self.shape)]
        if self.corrected:
            parts.append(f"correction L^-{'omega' if self.omega is None else f'{self.omega:g}'}")
        if self.nonlinear:
            parts.append("nonlinear scaling field")
        return ", ".join(parts)


@dataclass(frozen=True, eq=False)
class Frame:
    """A scaling form on given points: turns parameters into design matrices."""

    form: Scaling
    sizes: Vector
    x: Vector

    @classmethod
    def of(cls, form: Scaling, points: Points) -> "Frame":
        """The frame of the points."""
        return cls(form, points.sizes, points.x)

    def values(self, theta: Vector) -> dict[str, float]:
        """Parameters by name, the fixed ones included."""
        free = dict(zip(self.form.names(), theta.tolist(), strict=True))
        zeta_over_nu = free.get("zeta_over_nu", (self.form.zeta or 0.0) * free["inverse_nu"])
        omega = free.get("omega", self.form.omega or 0.0)
        return {"bend": 0.0, **free, "zeta_over_nu": zeta_over_nu, "omega": omega}

    def scaled(self, theta: Vector, x: Vector, sizes: Vector) -> Vector:
        """The scaling variable u of given places."""
        named = self.values(theta)
        delta = x - named["p_c"]
        return np.asarray(delta * (1 + named["bend"] * delta) * sizes ** named["inverse_nu"])

    def design(self, theta: Vector) -> Matrix:
        """Design matrix [n, k] at the points."""
        return self.design_at(theta, self.x, self.sizes)

    def design_at(self, theta: Vector, x: Vector, sizes: Vector) -> Matrix:
        """Design matrix at other places; u is shifted and stretched to [-1, 1] by the range it has at the points."""
        u = self.scaled(theta, self.x, self.sizes)
        return self._terms(theta, (self.scaled(theta, x, sizes) - _middle(u)) / _half(u), sizes)

    def at_criticality(self, theta: Vector) -> Vector:
        """Row [k] that gives f(0), the value at p_c in the limit of large L (for zeta = 0)."""
        u = self.scaled(theta, self.x, self.sizes)
        row = np.zeros(self.form.parameters() - len(theta))
        row[: self.form.shape.coefficients] = self.form.shape.basis(np.array([-_middle(u) / _half(u)]))[0]
        return row

    def _terms(self, theta: Vector, v: Vector, sizes: Vector) -> Matrix:
        named = self.values(theta)
        terms = [self.form.shape.basis(v)]
        if self.form.corrected:
            lift = (sizes / self.sizes.min()) ** -named["omega"]
            terms.append(lift[:, None] * np.vander(v, self.form.correction_degree + 1, increasing=True))
        # sizes in units of the smallest, so that coefficients keep the size of the data
        lifted = np.hstack(terms) * (sizes[:, None] / self.sizes.min()) ** -named["zeta_over_nu"]
        return np.asarray(lifted, dtype=np.float64)

    def bounds(self) -> tuple[Vector, Vector, Vector]:
        """Lower and upper bounds of the free parameters and the sizes of changes that matter."""
        low, high = float(self.x.min()), float(self.x.max())
        ranges = {
            "p_c": (low, high, high - low),
            "inverse_nu": (1 / NU[1], 1 / NU[0], 0.5),
            "zeta_over_nu": (-5.0, 5.0, 0.5),
            "omega": (0.1, 6.0, 0.5),
            "bend": (-0.5 / (high - low), 0.5 / (high - low), 0.2 / (high - low)),  # u rises with p
        }
        table = np.array([ranges[name] for name in self.form.names()])
        return table[:, 0], table[:, 1], table[:, 2]

    def starts(self) -> list[Vector]:
        """A grid of starting points: p_c within the data, nu between 0.5 and 3."""
        low, high = float(self.x.min()), float(self.x.max())
        others = {"zeta_over_nu": 0.0, "omega": 1.0, "bend": 0.0}
        tail = [others[name] for name in self.form.names()[2:]]
        places = np.linspace(low, high, 9)[1:-1]
        return [np.array([place, slope, *tail]) for place in places for slope in (0.4, 0.75, 1.2, 2.0)]


def _middle(u: Vector) -> float:
    return float(u.max() + u.min()) / 2


def _half(u: Vector) -> float:
    return float(u.max() - u.min()) / 2
