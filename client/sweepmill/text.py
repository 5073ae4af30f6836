"""Numbers, times and aligned columns as text, the same in the terminal, in `repr` and in a notebook."""

import math
import textwrap
from collections.abc import Sequence
from html import escape
from typing import Any

SHORT_KEY = 12
WIDTH = 110


def short(key: str) -> str:
    """The digits of a key that people see; any unambiguous prefix of at least 8 digits works everywhere."""
    return key[:SHORT_KEY]


def count(number: int) -> str:
    """An integer with its digits grouped in threes."""
    return f"{number:,}"


def duration(seconds: float | None) -> str:
    """A time as people say it, in at most two units; empty where it is unknown."""
    if seconds is None:
        return ""
    for unit, size, part, part_size in (("d", 86400, "h", 3600), ("h", 3600, "min", 60), ("min", 60, "s", 1)):
        if seconds >= size:
            rest = int(seconds % size) // part_size
            return f"{int(seconds // size)} {unit}" + (f" {rest} {part}" if rest else "")
    return f"{seconds:.0f} s" if seconds >= 1 else "under 1 s"


def with_error(value: float, error: float) -> str:
    """The value with its error in units of its last digits, as in 0.1598(2); two digits of an error below 20."""
    if not (math.isfinite(value) and math.isfinite(error) and error > 0):
        return f"{value:.5g}"
    places = 1 - math.floor(math.log10(error))
    digits = round(error * 10.0**places)
    if digits >= 20:  # 10 to 19 keep both digits, 20 to 100 the first
        places, digits = places - 1, round(error * 10.0 ** (places - 1))
    if places > 0:
        return f"{value:.{places}f}({digits})"
    return f"{round(value * 10.0**places) * 10**-places}({digits * 10**-places})"


def wrapped(text: str, hang: str = "") -> str:
    """Running text in lines of a readable length, `hang` before all but the first."""
    return textwrap.fill(text, WIDTH, subsequent_indent=hang, break_on_hyphens=False, break_long_words=False)


def cell(value: Any) -> str:
    """One value in a table: six significant digits, nothing for what is absent."""
    if value is None or value != value:  # the second is nan
        return ""
    return f"{value:.6g}" if isinstance(value, float) else str(value)


def aligned(headers: Sequence[str], rows: Sequence[Sequence[Any]]) -> str:
    """Columns separated by two spaces, numbers to the right, the rest to the left."""
    texts = [list(headers), *([cell(value) for value in row] for row in rows)]
    widths = [max(map(len, column)) for column in zip(*texts, strict=True)]
    numeric = [any(isinstance(row[i], int | float) for row in rows) for i in range(len(headers))]
    lines = (
        "  ".join(
            text.rjust(width) if right else text.ljust(width)
            for text, width, right in zip(line, widths, numeric, strict=True)
        )
        for line in texts
    )
    return "\n".join(line.rstrip() for line in lines)


def html(headers: Sequence[str], rows: Sequence[Sequence[Any]], caption: str) -> str:
    """The same as an HTML table."""
    head = "".join(f"<th>{escape(header)}</th>" for header in headers)
    body = "".join("<tr>" + "".join(f"<td>{escape(cell(v))}</td>" for v in row) + "</tr>" for row in rows)
    return f"<table><caption>{escape(caption)}</caption><thead><tr>{head}</tr></thead><tbody>{body}</tbody></table>"
