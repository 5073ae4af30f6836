"""Exact and reproducible numbers: every machine must turn a rate into the same multiple of 2**-32.

Numbers of a circuit mean the decimal that is written, not the binary float next to it.  Irrational ones are computed
to 50 decimal digits by decimal arithmetic, whose results do not depend on the machine.
"""

from decimal import Context, Decimal
from fractions import Fraction
from functools import lru_cache
from typing import Final

_DIGITS: Final = Context(prec=50)
_TWO_PI: Final = Decimal("6.28318530717958647692528676655900576839433879875021164195")


def exact(number: float) -> Fraction:
    """The decimal number that is written."""
    return Fraction(Decimal(repr(number)))


def rounded(fraction: Fraction) -> Decimal:
    """To 50 digits."""
    return _DIGITS.divide(Decimal(fraction.numerator), Decimal(fraction.denominator))


def cosine(turns: Fraction) -> Fraction:
    """cos(2 pi turns) to about 48 digits: the phase reduced to a quarter turn, then the power series."""
    turn = turns % 1
    folded = min(turn, 1 - turn)
    sign, folded = (1, folded) if folded <= Fraction(1, 4) else (-1, Fraction(1, 2) - folded)
    square = _DIGITS.power(_DIGITS.multiply(_TWO_PI, rounded(folded)), 2)
    term = total = Decimal(1)
    order = 0
    while abs(term) > Decimal("1e-50"):
        order += 2
        term = _DIGITS.divide(_DIGITS.multiply(term, -square), Decimal(order * (order - 1)))
        total = _DIGITS.add(total, term)
    return sign * max(Fraction(0), min(Fraction(1), Fraction(total)))


@lru_cache(maxsize=2**16)
def power(base: Fraction, exponent: Fraction) -> Fraction:
    """base ** exponent to about 50 digits, for base >= 0 (0 ** 0 = 1)."""
    if exponent == 0:
        return Fraction(1)
    if base == 0:
        return Fraction(0)
    return Fraction(_DIGITS.power(rounded(base), rounded(exponent)))


def floor_times(value: Fraction, scale: Fraction) -> int:
    """floor(value * scale)."""
    return int(value * scale // 1)
