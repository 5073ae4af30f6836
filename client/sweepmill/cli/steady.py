"""sweepmill steady"""

import json as encoding
import sys
from pathlib import Path
from typing import Annotated

import typer

from sweepmill.cli.options import Url
from sweepmill.cli.source import FIGURES, Source, figure_path, headline, is_file, read_file, remote
from sweepmill.companion import TRAJECTORIES, companion
from sweepmill.errors import SweepmillError
from sweepmill.remote import RemoteSweep
from sweepmill.series import series_names, why_none
from sweepmill.sweep import Sweep
from sweepmill.table import Table
from sweepmill.text import wrapped

MOST = 100  # times the trajectories: more is beyond reach


def _json_path(path: Path | None) -> Path | None:
    if path is not None and path.suffix != ".json":
        raise typer.BadParameter(f"{path.name}: a specification is written as .json")
    return path


def steady(
    source: Source,
    of: Annotated[str | None, typer.Option(metavar="NAME", help="The observation; by default the only series.")] = None,
    tolerance: Annotated[float, typer.Option(min=0, help="Share of the mean by which a change would matter.")] = 0.02,
    written: Annotated[
        Path | None,
        typer.Option(
            "--companion",
            metavar="FILE",
            dir_okay=False,
            callback=_json_path,
            help="Where there is no series, write the specification of a sweep that has one.",
        ),
    ] = None,
    trajectories: Annotated[int, typer.Option(min=64, help="Trajectories of the companion.")] = TRAJECTORIES,
    json: Annotated[Path | None, typer.Option(dir_okay=False, metavar="FILE", help="Write the result.")] = None,
    figure: Annotated[
        Path | None,
        typer.Option(
            dir_okay=False, metavar="FILE", callback=figure_path, help=f"Write a figure: {' '.join(FIGURES)}."
        ),
    ] = None,
    url: Url = None,
) -> None:
    """Say whether the circuits of a sweep were deep enough.

    Compares the third with the fourth quarter of the layers of every ensemble, and shows how the depth that is
    needed grows with size. Counts from the first layer on grow for ever and are left out. Where nothing else was
    read along the layers, it prints the specification of a companion sweep (the same circuits and observations, read
    every few layers, on few trajectories); the exit code is then 1, or 0 where --companion names a file for it.

    Example: sweepmill steady 3b9f6c1e --figure steady.png
    """
    if is_file(source):
        table = read_file(source)
        if not series_names(table):
            raise SweepmillError(f"{why_none(table)}; give the key of the sweep to have a companion of it written")
        _judge(source, table, of, tolerance, json, figure)
        return
    with remote(source, url) as sweep:
        table = sweep.folds(of)
        if series_names(table):
            _judge(source, table, of, tolerance, json, figure)
        else:
            _advise(sweep, why_none(table), written, trajectories)


def _judge(source: str, table: Table, of: str | None, tolerance: float, json: Path | None, figure: Path | None) -> None:
    from sweepmill.analysis.selecting import NotOneCurve
    from sweepmill.analysis.steady_sweep import steady_sweep

    try:
        result = steady_sweep(table, of, tolerance)
    except NotOneCurve as error:
        raise typer.BadParameter(str(error)) from error
    except ValueError as error:
        raise SweepmillError(str(error)) from error
    print(f"{headline(source, table)}\n")
    print(wrapped(str(result)))
    print(f"\n{result.text()}")
    if (factor := result.steadiness.more_needed()) > 1:
        many = (
            f"some {factor:.2g} times the trajectories" if factor <= MOST else "no number of trajectories within reach"
        )
        print(f"\nnote: {many} would show or exclude a change by {100 * tolerance:g} % of the mean everywhere")
    if json is not None:
        json.write_text(result.to_json() + "\n", encoding="utf-8")
        print(f"\n{json}")
    if figure is not None:
        result.plot(figure)
        print(f"{'' if json else chr(10)}{figure}")


def _advise(sweep: RemoteSweep, why: str, written: Path | None, trajectories: int) -> None:
    """Say that there is no series, and write or print a sweep that has one."""
    wanted = companion(sweep.specification(), trajectories)
    text = encoding.dumps(wanted.normalized(), indent=1)
    print(f"{why}. A companion sweep would tell: {_described(wanted)}.", file=sys.stderr)
    if written is None:
        print(text)
        raise typer.Exit(1)
    written.write_text(text + "\n", encoding="utf-8")
    print(f"{written}\nto run it: sweepmill submit {written} --watch; then: sweepmill steady {wanted.key[:12]}")


def _described(sweep: Sweep) -> str:
    every = sweep.observe[0].at.model_dump()["every"]  # type: ignore[union-attr]
    names = ", ".join(item.name for item in sweep.observations)
    return f"{names} read every {every} layers on {sweep.stop.trajectories} trajectories of each circuit"
