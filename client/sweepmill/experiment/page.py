"""The report as one page of HTML that needs nothing from outside."""

from html import escape

from sweepmill.experiment.cost import Cost
from sweepmill.experiment.figure import depth_figure
from sweepmill.experiment.look import STYLE
from sweepmill.experiment.markup import powers, table
from sweepmill.experiment.matrix import matrix, selections, sizes_of
from sweepmill.experiment.roads import caption, roads, roads_title
from sweepmill.experiment.wording import (
    ASSUMPTIONS,
    CAUTION,
    NEW_CIRCUITS,
    TITLE,
    headline,
    provenance,
    rare,
    selectable,
    shot_text,
    size_of,
    unselected,
)
from sweepmill.text import short

MOST_ABREAST = 3
"""Sizes that fit on half of the page."""
FEW_ROWS = 3
"""Circuits with post-selection up to which the left half of the page is the shorter one."""


def page(cost: Cost) -> str:
    """The whole document."""
    return _DOCUMENT.format(title=TITLE, style=STYLE, body="\n".join([_head(cost), *_body(cost), _foot(cost)]))


_DOCUMENT = """<!doctype html>
<html lang="en">
<head>
<meta charset="utf-8">
<meta name="viewport" content="width=device-width, initial-scale=1">
<title>{title}</title>
<style>{style}</style>
</head>
<body>
<main>
{body}
</main>
</body>
</html>
"""
_UNDER_FIGURE = (
    "Upwards every unit doubles the repetitions. Lines: the mean of r, log2 of the typical repetitions. Shades: nine "
    "tenths of the circuits. Dotted: how long so many repetitions take."
)


def _head(cost: Cost) -> str:
    of = "" if cost.key is None else f"sweep {short(cost.key)} · "
    return (
        f"<header><p class='of'>{of}one repetition takes {shot_text(cost.options.shot_time)} (assumed)</p>"
        f"<h1>{TITLE}</h1><p class='lead'>{powers(headline(cost))}</p></header>"
    )


def _body(cost: Cost) -> list[str]:
    """The tables in two columns; one with many sizes takes the whole width."""
    first = [_section("One record again", matrix(cost), _under_matrix(cost))] if cost.final else []
    left, right = _left(cost), _right(cost)
    wide = len(sizes_of(cost)) > MOST_ABREAST
    (left if wide or len(selectable(cost)) <= FEW_ROWS else right).append(_assumed())
    return [*first, _columns(left, right)] if wide else [_columns([*first, *left], right)]


def _left(cost: Cost) -> list[str]:
    if not cost.final:
        return []
    return [_section("Post-selecting the first k outcomes in time", selections(cost), _under_selections(cost))]


def _right(cost: Cost) -> list[str]:
    figure = depth_figure(cost)
    parts = [_section("Repetitions against depth", figure, _UNDER_FIGURE)] if figure else []
    if cost.beside is not None:
        parts.append(_section(roads_title(cost.beside), _roads(cost), caption(cost.beside)))
    return parts


def _columns(left: list[str], right: list[str]) -> str:
    filled = ["\n".join(parts) for parts in (left, right) if parts]
    kind = "columns" if len(filled) == 2 else "column"
    return f"<div class='{kind}'>" + "".join(f"<div>{part}</div>" for part in filled) + "</div>"


def _section(title: str, content: str, under: str) -> str:
    return f"<section><h2>{escape(title)}</h2>\n{content}\n<p class='under'>{powers(under)}</p></section>"


def _under_matrix(cost: Cost) -> str:
    return (
        "Bold: runs until a given record is met again, typically, and their time. Below: the random outcomes r, their "
        "range in nine of ten circuits, and the time until any record of a circuit occurs twice. "
        f"{NEW_CIRCUITS} {rare(cost.final)}"
    )


def _under_selections(cost: Cost) -> str:
    sizes = {size_of(one) for one in selectable(cost)} - {None}
    where = f"At {sizes.pop()} sites. " if len(sizes) == 1 else ""
    return (
        f"{where}Bold: runs for one that is kept. Below: how many of the first k outcomes are random, and the runs "
        f"until the mean of an observable between −1 and 1 is known to ±{cost.options.precision:g}. Any k chosen "
        f"outcomes cost at most 2^k runs. {unselected(cost)}"
    )


def _roads(cost: Cost) -> str:
    assert cost.beside is not None
    rows = [
        [f"<b>{escape(one.what)}</b>", powers(one.monitored), powers(one.sideways)]
        for one in roads(cost.beside, cost.options.shot_time)
    ]
    if cost.beside.monitored is None:
        return table(["", "sideways"], [[what, right] for what, _, right in rows], "plain")
    return table(["", "monitored", "sideways"], rows, "roads")


def _assumed() -> str:
    items = "".join(f"<li>{powers(one)}</li>" for one in ASSUMPTIONS)
    return (
        f"<section class='assumed'><h2>What is assumed</h2><ul>{items}</ul><p class='caution'>{CAUTION}</p></section>"
    )


def _foot(cost: Cost) -> str:
    found = provenance(cost)
    keys = "".join(f"<li><code>{key or '—'}</code> {escape(where)} · N = {count}</li>" for key, where, count in found)
    return f"<footer><h2>What the numbers rest on</h2><ul>{keys}</ul></footer>" if found else ""
