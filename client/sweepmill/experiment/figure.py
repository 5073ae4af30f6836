"""The figure of the report: log2 of the repetitions against depth, a panel for each size, drawn as SVG."""

import math
from collections.abc import Iterator, Sequence
from html import escape
from typing import TypeVar

from sweepmill.experiment.amounts import YEAR
from sweepmill.experiment.canvas import Canvas, Frame, even_ticks, ticks
from sweepmill.experiment.cost import Cost
from sweepmill.experiment.record import Record
from sweepmill.experiment.wording import axes_text, rest_of, row_heads, size_of

MOST_PANELS, MOST_CURVES = 3, 6
LEAST_TOP = 2.0  # bits at the upper edge, at least
APART = 10.0  # pixels between durations
WIDTH, HEIGHT = 560.0, 262.0
LEFT, RIGHT, TOP, BOTTOM, GAP = 50.0, 80.0, 22.0, 34.0, 12.0
_INKS = ("#b5651d", "#c8963e", "#5f8a5b", "#2f6f73", "#3d5a80", "#7a4069")
_TIMES = ((1.0, "1 second"), (3600.0, "1 hour"), (86400.0, "1 day"), (YEAR, "1 year"), (1e3 * YEAR, "1,000 years"))
_AGE = (1.38e10 * YEAR, "age of universe")

Curve = list[Record]
Item = TypeVar("Item")


def depth_figure(cost: Cost) -> str:
    """An <svg> element; empty where no ensemble was observed at several depths."""
    curves = [curve for one in cost.final if len(curve := _drawn(cost.depths(one))) > 1]
    if not curves:
        return ""
    sizes = _spread(sorted({size_of(curve[0]) for curve in curves}, key=lambda size: (size is None, size)), MOST_PANELS)
    inks = _colors(curves)
    shown = {size: [c for c in curves if size_of(c[0]) == size and _name(c[0]) in inks] for size in sizes}
    drawn = [one for panel in shown.values() for curve in panel for one in curve]
    top = max(one.band.high for one in drawn)
    canvas = Canvas(WIDTH, HEIGHT + 18)
    width = (WIDTH - LEFT - RIGHT - GAP * (len(sizes) - 1)) / len(sizes)
    for index, (size, panel) in enumerate(shown.items()):
        depths = [one.layer or 1 for curve in panel for one in curve]
        x, most = (min(depths), max(depths)), max(top * 1.05, LEAST_TOP)
        frame = Frame(LEFT + index * (width + GAP), TOP, width, HEIGHT - TOP - BOTTOM, x, most)
        _panel(canvas, frame, panel, inks)
        _marks(canvas, frame, cost.options.shot_time, index == len(sizes) - 1)
        _axes(canvas, frame, "" if size is None else f"{size} sites", index == 0)
    _legend(canvas, inks, drawn)
    return canvas.svg("log2 of the repetitions until one record is met again, against the number of layers")


def _drawn(curve: Curve) -> Curve:
    return [one for one in curve if one.layer is not None]


def _name(record: Record) -> str:
    return axes_text(rest_of(record))


def _colors(curves: Sequence[Curve]) -> dict[str, str]:
    """A color for each circuit that is drawn, evenly chosen where there are many."""
    names = _spread(list(dict.fromkeys(_name(curve[0]) for curve in curves)), MOST_CURVES)
    step = max(1, (len(_INKS) - 1) // max(1, len(names) - 1))
    return {name: _INKS[min(len(_INKS) - 1, index * step)] for index, name in enumerate(names)}


def _spread(items: Sequence[Item], most: int) -> list[Item]:
    """At most so many, evenly spread, the last one among them."""
    if len(items) <= most:
        return list(items)
    return [items[round(i * (len(items) - 1) / (most - 1))] for i in range(most)]


def _panel(canvas: Canvas, frame: Frame, curves: Sequence[Curve], inks: dict[str, str]) -> None:
    for curve in curves:
        ink = inks[_name(curve[0])]
        upper = [frame.at(one.layer or 1, one.band.high) for one in curve]
        lower = [frame.at(one.layer or 1, one.band.low) for one in curve]
        canvas.area([*upper, *reversed(lower)], ink)
    for curve in curves:
        ink = inks[_name(curve[0])]
        points = [frame.at(one.layer or 1, one.again.value) for one in curve]
        canvas.line(points, ink)
        for point in points:
            canvas.dot(point, ink)


def _marks(canvas: Canvas, frame: Frame, shot_time: float, named: bool) -> None:
    """Durations as dotted lines with their names at the right end."""
    for bits, name in _durations(frame, shot_time):
        (x, y), (end, _) = frame.at(frame.x_range[0], bits), frame.at(frame.x_range[1], bits)
        canvas.dotted(x, end, y)
        if named:
            canvas.text(end + 5, y + 3, name, "mark")


def _durations(frame: Frame, shot_time: float) -> Iterator[tuple[float, str]]:
    """log2 of the repetitions in a duration: from the longest one down, those whose names do not touch."""
    last = math.inf
    for seconds, name in (_AGE, *reversed(_TIMES)):
        bits = math.log2(seconds / shot_time)
        height = frame.height * bits / frame.y_most
        if 0 < bits < frame.y_most and last - height > APART:
            yield bits, name
            last = height


def _axes(canvas: Canvas, frame: Frame, title: str, first: bool) -> None:
    canvas.box(frame)
    for value in ticks(*frame.x_range):
        x, y = frame.at(value, 0)
        canvas.text(x, y + 13, f"{value:g}", "tick middle")
    for value in even_ticks(frame.y_most):
        x, y = frame.at(frame.x_range[0], value)
        canvas.tick(x, y)
        if first:
            canvas.text(x - 6, y + 3, f"{value:g}", "tick end")
    canvas.text(frame.left, frame.y - 8, escape(title), "title")
    canvas.text(frame.left + frame.width / 2, frame.y + frame.height + 27, "layers", "label middle")
    if first:
        canvas.upright(10, frame.y + frame.height / 2, "log2 repetitions")


def _legend(canvas: Canvas, inks: dict[str, str], records: Sequence[Record]) -> None:
    title, shown = row_heads(records)
    canvas.text(LEFT, HEIGHT + 13, escape(title), "label")
    x = LEFT + 5.6 * len(title) + 10
    for name, ink in inks.items():
        canvas.line([(x, HEIGHT + 10), (x + 14, HEIGHT + 10)], ink)
        canvas.text(x + 18, HEIGHT + 13, escape(shown[name] or "all"), "tick")
        x += 34 + 5.4 * len(shown[name])
