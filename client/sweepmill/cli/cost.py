"""sweepmill cost"""

import json
import sys
from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from sweepmill.cli.options import Url
from sweepmill.client import Client
from sweepmill.errors import SweepmillError

if TYPE_CHECKING:
    from sweepmill.experiment import Cost, Options, Source

FORMATS = (".html", ".md", ".json")
ADVICE = "This sweep over the same circuits observes it; --companion FILE writes it:"


def _known_format(path: Path | None) -> Path | None:
    if path is not None and path.suffix not in FORMATS:
        raise typer.BadParameter(f"{path.name}: the suffix gives the format, one of {', '.join(FORMATS)}")
    return path


def cost(
    source: Annotated[
        list[str],
        typer.Argument(
            metavar="SOURCE...",
            help="A key, a specification, or files: the table or the histograms of a sweep, its specification beside.",
        ),
    ],
    output: Annotated[
        Path | None,
        typer.Option(
            "-o",
            "--output",
            metavar="FILE",
            callback=_known_format,
            dir_okay=False,
            help="Write the report; the suffix gives the format: .html .md .json. Without it, Markdown is printed.",
        ),
    ] = None,
    of: Annotated[
        str | None, typer.Option(metavar="NAME", help="Observation of record-bits to use; by default all of them.")
    ] = None,
    shot_time: Annotated[float, typer.Option(metavar="SECONDS", help="Assumed duration of one repetition.")] = 1e-4,
    select: Annotated[
        int | None,
        typer.Option(metavar="K", min=1, help="Post-select on the first K outcomes; default: 10, 20 and 40."),
    ] = None,
    precision: Annotated[
        float, typer.Option(metavar="ERROR", help="Wanted error of an observable with values between -1 and 1.")
    ] = 0.1,
    write_companion: Annotated[
        Path | None,
        typer.Option(
            "--companion",
            metavar="FILE",
            dir_okay=False,
            help="Write the specification of a sweep over the same circuits that observes what this needs, and stop.",
        ),
    ] = None,
    write_laboratory: Annotated[
        Path | None,
        typer.Option(
            "--laboratory",
            metavar="FILE",
            dir_okay=False,
            help="Write the unitary circuit read sideways as the specification of a sweep, too.",
        ),
    ] = None,
    url: Url = None,
) -> None:
    """Report what an experiment would pay for a sweep.

    Repetitions until a record is met again, post-selection, qubits, layers, measurements, on one page. The sweep
    needs an observation of record-bits, best a series of depths with histogram = true. Where it has none,
    the specification of a companion sweep that does is printed on standard error, and the exit code is 1.

    Example: sweepmill cost 3b9f6c1e -o report.html
    """
    from sweepmill import experiment
    from sweepmill.experiment.companion import as_toml, companion

    try:
        options = experiment.Options(of, shot_time, select, precision)
    except ValueError as error:
        raise typer.BadParameter(str(error)) from error
    with Client(url) as client:
        found = experiment.read_source(source, client)
    if write_companion is not None:
        write_companion.write_text(as_toml(companion(found.ensembles.values())), encoding="utf-8")
        print(write_companion)
        return
    report = _reported(found, options)
    if write_laboratory is not None:
        write_laboratory.write_text(_laboratory(report), encoding="utf-8")
    if output is None:
        print(experiment.markdown(report), end="")
        return
    output.write_text(_written(report, output.suffix), encoding="utf-8")
    print(output)


def _reported(found: "Source", options: "Options") -> "Cost":
    """The report; without records, a companion on standard error and exit code 1."""
    from sweepmill.experiment import NoRecordBits, companion, cost_of
    from sweepmill.experiment.companion import as_toml

    try:
        return cost_of(found, options)
    except NoRecordBits as error:
        print(f"sweepmill: {error}", file=sys.stderr)
        if found.ensembles:
            print(f"{ADVICE}\n\n{as_toml(companion(found.ensembles.values()))}", file=sys.stderr)
        raise typer.Exit(1) from None


def _laboratory(report: "Cost") -> str:
    from sweepmill.experiment import laboratory_sweep
    from sweepmill.experiment.companion import as_toml

    if report.beside is None:
        raise SweepmillError("no circuit is known to put a laboratory beside: give a key or the specification")
    return as_toml(laboratory_sweep(report.beside.sideways))


def _written(report: "Cost", suffix: str) -> str:
    from sweepmill.experiment import markdown, page

    if suffix == ".json":
        return json.dumps(report.to_dict(), indent=1, allow_nan=False)
    return page(report) if suffix == ".html" else markdown(report)
