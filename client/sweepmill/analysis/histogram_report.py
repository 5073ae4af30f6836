"""What `sweepmill histogram` shows: distributions of one observation, compared, as text, as a file, as a figure."""

import math
from collections.abc import Iterator
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any, Self

from sweepmill.analysis.distribution import Distribution
from sweepmill.analysis.estimate import with_error
from sweepmill.analysis.plot_distributions import plot_distributions
from sweepmill.analysis.random_states import ExactLaw, stabilizer_law_of
from sweepmill.analysis.same_law import against_law, between
from sweepmill.errors import SweepmillError
from sweepmill.sweep import NamedObservation, Sweep
from sweepmill.table_files import write_columns
from sweepmill.text import aligned, count, short

FULLY_SHOWN = 4  # distributions whose values are listed; of more only one line each


@dataclass(frozen=True)
class Report:
    """Distributions of one observation of a sweep; `laws` has one for each, or none."""

    sweep: str
    specification: Sweep
    item: NamedObservation
    found: tuple[Distribution, ...]
    laws: tuple[ExactLaw, ...] = ()

    def chosen(self, conditions: list[str]) -> Self:
        """Those that fulfil conditions such as ``sites=64``.

        Raises KeyError with the names there are for another name, SweepmillError where none fits.
        """
        kept = self.found
        for text in conditions:
            name, _, wanted = text.partition("=")
            names = list(dict.fromkeys(name for one in self.found for name in one.place))
            if name not in names:
                raise KeyError(f"{name!r} tells no ensembles apart: one of {', '.join(names) or 'nothing'} does")
            kept = tuple(one for one in kept if _equal(one.place.get(name), wanted))
        if not kept:
            raise SweepmillError(f"nothing is sampled of {self.item.name}" + (" there" if conditions else " yet"))
        return replace(self, found=kept)

    def with_stabilizer_laws(self) -> Self:
        """Beside each the law of random stabilizer states. Raises SweepmillError where that says nothing."""
        ensembles = {point.ensemble.key: point.ensemble for point in self.specification.points}
        try:
            laws = (
                stabilizer_law_of(ensembles[one.key], self.item.observation, one.place.get("position"))
                for one in self.found
            )
            return replace(self, laws=tuple(laws))
        except ValueError as error:
            raise SweepmillError(str(error)) from error

    def text(self) -> str:
        """Values, or one line for each of many distributions; and the tests."""
        shown = self._values() if len(self.found) <= FULLY_SHOWN else self._summaries()
        return "\n".join([self._caption(), "", shown, *(["", *tests] if (tests := self._tests()) else [])])

    def write(self, path: Path) -> None:
        """All values of all distributions; the suffix gives the format."""
        rows = list(self._rows())
        columns = {name: [row[name] for row in rows] for name in rows[0]}
        ensembles = [{"key": one.key, "trajectories": [0, one.trajectories]} for one in self.found]
        metadata = {
            "sweep": self.sweep,
            "name": self.item.name,
            "observation": self.item.observation.normal_form(),
            "laws": [law.name for law in self.laws],
            "ensembles": ensembles,
        }
        write_columns(path, columns, metadata)

    def draw(self, path: Path) -> None:
        """The figure; the suffix gives the format."""
        plot_distributions(self.found, path, self._unit(), "\n".join([self._caption(), *self._tests()]), self.laws)

    def _caption(self) -> str:
        number = sum(one.trajectories for one in self.found)
        readings = self.found[0].readings
        each = "" if readings == 1 else f", {readings:g} readings each"
        return (
            f"{self.item.name} ({self.item.observation.region_label()}) of sweep {short(self.sweep)}: "
            f"{count(number)} trajectories{each}"
        )

    def _unit(self) -> str:
        return f"{self.item.observation.quantity} ({self.item.observation.region_label()})"

    def _rows(self) -> Iterator[dict[str, Any]]:
        for index, one in enumerate(self.found):
            law = dict(zip(*map(list, _pairs(self.laws[index])), strict=True)) if self.laws else {}
            for value, number, share, error in zip(one.values, one.counts, one.shares, one.errors, strict=True):
                row = {"value": float(value), "occurrences": int(number), "share": float(share), "error": float(error)}
                if self.laws:
                    row["law"] = law.get(float(value), 0.0)
                yield {**one.place, **row}

    def _values(self) -> str:
        rows = list(self._rows())
        return aligned(list(rows[0]), [list(row.values()) for row in rows])

    def _summaries(self) -> str:
        names = list(dict.fromkeys(name for one in self.found for name in one.place))
        heads = [*names, "trajectories", "values", "most frequent", "mean"]
        rows = [
            [
                *(one.place.get(name) for name in names),
                one.trajectories,
                len(one.values),
                float(one.values[one.counts.argmax()]),
                with_error(one.mean().value, one.mean().error or math.nan),
            ]
            for one in self.found
        ]
        return aligned(heads, rows) + "\n(fewer than five are listed value by value: choose some with --where)"

    def _tests(self) -> list[str]:
        lines = [
            f"{one.label} against {law.name}: {against_law(one, law)}"
            for one, law in zip(self.found, self.laws, strict=False)
        ]
        if len(self.found) == 2 and self.found[0].key == self.found[1].key:
            lines.append("no test of the difference: both are of the same trajectories")
        elif len(self.found) == 2:
            lines.append(f"difference of {self.found[0].label} and {self.found[1].label}: {between(*self.found)}")
        return lines


def _pairs(law: ExactLaw) -> tuple[list[float], list[float]]:
    return law.values.tolist(), law.probabilities.tolist()


def _equal(value: Any, text: str) -> bool:
    try:
        return math.isclose(float(value), float(text), rel_tol=1e-11)
    except (TypeError, ValueError):
        return str(value) == text
