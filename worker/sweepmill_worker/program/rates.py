"""Rates and weights as integers: thresholds in units of 2**-32, weights in units of the largest one / 2**30.

A profile becomes a table by site or by layer; quenched disorder a rule that turns one word into an integer.

Power-law disorder, density ~ r**a on (0, largest]: a word w stands for r = largest * ((w + 1) / 2**32) ** g with
g = 1 / (a + 1).  The function is tabulated at the words w + 1 = 0 .. 255 and, above, at 256 points in every octave, and
interpolated linearly between them, so that small rates keep their relative precision: it is below |g (g - 1)| 2**-19
(apart from the unit in which rates are resolved).  Nodes come from decimal arithmetic and the rest is integers, so
that all machines get the same rates.
"""

from collections.abc import Callable, Mapping
from fractions import Fraction
from typing import Any, Final

import numpy as np
from numpy.typing import NDArray

from sweepmill_worker.program.exact import cosine, exact, floor_times, power
from sweepmill_worker.program.tables import (
    ALWAYS,
    BY_DISORDER,
    BY_LAYER,
    BY_SITE,
    POWER_LAW,
    TWO_VALUED,
    UNIFORM,
)

PROBABILITY: Final = Fraction(2**32)
"""Scale of a rate: something happens iff a word is below the threshold."""
WEIGHT: Final = Fraction(2**30)
"""Scale of the largest weight of a choice."""
NODES: Final = 256 + 24 * 256 + 1
"""Nodes of a power law: one per word below 256, 256 in each of the octaves 8 .. 31, and 2**32 itself."""

Spec = float | Mapping[str, Any]


def largest(spec: Spec) -> Fraction:
    """A bound that a rate or weight never exceeds: the largest number it may give."""
    if not isinstance(spec, Mapping):
        return exact(spec)
    match spec.get("profile", spec.get("disorder")):
        case "list" | "two-valued":
            return max(exact(value) for value in spec["values"])
        case "stripe":
            return max(exact(spec["inside"]), exact(spec["outside"]))
        case "quasi-periodic":
            return exact(spec["mean"]) + abs(exact(spec["amplitude"]))
        case "uniform":
            return exact(spec["to"])
        case "power-law":
            return exact(spec["largest"])
    raise ValueError(f"unknown profile or disorder in {dict(spec)}")


def profile(spec: Mapping[str, Any], length: int) -> tuple[Callable[[int], Fraction], int]:
    """The value as a function of the index, and after how many indices it repeats (`length` if never before)."""
    match spec["profile"]:
        case "list":
            values = [exact(value) for value in spec["values"]]
            origin = 1 if spec["by"] == "layer" else 0  # the first value is that of the first layer
            return lambda index: values[(index - origin) % len(values)], min(len(values), length)
        case "stripe":
            period, inside, outside = int(spec["period"]), exact(spec["inside"]), exact(spec["outside"])
            return lambda index: inside if index % period < spec["width"] else outside, min(period, length)
        case _:
            mean, amplitude, phase = (exact(spec[name]) for name in ("mean", "amplitude", "phase"))
            wavelength = exact(spec["wavelength"])
            return lambda index: mean + amplitude * cosine(index / wavelength + phase), length


class Levels:
    """All rates and weights of a circuit, collected step by step."""

    def __init__(self, sites: int) -> None:
        self.sites = sites
        self.levels: list[int] = []
        self.disorder: list[list[int]] = []
        self.curves: list[NDArray[np.int64]] = []
        self.drawn = 0

    def add(self, spec: Spec, scale: Fraction, places: int, layers: int) -> tuple[int, int, int]:
        """(mode, position, period) of a rate or weight of a step with `places` places in one of `layers` layers.

        Raises ValueError for a negative number and for a rate above 1.
        """
        if not isinstance(spec, Mapping):
            if spec == 1 and scale == PROBABILITY:
                return ALWAYS, 0, 1
            return BY_LAYER, self._table([exact(spec)], scale), 1
        if "disorder" in spec:
            return BY_DISORDER, self._quenched(spec, scale, places), 1
        if spec["by"] == "site":
            value, _ = profile(spec, self.sites)
            return BY_SITE, self._table([value(site) for site in range(self.sites)], scale), 1
        value, period = profile(spec, max(layers, 1))
        return BY_LAYER, self._table([value(layer) for layer in range(1, period + 1)], scale), period

    def _table(self, values: list[Fraction], scale: Fraction) -> int:
        at = len(self.levels)
        self.levels += [self._level(value, scale) for value in values]
        return at

    def _level(self, value: Fraction, scale: Fraction) -> int:
        if value < 0 or (scale == PROBABILITY and value > 1):
            raise ValueError(f"a rate is a probability and a weight is not negative, got {float(value)}")
        return floor_times(value, scale)

    def _quenched(self, spec: Mapping[str, Any], scale: Fraction, places: int) -> int:
        law, low, span, split, curve = self._law(spec, scale)
        at = self.drawn
        self.disorder.append([0, places, at, law, low, span, split, curve])
        self.drawn += places
        return at

    def _law(self, spec: Mapping[str, Any], scale: Fraction) -> tuple[int, int, int, int, int]:
        """(law, lowest level, range of levels, threshold of the first value, row of the curve)."""
        if spec["disorder"] == "power-law":
            self.curves.append(power_law(exact(spec["exponent"]), self._level(exact(spec["largest"]), scale)))
            return POWER_LAW, 0, 0, 0, len(self.curves) - 1
        ends = (spec["from"], spec["to"]) if spec["disorder"] == "uniform" else spec["values"]
        first, second = (self._level(exact(value), scale) for value in ends)
        if spec["disorder"] == "uniform":
            if second < first:
                raise ValueError(f"uniform disorder goes from the smaller number to the larger one, got {dict(spec)}")
            return UNIFORM, first, second - first, 0, 0
        return TWO_VALUED, second, first - second, self._level(exact(spec["weight"]), PROBABILITY), 0


def power_law(exponent: Fraction, top: int) -> NDArray[np.int64]:
    """int64[NODES]: floor(top * u ** (1 / (exponent + 1))) at the nodes u.  Raises ValueError unless exponent > -1."""
    if exponent <= -1:
        raise ValueError(f"a power law near zero has an exponent above -1, got {float(exponent)}")
    nodes = [*range(256), *((256 + part) << octave for octave in range(24) for part in range(256)), 2**32]
    inverse = 1 / (exponent + 1)
    return np.array([floor_times(power(Fraction(node, 2**32), inverse), Fraction(top)) for node in nodes], np.int64)
