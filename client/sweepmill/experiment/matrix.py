"""The tables of the page: sizes to the right, everything else downwards."""

from collections.abc import Sequence
from html import escape
from typing import Any

from sweepmill.experiment.cost import Cost
from sweepmill.experiment.markup import bold, powers, table
from sweepmill.experiment.record import Record
from sweepmill.experiment.selection import Selection
from sweepmill.experiment.wording import (
    axes_text,
    number,
    rest_of,
    row_heads,
    runs_and_time,
    selectable,
    size_of,
)


def sizes_of(cost: Cost) -> list[Any]:
    """Every size once, in order."""
    return list(dict.fromkeys(size_of(one) for one in cost.final))


def matrix(cost: Cost) -> str:
    """What one record again costs at the last depth of every ensemble."""
    sizes = sizes_of(cost)
    found = {(axes_text(rest_of(one)), size_of(one)): one for one in cost.final}
    names = list(dict.fromkeys(name for name, _ in found))
    title, shown = row_heads(cost.final)
    heads = [escape(title), *(_size_head(size, cost.final) for size in sizes)]
    rows = [[bold(shown[name]), *(_cell(found.get((name, size)), cost) for size in sizes)] for name in names]
    return table(heads, rows, "matrix")


def selections(cost: Cost) -> str:
    """What post-selection costs, for the same circuits as in Markdown."""
    shown = selectable(cost)
    title, names = row_heads(shown)
    heads = [escape(title), "random share", *(f"first {k}" for k in cost.options.selected)]
    several = len({size_of(one) for one in shown}) > 1
    rows = []
    for one in shown:
        size = f"<small>{size_of(one)} sites</small>" if several else ""
        rows.append([bold(names[axes_text(rest_of(one))]) + size, *_selection_row(one, cost)])
    return table(heads, rows, "plain")


def _size_head(size: Any, records: Sequence[Record]) -> str:
    depths = sorted({one.layer for one in records if size_of(one) == size and one.layer is not None})
    ends = "" if not depths else f"{depths[0]} layers" if len(depths) == 1 else f"{depths[0]} to {depths[-1]} layers"
    return ends if size is None else f"{size} sites<small>{ends}</small>"


def _cell(record: Record | None, cost: Cost) -> str:
    if record is None:
        return ""
    runs, time = runs_and_time(record.again.value, cost.options.shot_time)
    _, twice = runs_and_time(record.any_twice.value, cost.options.shot_time)
    about = "" if record.band.exact else "≈ "
    return (
        f"<strong>{powers(runs)}</strong> {powers(time)}"
        f"<small>r = {number(record.again)}, median {record.band.median:.0f}</small>"
        f"<small>{about}{record.band.low:.0f} to {record.band.high:.0f} in 9 of 10</small>"
        f"<small>any twice: {powers(twice)}</small>"
    )


def _selection_row(one: Record, cost: Cost) -> list[str]:
    share = "not known" if one.random is None else number(one.random)
    return [share, *(_selection(found, cost) for found in cost.selections(one))]


def _selection(found: Selection | None, cost: Cost) -> str:
    if found is None:
        return "<small>fewer are measured</small>"
    kept, _ = runs_and_time(found.random.value, cost.options.shot_time)
    observed, time = runs_and_time(found.log2_for_observable, cost.options.shot_time)
    return (
        f"<strong>{powers(kept)}</strong><small>{found.random.value:.1f} random</small>"
        f"<small>±{cost.options.precision:g}: {powers(observed)}, {powers(time)}</small>"
    )
