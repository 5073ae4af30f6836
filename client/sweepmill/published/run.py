"""A published result from end to end: submit, wait, fit, ours beside the published."""

import time
from dataclasses import dataclass
from pathlib import Path

from sweepmill.analysis import Estimate
from sweepmill.client import Client
from sweepmill.published.catalogue import Entry
from sweepmill.published.fits import Outcome, fitted
from sweepmill.published.models import Known
from sweepmill.text import aligned, duration, short

AGREES = 5.0  # combined standard errors: one right result in two million is called different


@dataclass(frozen=True)
class Compared:
    """A known value and ours; `sigmas` by how many combined standard errors ours lies above it, None without one."""

    known: Known
    ours: Estimate

    @property
    def sigmas(self) -> float | None:
        """Difference in combined standard errors; None where our error is withheld or unknown."""
        return None if self.ours.error is None else self.ours.sigmas_from(self.known.value, self.known.error)

    @property
    def differs(self) -> bool:
        """Whether a value that decides is not reproduced."""
        return self.known.decides and (self.sigmas is None or abs(self.sigmas) > AGREES)


@dataclass(frozen=True)
class Reproduction:
    """What came out: the sweep, the outcomes of its fits, and every known value beside ours."""

    entry: Entry
    key: str
    trajectories: int
    core_seconds: float
    seconds: float
    outcomes: tuple[Outcome, ...]
    compared: tuple[Compared, ...]

    @property
    def reproduced(self) -> bool:
        """Whether every value that decides agrees."""
        return not any(one.differs for one in self.compared)

    def text(self) -> str:
        """The whole as text: what the fits say, then the comparison."""
        published = self.entry.published
        took = f"{self.trajectories:,} trajectories, {duration(self.core_seconds)} of core time in all"
        return "\n".join(
            [
                published.title,
                f"sweep {short(self.key)}: {took}, {duration(self.seconds)} from submitting to here",
                "",
                *(outcome.text for outcome in self.outcomes),
                "",
                self.comparison(),
                "",
                *(f"[{number}] {source.title}, {source.place}" for number, source in enumerate(published.sources, 1)),
                *([published.remark] if published.remark else []),
            ]
        )

    def comparison(self) -> str:
        """A line for every known value."""
        rows = [_line(one) for one in self.compared]
        return aligned(["quantity", "here", "known", "from", "standing", "difference"], rows)


def reproduce(entry: Entry, client: Client, cap: int | None = None, figures: Path | None = None) -> Reproduction:
    """Submit the sweep of a result, wait until it settles, fit, and compare.

    `cap`: at most so many trajectories per ensemble; `figures`: a directory for the figures of the fits. Raises what
    the client raises, and ValueError where the data do not suffice for a fit.
    """
    began, sweep = time.monotonic(), entry.sweep(cap)
    remote = client.submit(sweep)
    status = remote.wait()
    folds, histograms = remote.folds(), remote.histograms()
    outcomes = tuple(fitted(fit, folds, histograms) for fit in entry.published.fits)
    found = {name: one for outcome in outcomes for name, one in outcome.estimates.items()}
    compared = tuple(Compared(known, found[known.quantity]) for known in entry.published.known)
    if figures is not None:
        _draw(outcomes, figures, entry.name)
    seconds = time.monotonic() - began
    return Reproduction(entry, sweep.key, status.trajectories, status.core_seconds, seconds, outcomes, compared)


def _draw(outcomes: tuple[Outcome, ...], directory: Path, name: str) -> None:
    drawn = [outcome.draw for outcome in outcomes if outcome.draw is not None]
    for number, draw in enumerate(drawn, 1):
        draw(directory / (f"{name}.png" if len(drawn) == 1 else f"{name}-{number}.png"))


def _line(one: Compared) -> list[str]:
    known = one.known
    off = "no error bar here" if one.sigmas is None else f"{one.sigmas:+.1f} standard errors"
    verdict = f"{off} (not reproduced)" if one.differs else off
    return [known.quantity, str(one.ours), known.text, f"[{known.source + 1}]", known.standing, verdict]
