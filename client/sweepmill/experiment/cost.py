"""What an experiment would pay for the circuits of a sweep, as plain values."""

from collections.abc import Sequence
from dataclasses import dataclass, replace
from math import isfinite
from typing import Any

from sweepmill.experiment.beside import ROTATED, Beside, beside
from sweepmill.experiment.record import Record, record_of
from sweepmill.experiment.selection import Selection, select_first
from sweepmill.experiment.source import Source
from sweepmill.experiment.spots import NoRecordBits, Spot, spots_of

SELECTED = (10, 20, 40)
UNITARY = (ROTATED, "edge-bath")
"""Families without a record: their outcomes are forced or nobody looks."""


@dataclass(frozen=True)
class Options:
    """What the user may assume.

    `of`: name of the observation of random outcomes, by default all of them; `shot_time`: seconds of one repetition;
    `select`: how many of the first outcomes to post-select on, by default 10, 20 and 40; `precision`: wanted error of
    an observable with values between -1 and 1. Raises ValueError for numbers out of range.
    """

    of: str | None = None
    shot_time: float = 1e-4
    select: int | None = None
    precision: float = 0.1

    def __post_init__(self) -> None:
        """Checks the numbers."""
        if not (isfinite(self.shot_time) and self.shot_time > 0):
            raise ValueError(f"one repetition takes a positive time in seconds, got {self.shot_time:g}")
        if self.select is not None and self.select < 1:
            raise ValueError(f"at least one outcome is selected, got {self.select}")
        if not 0 < self.precision < 1:
            raise ValueError(f"a precision lies between 0 and 1, got {self.precision:g}")

    @property
    def selected(self) -> tuple[int, ...]:
        """Numbers of outcomes to post-select on."""
        return SELECTED if self.select is None else (self.select,)


@dataclass(frozen=True)
class Cost:
    """Records at all depths by ensemble, depths ascending; post-selection at each last depth; the two roads."""

    key: str | None
    records: tuple[Record, ...]
    beside: Beside | None
    options: Options

    @property
    def final(self) -> list[Record]:
        """The last depth of every ensemble."""
        last = {(one.key, tuple(one.labels.items())): one for one in self.records}
        return list(last.values())

    def depths(self, record: Record) -> list[Record]:
        """All depths of the ensemble of a record."""
        return [one for one in self.records if (one.key, one.labels) == (record.key, record.labels)]

    def selections(self, record: Record) -> list[Selection | None]:
        """Post-selection on the first outcomes in the ensemble of a record, one for each number of them."""
        depths = self.depths(record)
        return [select_first(depths, k, self.options.precision) for k in self.options.selected]

    def to_dict(self) -> dict[str, Any]:
        """Plain values, ready for JSON."""
        selected = {one.key or str(dict(one.labels)): self.selections(one) for one in self.final}
        return {
            "sweep": self.key,
            "shot_time": self.options.shot_time,
            "records": [one.to_dict() for one in self.records],
            "selections": {
                key: [None if one is None else one.to_dict() for one in each] for key, each in selected.items()
            },
            "beside": None if self.beside is None else self.beside.to_dict(),
        }


def cost_of(source: Source, options: Options | None = None) -> Cost:
    """Everything a report says. Raises NoRecordBits where the sweep says nothing of its random outcomes.

    A sweep of rotated circuits alone needs no such observation: its laboratory makes no measurement.
    """
    options = options or Options()
    records = tuple(map(record_of, _monitored(_spots(source, options))))
    known = [one for one in records if one.key in source.ensembles]
    cost = Cost(source.key, records, None, options)
    last = [one for one in cost.final if one in known]
    return Cost(source.key, records, beside(source, last), options)


def _spots(source: Source, options: Options) -> Sequence[Spot]:
    try:
        return spots_of(source, options.of)
    except NoRecordBits:
        if not any(one.family in UNITARY for one in source.ensembles.values()):
            raise
        return []


def _monitored(spots: Sequence[Spot]) -> list[Spot]:
    """Those with a record; a family common to all goes without saying."""
    found = [one for one in spots if one.ensemble is None or one.ensemble.family not in UNITARY]
    if len({one.labels.get("family") for one in found}) > 1:
        return found
    return [replace(one, labels={n: value for n, value in one.labels.items() if n != "family"}) for one in found]
