"""sweepmill fit"""

from enum import StrEnum
from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from sweepmill.cli.options import Url
from sweepmill.cli.source import FIGURES, Source, figure_path, headline, read_histograms, read_source
from sweepmill.errors import SweepmillError
from sweepmill.table import Table
from sweepmill.text import wrapped

if TYPE_CHECKING:
    from sweepmill.analysis.choosing import Choice, Chosen
    from sweepmill.analysis.kinds import Kind, Options, Report


class What(StrEnum):
    """What is fitted."""

    COLLAPSE = "collapse"
    CROSSINGS = "crossings"
    MODEL_FREE = "model-free"
    LAW = "law"
    GROWTH = "growth"
    TIMES = "times"
    DECAY = "decay"
    CENTRAL_CHARGE = "central-charge"
    PURITY = "purity"


def _where(conditions: list[str]) -> list[str]:
    for one in conditions:
        if "=" not in one.strip("="):
            raise typer.BadParameter(f"{one!r}: a condition is written as axis=value")
    return conditions


def _sizes(text: str | None) -> str | None:
    if text and not all(part.strip().isdecimal() for part in text.split(",")):
        raise typer.BadParameter(f"{text!r}: sizes are whole numbers with commas between them, such as 32,64,128")
    return text


def _zeta(text: str) -> str:
    if text != "free" and _number(text) is None:
        raise typer.BadParameter(f"{text!r}: a number, or the word free")
    return text


def _number(text: str) -> float | None:
    try:
        return float(text)
    except ValueError:
        return None


def fit(
    what: Annotated[What, typer.Argument(metavar="WHAT", help=f"One of {', '.join(What)}.")],
    source: Source,
    of: Annotated[str | None, typer.Option(metavar="NAME", help="The observation; by default the only one.")] = None,
    x: Annotated[str | None, typer.Option(metavar="AXIS", help="The abscissa; by default the only one.")] = None,
    where: Annotated[
        list[str] | None,
        typer.Option(metavar="AXIS=VALUE", callback=lambda v: _where(v or []), help="Rows to take; repeatable."),
    ] = None,
    window: Annotated[tuple[float, float] | None, typer.Option(help="Range of the abscissa, ends included.")] = None,
    sizes: Annotated[str | None, typer.Option(callback=_sizes, help="Sizes to take, as in 32,64,128.")] = None,
    corrections: Annotated[
        bool, typer.Option("--corrections", help="Corrections to scaling with a free exponent (collapse, crossings).")
    ] = False,
    degree: Annotated[int, typer.Option(min=1, max=12, help="Degree of the polynomials (collapse, crossings).")] = 3,
    zeta: Annotated[
        str, typer.Option(callback=_zeta, help="Exponent zeta of y = L^(-zeta/nu) f: a number, or free.")
    ] = "0",
    ring: Annotated[
        float | None, typer.Option(min=2, help="Sites of a ring whose chords stand for lengths (law, decay).")
    ] = None,
    threshold: Annotated[
        float, typer.Option(min=1e-9, help="Bits that are left at a purification time (times).")
    ] = 1.0,
    rate: Annotated[float | None, typer.Option(min=0, help="Measurements per site and layer (central-charge).")] = None,
    anisotropy: Annotated[
        float, typer.Option(min=1e-3, help="Ratio of velocities, space to time (central-charge).")
    ] = 1.0,
    json: Annotated[
        Path | None, typer.Option(dir_okay=False, metavar="FILE", help="Write the result with its ensemble keys.")
    ] = None,
    figure: Annotated[
        Path | None,
        typer.Option(
            dir_okay=False, metavar="FILE", callback=figure_path, help=f"Write a figure: {' '.join(FIGURES)}."
        ),
    ] = None,
    url: Url = None,
) -> None:
    """Fit the data of a sweep, and say the result in a sentence.

    collapse, crossings, model-free: critical point and exponents of finite-size scaling.
    law: how entropies grow with a length or with size. growth: how they grow in time.
    times: purification times against size. decay: correlations against distance.
    central-charge: from the randomness of outcomes at criticality. purity: mean of 2^-S from exact histograms.
    A fit that does not describe its data says so and has no error bar; the exit code is 0 all the same, and 1 where
    nothing can be fitted. Needs the extra `analysis`.

    Example: sweepmill fit collapse 3b9f6c1e --of i3 --figure collapse.png
    """
    from sweepmill.analysis.choosing import Choice
    from sweepmill.analysis.kinds import KINDS, Options
    from sweepmill.analysis.selecting import NotOneCurve

    choice = Choice(of, x, _values(where or []), window, tuple(float(one) for one in (sizes or "").split(",") if one))
    options = Options(_number(zeta), degree, corrections, ring, threshold, rate, anisotropy)
    if unused := [name for name in options.changed() if name not in KINDS[what].settings]:
        takes = ", ".join(f"--{name}" for name in KINDS[what].settings) or "none of them"
        raise typer.BadParameter(f"--{unused[0]} means nothing to {what}, which takes {takes}")
    table = read_histograms(source, url) if what is What.PURITY else read_source(source, of, url)
    try:
        data, report = _fitted(table, choice, KINDS[what], options)
    except NotOneCurve as error:
        raise typer.BadParameter(str(error)) from error
    except ValueError as error:
        raise SweepmillError(f"{what}{f' of {of}' if of else ''} cannot be fitted: {error}") from error
    _print(headline(source, data.table), data, report)
    _write(data, report, json, figure)


def _fitted(table: Table, choice: "Choice", kind: "Kind", options: "Options") -> "tuple[Chosen, Report]":
    data = kind.choose(table, choice, kind.abscissae)
    return data, kind.run(data, options)


def _values(conditions: list[str]) -> dict[str, int | float | str]:
    pairs = (one.split("=", 1) for one in conditions)
    return {name.strip(): _value(text.strip()) for name, text in pairs}


def _value(text: str) -> int | float | str:
    number = _number(text)
    if number is None:
        return text
    return int(text) if text.lstrip("-").isdecimal() else number


def _print(head: str, data: "Chosen", report: "Report") -> None:
    print(f"{data.of} against {data.x}: {head}")
    for block in (wrapped(str(report.result)), *report.tables):
        print(f"\n{block}")
    if report.notes:
        print()
    for note in report.notes:
        print(wrapped(f"note: {note}", "      "))


def _write(data: "Chosen", report: "Report", json: Path | None, figure: Path | None) -> None:
    if json is not None:
        json.write_text(report.result.to_json() + "\n", encoding="utf-8")
        print(f"\n{json}")
    if figure is not None:
        report.result.plot(figure, *(report.labels or (data.x.replace("_", " "), data.of)))
        print(f"{'' if json else chr(10)}{figure}")
