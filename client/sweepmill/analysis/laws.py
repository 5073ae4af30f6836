"""The laws that entropies, times and correlations are compared with: linear combinations of simple functions of x.

Entanglement laws as in Quantum entanglement growth under random unitary dynamics, Phys. Rev. X 7, 031016 (2017), and
Fractal, logarithmic, and volume-law entangled nonthermal steady states via spacetime duality, Phys. Rev. X 12, 011045
(2022).
"""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from sweepmill.analysis.arrays import Vector

# columns of the design from x, the variable of logarithms and powers (x itself or the chord), and the exponent
Terms = Callable[[Vector, Vector, float], list[Vector]]


@dataclass(frozen=True)
class Exponent:
    """A nonlinear parameter: its name and range; `per_x` where it multiplies x, so that the range is in 1/max(x)."""

    name: str
    low: float
    high: float
    per_x: bool = False

    def grid(self) -> list[float]:
        """Starting points well inside the range."""
        if self.per_x:
            return [float(g) for g in np.geomspace(max(self.low, 1e-2) * 3, self.high / 3, 6)]
        return [float(g) for g in np.linspace(self.low, self.high, 7)[1:-1]]


@dataclass(frozen=True)
class Law:
    """A law: `formula` for reading, names of its linear coefficients, its terms, and perhaps one exponent.

    `contains` names the laws that are special or limiting cases of it: they cannot be ruled out against it, only it
    against them. `logarithm` is the name of the coefficient of ln x.
    """

    name: str
    formula: str
    coefficients: tuple[str, ...]
    terms: Terms
    exponent: Exponent | None = None
    contains: tuple[str, ...] = ()
    logarithm: str | None = None

    @property
    def parameters(self) -> int:
        """Number of free parameters."""
        return len(self.coefficients) + (self.exponent is not None)


def _one(x: Vector) -> Vector:
    return np.ones_like(x)


_BETWEEN = Exponent("g", 0.02, 0.98)
_DECAY = Exponent("rate", 1e-4, 500.0, per_x=True)

AREA = Law("area", "a", ("a",), lambda x, r, g: [_one(x)])
LOGARITHM = Law("logarithm", "a ln l + b", ("a", "b"), lambda x, r, g: [np.log(r), _one(x)], None, ("area",), "a")
VOLUME = Law("volume", "s l + b", ("s", "b"), lambda x, r, g: [x, _one(x)], None, ("area",))
VOLUME_LOG = Law(
    "volume + logarithm",
    "s l + c ln l + b",
    ("s", "c", "b"),
    lambda x, r, g: [x, np.log(r), _one(x)],
    None,
    ("area", "logarithm", "volume"),
    "c",
)
VOLUME_POWER = Law(
    "volume + power",
    "s l + c l^g + b",
    ("s", "c", "b"),
    lambda x, r, g: [x, r**g, _one(x)],
    _BETWEEN,
    ("area", "volume", "fractional", "logarithm", "volume + logarithm"),
)
FRACTIONAL = Law(
    "fractional", "a l^g + b", ("a", "b"), lambda x, r, g: [r**g, _one(x)], _BETWEEN, ("area", "logarithm", "volume")
)
ENTANGLEMENT = (AREA, LOGARITHM, VOLUME, VOLUME_LOG, VOLUME_POWER, FRACTIONAL)

BOUNDED = Law("bounded", "a + b exp(-rate t)", ("a", "b"), lambda x, r, k: [_one(x), np.exp(-k * x)], _DECAY)
LOG_GROWTH = Law("logarithmic", "a ln t + b", ("a", "b"), lambda x, r, g: [np.log(x), _one(x)], None, (), "a")
POWER_GROWTH = Law(
    "power", "a t^g + b", ("a", "b"), lambda x, r, g: [x**g, _one(x)], _BETWEEN, ("logarithmic", "linear")
)
LINEAR = Law("linear", "v t + b", ("v", "b"), lambda x, r, g: [x, _one(x)])
GROWTH = (BOUNDED, LOG_GROWTH, POWER_GROWTH, LINEAR)

POWER_DECAY = Law("power law", "a x^-k", ("a",), lambda x, r, k: [r**-k], Exponent("k", 0.02, 8.0))
EXPONENTIAL_DECAY = Law("exponential", "a exp(-rate x)", ("a",), lambda x, r, k: [np.exp(-k * x)], _DECAY)
DECAY = (POWER_DECAY, EXPONENTIAL_DECAY)

TIME_LOG = Law("logarithmic", "a ln L + b", ("a", "b"), lambda x, r, g: [np.log(x), _one(x)], None, (), "a")
TIME_POWER = Law("power", "a L^z", ("a",), lambda x, r, z: [x**z], Exponent("z", 0.05, 6.0))
TIME_EXPONENTIAL = Law(
    "exponential", "a exp(rate L)", ("a",), lambda x, r, k: [np.exp(k * x)], Exponent("rate", 1e-3, 30.0, per_x=True)
)
TIMES = (TIME_LOG, TIME_POWER, TIME_EXPONENTIAL)


def chord_length(x: Vector, ring: float | None) -> Vector:
    """(ring/pi) sin(pi x/ring): what conformal laws on a ring depend on in place of x; x itself without a ring.

    Entanglement entropy and quantum field theory, J. Stat. Mech. P06002 (2004), from memory. Raises ValueError unless
    0 < x < ring.
    """
    if ring is None:
        return x
    if (x <= 0).any() or (x >= ring).any():
        raise ValueError(f"lengths on a ring of {ring:g} sites must lie between 0 and {ring:g}")
    return np.asarray(ring / np.pi * np.sin(np.pi * x / ring))
