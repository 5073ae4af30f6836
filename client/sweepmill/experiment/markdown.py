"""The report as Markdown."""

from collections.abc import Iterable, Sequence

from sweepmill.experiment.cost import Cost
from sweepmill.experiment.record import Record
from sweepmill.experiment.roads import caption, roads, roads_title
from sweepmill.experiment.selection import Selection
from sweepmill.experiment.wording import (
    ASSUMPTIONS,
    CAUTION,
    NEW_CIRCUITS,
    TITLE,
    axes_text,
    band_text,
    headline,
    largest,
    number,
    provenance,
    rare,
    runs_and_time,
    selectable,
    shot_text,
    unselected,
)


def markdown(cost: Cost) -> str:
    """One page. One repetition takes the assumed time throughout."""
    parts = [f"# {TITLE}", headline(cost), f"One repetition is assumed to take {shot_text(cost.options.shot_time)}."]
    if cost.final:
        parts += ["## One record again", _records(cost), f"{NEW_CIRCUITS} {rare(cost.final)}"]
        if series := _depths(cost):
            parts += ["## Random outcomes r against depth", series]
        parts += ["## Post-selecting the first k outcomes in time", _selections(cost)]
        parts += [one] if (one := unselected(cost)) else []
    if cost.beside is not None:
        rows = [list(road) for road in roads(cost.beside, cost.options.shot_time)]
        parts += [f"## {roads_title(cost.beside)}", _table(["", "monitored", "sideways"], rows)]
        parts += [caption(cost.beside)]
    parts += ["## What is assumed", "\n".join(f"- {one}" for one in ASSUMPTIONS), f"**{CAUTION}**"]
    parts += ["## What the numbers rest on", _table(["ensemble", "circuit", "trajectories"], provenance(cost))]
    return "\n\n".join(parts) + "\n"


def _records(cost: Cost) -> str:
    heads = ["circuit", "layers", "random outcomes r", "median (5 % to 95 %)", "runs 2^r", "time", "any record twice"]
    return _table(heads, [_record(one, cost.options.shot_time) for one in cost.final])


def _record(one: Record, shot_time: float) -> list[str]:
    runs, time = runs_and_time(one.again.value, shot_time)
    twice, twice_time = runs_and_time(one.any_twice.value, shot_time)
    layer = "" if one.layer is None else str(one.layer)
    return [axes_text(one.labels), layer, number(one.again), band_text(one), runs, time, f"{twice} ({twice_time})"]


def _depths(cost: Cost) -> str:
    """The means of the largest size, if it was observed at several depths."""
    chosen = largest(cost.final)
    found = {(axes_text(one.labels), one.layer): number(one.again) for record in chosen for one in cost.depths(record)}
    layers = sorted({layer for _, layer in found if layer is not None})
    if len(layers) < 2:
        return ""
    names = [axes_text(one.labels) for one in chosen]
    rows = [[str(layer), *(found.get((name, layer), "") for name in names)] for layer in layers]
    return _table(["layers", *names], rows)


def _selections(cost: Cost) -> str:
    heads = ["circuit", "random share of outcomes"]
    heads += [
        f"first {k}: random ones; runs per kept one; for ±{cost.options.precision:g}" for k in cost.options.selected
    ]
    return _table(heads, [_selection(one, cost) for one in selectable(cost)])


def _selection(one: Record, cost: Cost) -> list[str]:
    share = "not known" if one.random is None else number(one.random)
    return [axes_text(one.labels), share, *(_selected(found, cost) for found in cost.selections(one))]


def _selected(found: Selection | None, cost: Cost) -> str:
    """Random ones, runs for one kept run, and for the wanted precision."""
    if found is None:
        return "fewer are measured"
    kept, _ = runs_and_time(found.random.value, cost.options.shot_time)
    observed, time = runs_and_time(found.log2_for_observable, cost.options.shot_time)
    return f"{found.random.value:.1f}; {kept}; {observed} ({time})"


def _table(heads: Sequence[str], rows: Iterable[Sequence[str]]) -> str:
    lines = [heads, ["---"] * len(heads), *rows]
    return "\n".join("| " + " | ".join(cell.replace("|", "\\|") for cell in line) + " |" for line in lines)
