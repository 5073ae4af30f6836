"""The report as Markdown."""

from collections.abc import Iterable, Sequence

from sweepmill.experiment.cost import Cost
from sweepmill.experiment.record import Record
from sweepmill.experiment.roads import caption, roads
from sweepmill.experiment.selection import Selection
from sweepmill.experiment.wording import (
    ASSUMPTIONS,
    CAUTION,
    NEW_CIRCUITS,
    TITLE,
    axes_text,
    headline,
    number,
    provenance,
    rare,
    runs_and_time,
    shot_text,
)


def markdown(cost: Cost) -> str:
    """One page. One repetition takes the assumed time throughout."""
    parts = [f"# {TITLE}", headline(cost), f"One repetition is assumed to take {shot_text(cost.options.shot_time)}."]
    if cost.final:
        parts += ["## One record again", _records(cost), f"{NEW_CIRCUITS} {rare(cost.final)}"]
        parts += ["## Post-selecting the first k outcomes", _selections(cost)]
    if cost.beside is not None:
        rows = [list(road) for road in roads(cost.beside, cost.options.shot_time)]
        parts += ["## Monitored, or unitary and read sideways", _table(["", "monitored", "sideways"], rows)]
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


def band_text(one: Record) -> str:
    """Median and the middle nine tenths."""
    about = "" if one.band.exact else "≈ "
    return f"{about}{one.band.median:.0f} ({one.band.low:.0f} to {one.band.high:.0f})"


def _selections(cost: Cost) -> str:
    heads = ["circuit", "random share of outcomes"]
    heads += [f"k = {k}: runs per kept one; for ±{cost.options.precision:g}" for k in cost.options.selected]
    return _table(heads, [_selection(one, cost) for one in cost.final])


def _selection(one: Record, cost: Cost) -> list[str]:
    share = "not known" if one.random is None else number(one.random)
    return [axes_text(one.labels), share, *(selection_text(found, cost) for found in cost.selections(one))]


def selection_text(found: Selection | None, cost: Cost) -> str:
    """Runs for one kept run, and for the wanted precision."""
    if found is None:
        return "fewer are measured"
    kept, observed = (
        runs_and_time(log2, cost.options.shot_time) for log2 in (found.random.value, found.log2_for_observable)
    )
    return f"{kept[0]}; {observed[0]} ({observed[1]})"


def _table(heads: Sequence[str], rows: Iterable[Sequence[str]]) -> str:
    lines = [heads, ["---"] * len(heads), *rows]
    return "\n".join("| " + " | ".join(cell.replace("|", "\\|") for cell in line) + " |" for line in lines)
