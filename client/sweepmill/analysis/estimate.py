"""A number with the parts of its error, and how it is written."""

import math
from dataclasses import dataclass
from typing import Any

from sweepmill.text import with_error as with_error


@dataclass(frozen=True)
class Estimate:
    """One quantity from a fit.

    `statistical` is the error from the noise of the data, `spread` what different cuts of the data and shapes of the
    function disagree by beyond that noise. `withheld` tells why no error may be quoted, empty where one may.
    """

    value: float
    statistical: float
    spread: float = 0.0
    withheld: str = ""

    @property
    def error(self) -> float | None:
        """Both parts together, one standard error; None where it is withheld or unknown."""
        total = math.hypot(self.statistical, self.spread)
        return None if self.withheld or not math.isfinite(total) else total

    def sigmas_from(self, value: float, error: float = 0.0) -> float:
        """How many combined standard errors the estimate lies above `value`. Raises ValueError without an error."""
        if self.error is None:
            raise ValueError(f"the error is withheld: {self.withheld or 'it is unknown'}")
        return (self.value - value) / math.hypot(self.error, error)

    def __str__(self) -> str:
        return f"{self.value:.5g} (no error bar)" if self.error is None else with_error(self.value, self.error)

    def to_dict(self) -> dict[str, Any]:
        """Plain values; None for what is withheld or not finite."""
        return {
            "value": finite(self.value),
            "error": None if self.error is None else self.error,
            "statistical": None if self.withheld else finite(self.statistical),
            "spread": None if self.withheld else finite(self.spread),
            "withheld": self.withheld or None,
        }


def finite(value: float) -> float | None:
    """The value, or None where JSON has no number for it."""
    return float(value) if math.isfinite(value) else None
