"""From the normal form of a `layered` circuit to the tables that drawing and execution read."""

import json
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from functools import lru_cache
from typing import Any, Final

import numpy as np
from numpy.typing import NDArray

from sweepmill_worker.program import tables as t
from sweepmill_worker.program.distances import offsets, scaled
from sweepmill_worker.program.layout import Layout, periods
from sweepmill_worker.program.operations import DEPOLARISE, MEASURE, RECORDED, RESET, SWAP_IN, WIDEST
from sweepmill_worker.program.rates import NODES
from sweepmill_worker.program.rotation import rotated_table
from sweepmill_worker.program.steps import Steps

MAX_SITES: Final = 4096
"""Chain and references together: the keys of the search for the shortest row hold lengths of 12 bits."""


@dataclass(frozen=True)
class Program:
    """A compiled circuit."""

    sites: int
    """Of the chain."""
    references: int
    """Reference j is site `sites + j`."""
    periodic: bool
    initial_state: str
    mixed: bool
    """Does the state need logical rows?"""
    layers: int
    """Numbered ones: those of `repeat`, then those of `after`."""
    before: int
    tables: t.Tables
    places: NDArray[np.int64]
    words: int
    """Random words at hand."""
    drawn: int
    """Quenched rates and weights."""
    most_operations: int
    """Of a layer."""

    @property
    def total(self) -> int:
        """Sites of the chain and references."""
        return self.sites + self.references

    def entry(self, number: int) -> int:
        """Row of the sequence of layer `number`: 1 - before .. layers."""
        return int(entry_of(number, self.tables.before, self.tables.repeated, self.tables.span))


def entry_of(number: int, before: int, repeated: int, span: int) -> int:
    """Row of the sequence of a layer."""
    if number <= 0:
        return number + before - 1
    if number <= repeated:
        return before + (number - 1) % span
    return before + span + number - repeated - 1


def compile_program(form: Mapping[str, Any]) -> Program:
    """The program of a normal form; equal forms share one.

    Raises ValueError, naming the field, for what cannot be run.
    """
    return _compile(json.dumps(form, sort_keys=True))


@lru_cache(maxsize=16)
def _compile(text: str) -> Program:
    form = json.loads(text)
    parts = [form.get("before", []), form["repeat"], form.get("after", [])]
    steps = _steps(form, parts)
    mixed = form.get("initial_state", "zeros") == "mixed" or _loses(steps, len(parts[0]))
    _check_size(form["sites"], steps.references)
    layout = _layout(steps, parts, form["layers"])
    return Program(
        sites=form["sites"],
        references=steps.references,
        periodic=steps.periodic,
        initial_state=form.get("initial_state", "zeros"),
        mixed=mixed,
        layers=form["layers"] + len(parts[2]),
        before=len(parts[0]),
        tables=_tables(steps, layout, len(parts[0]), len(parts[2]), form["layers"]),
        places=_place_rows(steps),
        words=layout.base + layout.largest,
        drawn=steps.levels.drawn,
        most_operations=max(map(steps.most_operations, steps.tops)),
    )


def _steps(form: Mapping[str, Any], parts: Sequence[Sequence[Any]]) -> Steps:
    if form["sites"] < 1 or form["layers"] < 0 or not form["repeat"]:
        raise ValueError("a circuit has sites, a number of layers and a list `repeat` that is not empty")
    steps = Steps(form["sites"], form.get("boundary", "periodic") == "periodic")
    numbered = form["layers"] + len(parts[2])
    for part, layers in zip(parts, (len(parts[0]), numbered, numbered), strict=True):
        for layer in part:
            steps.add_layer(layer, layers)
    return steps


def _check_size(sites: int, references: int) -> None:
    if sites + references > MAX_SITES:
        beside = f" beside {references} references" if references else ""
        raise ValueError(f"sites: at most {MAX_SITES - references}{beside}, got {sites}")


def _loses(steps: Steps, before: int) -> bool:
    """Does any step turn pure states into mixed ones?

    A site that was never touched is in a product state: swapping in a reference then loses nothing.
    """
    touched: set[int] = set()
    for index, segments in enumerate(steps.tops):
        for number in _subtree(steps, segments):
            row = steps.rows[number]
            if row[t.CODE] in (DEPOLARISE, RESET) or (row[t.CODE] == MEASURE and not row[t.FLAGS] & RECORDED):
                return True
            sites = _sites_of(steps, number)
            if row[t.CODE] == SWAP_IN and (index >= before or len(sites) < row[t.PLACES] or touched & sites):
                return True
            touched |= sites
    return False


def _subtree(steps: Steps, numbers: Sequence[int]) -> list[int]:
    found = []
    for number in numbers:
        found.append(number)
        for branch in steps.children.get(number, []):
            found += _subtree(steps, branch)
    return found


def _sites_of(steps: Steps, number: int) -> set[int]:
    at = steps.wheres[number]
    if at.stream == t.PAIRS:
        return set(range(steps.sites))
    return {site for place in at.fixed + at.source for site in place}


def _layout(steps: Steps, parts: Sequence[Sequence[Any]], layers: int) -> Layout:
    layout = Layout(base=sum(segments.size for segments in steps.once.values()))
    before, repeat = len(parts[0]), len(parts[1])
    repeated = steps.segments[before : before + repeat]
    layout.add(range(before), steps.segments[:before], apart=True)
    copies = periods(repeated, layers)
    layout.add([*range(before, before + repeat)] * copies, repeated * copies, apart=False)
    after = before + repeat
    layout.add(range(after, after + len(parts[2])), steps.segments[after:], apart=True)
    return layout


def _place_rows(steps: Steps) -> NDArray[np.int64]:
    rows = np.full((len(steps.places), WIDEST), -1, dtype=np.int64)
    for row, place in zip(rows, steps.places, strict=True):
        row[: len(place)] = place
    return rows


def _tables(steps: Steps, layout: Layout, before: int, after: int, repeated: int) -> t.Tables:
    trajectory, ensemble = steps.once["trajectory"], steps.once["ensemble"]
    rows = np.array(steps.rows, dtype=np.int64).reshape(-1, t.STEP_COLUMNS)
    rows[rows[:, t.FIXED] == 2, t.GATE_AT] += trajectory.size
    sites, laws = steps.sites, steps.laws
    weights = [scaled(law, sites) for law in laws]
    return t.Tables(
        steps=rows,
        branches=_table(steps.branches, 4),
        tops=np.array([top for tops in steps.tops for top in tops], dtype=np.int64),
        lists=np.cumsum([0, *map(len, steps.tops)], dtype=np.int64),
        sequence=_table(layout.sequence, 4),
        levels=np.array(steps.levels.levels, dtype=np.uint64),
        classes=np.array(steps.classes, dtype=np.int64),
        rotated=rotated_table() if rows[:, t.ROTATED].any() else np.zeros((0, 4), np.int64),
        disorder=_table(steps.levels.disorder, 8),
        curves=np.array(steps.levels.curves, dtype=np.int64).reshape(-1, NODES),
        blocks=np.concatenate([np.zeros(0, np.uint32), *layout.blocks]),
        ahead=np.concatenate([np.zeros(0, np.uint32), *layout.ahead]),
        fixed_blocks=np.concatenate([trajectory.counters(), ensemble.counters()]),
        fixed_layers=np.concatenate([trajectory.layer_words(), ensemble.layer_words()]),
        offsets=_stack([offsets(law, sites, steps.periodic) for law in laws], 2 * sites, np.uint64),
        mantissas=_stack([pair[0] for pair in weights], sites, np.uint64),
        shifts=_stack([pair[1] for pair in weights], sites, np.int64),
        sites=sites,
        before=before,
        span=len(layout.sequence) - before - after,
        repeated=repeated,
        periodic=steps.periodic,
        trajectory_blocks=trajectory.size // 4,
    )


def _table(rows: Sequence[Sequence[int]], columns: int) -> NDArray[np.int64]:
    return np.array(rows, dtype=np.int64).reshape(-1, columns)


def _stack(rows: Sequence[NDArray[Any]], columns: int, dtype: type) -> NDArray[Any]:
    return np.array(rows, dtype=dtype).reshape(-1, columns)
