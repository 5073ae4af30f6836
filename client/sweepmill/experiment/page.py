"""The report as one page of HTML that needs nothing from outside."""

from collections.abc import Sequence
from html import escape
from typing import Any

from sweepmill.experiment.cost import Cost
from sweepmill.experiment.figure import depth_figure
from sweepmill.experiment.look import STYLE
from sweepmill.experiment.markdown import band_text, selection_text
from sweepmill.experiment.record import Record
from sweepmill.experiment.roads import caption, roads
from sweepmill.experiment.wording import (
    ASSUMPTIONS,
    CAUTION,
    NEW_CIRCUITS,
    TITLE,
    axes_text,
    headline,
    largest,
    number,
    provenance,
    rare,
    rest_of,
    row_heads,
    runs_and_time,
    shot_text,
    size_of,
)
from sweepmill.text import short


def page(cost: Cost) -> str:
    """The whole document."""
    parts = [_head(cost)]
    if cost.final:
        parts += [_section("One record again", _matrix(cost), _under_matrix(cost))]
        if figure := depth_figure(cost):
            parts.append(_section("Repetitions against depth", figure, _UNDER_FIGURE))
        parts.append(
            _section("Post-selecting the first k outcomes in time", _selections(cost), _under_selections(cost))
        )
    if cost.beside is not None:
        parts.append(_section("Monitored, or unitary and read sideways", _roads(cost), caption(cost.beside)))
    parts += [_assumed(), _rests_on(cost)]
    return _DOCUMENT.format(title=TITLE, style=STYLE, body="\n".join(parts))


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
    "Lines: 2 to the mean of r. Shades: nine tenths of the circuits. Dotted: how long so many repetitions take."
)


def _head(cost: Cost) -> str:
    of = "" if cost.key is None else f"sweep {short(cost.key)} · "
    return (
        f"<header><p class='of'>{of}one repetition takes {shot_text(cost.options.shot_time)} (assumed)</p>"
        f"<h1>{TITLE}</h1><p class='lead'>{_powers(headline(cost))}</p></header>"
    )


def _section(title: str, content: str, under: str) -> str:
    return f"<section><h2>{escape(title)}</h2>\n{content}\n<p class='under'>{_powers(under)}</p></section>"


def _under_matrix(cost: Cost) -> str:
    return (
        "Bold: runs until a given record is met again, typically; then their time; the random outcomes r with median "
        f"and middle nine tenths over circuits; and the time until any record occurs twice. {NEW_CIRCUITS} "
        f"{rare(cost.final)}"
    )


def _under_selections(cost: Cost) -> str:
    size = size_of(largest(cost.final)[0])
    where = "" if size is None else f"At {size} sites. "
    return (
        f"{where}Above: runs for one that is kept. Below: runs until the mean of an observable between −1 and 1 is "
        f"known to ±{cost.options.precision:g}, with their time. Any k chosen outcomes cost at most 2^k runs."
    )


def _matrix(cost: Cost) -> str:
    """Sizes to the right, everything else downwards."""
    sizes = list(dict.fromkeys(size_of(one) for one in cost.final))
    found = {(axes_text(rest_of(one)), size_of(one)): one for one in cost.final}
    names = list(dict.fromkeys(name for name, _ in found))
    depths = {size: sorted({one.layer or 0 for one in cost.final if size_of(one) == size}) for size in sizes}
    title, shown = row_heads(cost.final)
    heads = [escape(title), *(_size_head(size, depths[size]) for size in sizes)]
    rows = [[_bold(shown[name]), *(_cell(found.get((name, size)), cost) for size in sizes)] for name in names]
    return _table(heads, rows, "matrix")


def _size_head(size: Any, depths: Sequence[int]) -> str:
    layers = f"{depths[0]} layers" if len(depths) == 1 else f"{depths[0]} to {depths[-1]} layers"
    return f"{size} sites<small>{layers}</small>" if size is not None else layers


def _cell(record: Record | None, cost: Cost) -> str:
    if record is None:
        return ""
    runs, time = runs_and_time(record.again.value, cost.options.shot_time)
    _, twice = runs_and_time(record.any_twice.value, cost.options.shot_time)
    return (
        f"<strong>{_powers(runs)}</strong><span>{_powers(time)}</span>"
        f"<small>r = {number(record.again)} · {band_text(record)}</small><small>any twice: {_powers(twice)}</small>"
    )


def _selections(cost: Cost) -> str:
    chosen = largest(cost.final)
    title, shown = row_heads(chosen)
    heads = [
        escape(title),
        "random share",
        *(f"first {k}<small>and ±{cost.options.precision:g}</small>" for k in cost.options.selected),
    ]
    rows = [[_bold(shown[axes_text(rest_of(one))]), *_selection_row(one, cost)] for one in chosen]
    return _table(heads, rows, "plain")


def _selection_row(one: Record, cost: Cost) -> list[str]:
    share = "not known" if one.random is None else number(one.random)
    texts = [selection_text(found, cost).partition("; ") for found in cost.selections(one)]
    cells = [f"{_powers(kept)}<small>{_powers(observed)}</small>" for kept, _, observed in texts]
    return [share, *cells]


def _bold(text: str) -> str:
    return f"<b>{escape(text)}</b>"


def _roads(cost: Cost) -> str:
    assert cost.beside is not None
    rows = [
        [f"<b>{escape(one.what)}</b>", _powers(one.monitored), _powers(one.sideways)]
        for one in roads(cost.beside, cost.options.shot_time)
    ]
    return _table(["", "monitored", "sideways"], rows, "roads")


def _assumed() -> str:
    items = "".join(f"<li>{_powers(one)}</li>" for one in ASSUMPTIONS)
    return (
        f"<section class='assumed'><h2>What is assumed</h2><ul>{items}</ul><p class='caution'>{CAUTION}</p></section>"
    )


def _rests_on(cost: Cost) -> str:
    items = "".join(
        f"<li><code>{key or '—'}</code> {escape(where)} · N = {count}</li>" for key, where, count in provenance(cost)
    )
    return f"<footer><h2>What the numbers rest on</h2><ul>{items}</ul></footer>" if items else ""


def _table(heads: Sequence[str], rows: Sequence[Sequence[str]], kind: str) -> str:
    """Cells are markup already."""
    head = "".join(f"<th scope='col'>{one}</th>" for one in heads)
    body = "".join(f"<tr><th scope='row'>{row[0]}</th>{''.join(f'<td>{c}</td>' for c in row[1:])}</tr>" for row in rows)
    return f"<table class='{kind}'><thead><tr>{head}</tr></thead><tbody>{body}</tbody></table>"


def _powers(text: str) -> str:
    """Exponents written as such."""
    words = [_raised(word) for word in escape(text).split(" ")]
    return " ".join(words)


def _raised(word: str) -> str:
    base, caret, exponent = word.partition("^")
    if not caret:
        return word
    end = len(exponent.rstrip(";:),"))
    return f"{base}<sup>{exponent[:end].replace('-', '−')}</sup>{exponent[end:]}"
