"""What values of circuit fields pass: alone, and together."""

from collections.abc import Callable
from decimal import Decimal
from typing import Any, NamedTuple

from sweepmill.families.fields import PerSide, PerSite
from sweepmill.language.rates import SMALLEST_RATE, exponent_fault


class Check(NamedTuple):
    """A condition between the values of some fields; ``message`` says what is wrong with them, or None."""

    blamed: str
    fields: tuple[str, ...]
    message: Callable[..., str | None]


def _sites(value: float) -> str | None:
    if value % 1 or value < 2:
        return f"a chain has an integer number of sites, at least 2, got {value}"
    return None


def _side(value: float | None) -> str | None:
    if value is not None and (value % 1 or value < 2):
        return f"a lattice has an integer number of sites on a side, at least 2, got {value}"
    return None


def _rate(value: float) -> str | None:
    if not 0 <= value <= 1:
        return f"a rate is a probability between 0 and 1, got {value}"
    if 0 < value < SMALLEST_RATE:
        return f"a rate is 0 or at least {SMALLEST_RATE:g} (it is resolved to 2^-32), got {value}"
    return None


def _bond_rate(value: float) -> str | None:
    """X is measured at the complement, which is resolved no finer."""
    rest = 1 - Decimal(repr(value))
    if 0 < rest < Decimal(repr(SMALLEST_RATE)):
        return f"1 - bond_rate is a rate, too: 0 or at least {SMALLEST_RATE:g} (it is resolved to 2^-32), got {rest:g}"
    return _rate(value)


def _layers(value: Any) -> str | None:
    return None if isinstance(value, PerSite | PerSide) else _integer(value, 1)


def _integer(value: float, least: int) -> str | None:
    return f"must be an integer, at least {least}, got {value}" if value % 1 or value < least else None


RANGES: dict[str, Callable[[Any], str | None]] = {
    "sites": _sites,
    "width": _side,
    "height": _side,
    "measurement_rate": _rate,
    "bond_rate": _bond_rate,
    "exponent": exponent_fault,
    "references": lambda value: _integer(value, 0),
    "scrambling_layers": lambda value: _integer(value, 0),
    "layers": _layers,
    "replicate": lambda value: _integer(value, 0),
}
"""What is wrong with a single value of a field; fields that are not here pass with every value of their type."""


def even_ring(sites: int, boundary: str) -> str | None:
    """Brickwork on a ring alternates."""
    if boundary == "periodic" and sites % 2:
        return f"periodic brickwork needs an even number of sites, got {sites}"
    return None


def even(what: str) -> Callable[[int], str | None]:
    """A check of an even number of sites."""
    return lambda sites: f"{what} needs an even number of sites, got {sites}" if sites % 2 else None


def even_side(side: int | None, boundary: str) -> str | None:
    """The same in each direction of a lattice."""
    if side is not None and boundary == "periodic" and side % 2:
        return f"a periodic lattice needs even sides, got {side}"
    return None


def enough_sites(references: int, sites: int) -> str | None:
    """Each reference qubit belongs to a site of its own."""
    return f"{sites} sites take at most {sites} reference qubits, got {references}" if references > sites else None
