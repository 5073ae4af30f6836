"""sweepmill histogram"""

from enum import StrEnum
from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from sweepmill.cli.options import Key, Url
from sweepmill.client import Client
from sweepmill.errors import SweepmillError
from sweepmill.extras import needing
from sweepmill.observation import wants_histogram
from sweepmill.remote import RemoteSweep
from sweepmill.sweep import NamedObservation, Sweep
from sweepmill.table_files import MEDIA_TYPES

if TYPE_CHECKING:
    from sweepmill.analysis.distribution import Distribution

FIGURES = (".png", ".pdf", ".svg")


class Law(StrEnum):
    """Exact laws to compare with."""

    STABILIZER = "stabilizer"


def _suffix(path: Path | None, known: tuple[str, ...]) -> Path | None:
    if path is not None and path.suffix not in known:
        raise typer.BadParameter(f"{path.name}: the suffix gives the format, one of {', '.join(known)}")
    return path


def _table_format(path: Path | None) -> Path | None:
    return _suffix(path, tuple(MEDIA_TYPES))


def _figure_format(path: Path | None) -> Path | None:
    return _suffix(path, FIGURES)


def _conditions(texts: list[str] | None) -> list[str]:
    if wrong := [text for text in texts or [] if "=" not in text]:
        raise typer.BadParameter(f"{wrong[0]!r}: say which, as in measurement_rate=0.16")
    return texts or []


def histogram(
    key: Key,
    of: Annotated[
        str | None, typer.Option(metavar="NAME", help="Which observation; needed where several have a histogram.")
    ] = None,
    where: Annotated[
        list[str] | None,
        typer.Option(
            metavar="AXIS=VALUE",
            callback=_conditions,
            help="Only ensembles with this value of an axis, or this layer or position; may be repeated.",
        ),
    ] = None,
    law: Annotated[
        Law | None, typer.Option(help="Compare each with an exact law: random stabilizer states of the same size.")
    ] = None,
    output: Annotated[
        Path | None,
        typer.Option(
            "-o",
            "--output",
            metavar="FILE",
            callback=_table_format,
            dir_okay=False,
            help=f"Write values, occurrences, shares and errors; by suffix: {' '.join(MEDIA_TYPES)}.",
        ),
    ] = None,
    figure: Annotated[
        Path | None,
        typer.Option(metavar="FILE", callback=_figure_format, dir_okay=False, help=f"Draw: {' '.join(FIGURES)}."),
    ] = None,
    url: Url = None,
) -> None:
    """Show and compare exact distributions.

    Of an observation with histogram = true: single readings. Of one with keep_values = true only: its value on every
    trajectory. Errors are by jackknife over folds of trajectories. Two distributions are tested for being of one law.
    Needs the extra `analysis`.

    Example: sweepmill histogram 3b9f6c1e --of entropy --where sites=64 --figure entropy.png
    """
    with needing("sweepmill histogram", "analysis"):
        from sweepmill.analysis.histogram_report import Report
    with Client(url) as client:
        sweep = client.sweep(key)
        specification = sweep.specification()
        item = _chosen(specification, of)
        report = Report(sweep.key, specification, item, _distributions(sweep, item))
    try:
        report = report.chosen(where or [])
    except KeyError as error:
        raise typer.BadParameter(str(error.args[0])) from error
    if law is not None:
        report = report.with_stabilizer_laws()
    print(report.text())
    if output is not None:
        report.write(output)
        print(output)
    if figure is not None:
        report.draw(figure)
        print(figure)


def _chosen(specification: Sweep, of: str | None) -> NamedObservation:
    able = [
        one for one in specification.observations if wants_histogram(one.observation) or one.observation.keep_values
    ]
    names = ", ".join(one.name for one in able)
    if not able:
        raise SweepmillError("no observation of this sweep has histogram = true or keep_values = true")
    if of is None and len(able) > 1:
        raise typer.BadParameter(f"name one observation with --of: {names}")
    found = [one for one in able if of in (None, one.name)]
    if not found:
        raise typer.BadParameter(f"{of!r} has no distribution; those that have one: {names}")
    return found[0]


def _distributions(sweep: RemoteSweep, item: NamedObservation) -> "tuple[Distribution, ...]":
    """Single readings if they were counted, else the values of whole trajectories."""
    from sweepmill.analysis.distribution import distributions, distributions_of_values

    if wants_histogram(item.observation):
        return tuple(distributions(sweep.histograms(folds=True).where(name=item.name)))
    try:
        return tuple(distributions_of_values(sweep.values(item.name)))
    except ValueError as error:
        raise SweepmillError(str(error)) from error
