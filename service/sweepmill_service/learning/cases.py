"""Ensembles as cases of the regressions: what two of them share, and how near they are to each other."""

import hashlib
import math
import re
from collections.abc import Mapping
from typing import Any, Final

from sweepmill.ensemble import LAYERED, PROGRAM, Ensemble
from sweepmill_service.plan.work import Work

OCTAVES: Final = 1.5
"""Length of memory in sites, in powers of two; half as short as that in layers per site."""
STEEPEST: Final = 6.0
"""Exponents beyond are nearest neighbors in effect."""
DIMENSIONS: Final = 4
"""Coordinates of a place."""
_NUMBER = re.compile(r"-?\d[\d.e-]*")


def variant(ensemble: Ensemble) -> str:
    """What ensembles of one law share whatever their size and rates: family, boundary, state, or a circuit's steps."""
    values = ensemble.parameters
    if ensemble.family == LAYERED:
        return _steps(values)
    kept = ("boundary", "initial_state", "ends", "engine")
    marks = [str(values[name]) for name in kept if name in values]
    return ":".join([ensemble.family, *marks, "references" if ensemble.references else ""])


def _steps(values: Mapping[str, Any]) -> str:
    """A circuit written as data without its numbers, in short."""
    text = _NUMBER.sub("", repr([values.get(part) for part in PROGRAM]))
    return f"{LAYERED}:{values['initial_state']}:{hashlib.sha256(text.encode()).hexdigest()[:16]}"


def place(ensemble: Ensemble, work: Work) -> tuple[float, ...]:
    """Coordinates in lengths of memory: size, rate, depth, range of the gates."""
    exponent = min(float(ensemble.parameters.get("exponent", 0.0)), STEEPEST)
    return (
        math.log2(work.sites) / OCTAVES,
        math.log2(work.rate + 0.03),
        math.log2(work.layers / work.sites) / (2 * OCTAVES),
        exponent / 2,
    )
