"""sweepmill folds"""

from pathlib import Path
from typing import Annotated

import typer

from sweepmill.cli.options import Key, Url
from sweepmill.client import Client
from sweepmill.folds import FORMATS


def _known_format(path: Path) -> Path:
    if path.suffix not in FORMATS:
        raise typer.BadParameter(f"{path.name}: the suffix gives the format, one of {', '.join(FORMATS)}")
    return path


def folds(
    key: Key,
    output: Annotated[
        Path,
        typer.Option(
            "-o",
            "--output",
            metavar="FILE",
            callback=_known_format,
            dir_okay=False,
            help=f"The file to write; the suffix gives the format: {' '.join(FORMATS)}.",
        ),
    ],
    name: Annotated[str | None, typer.Option(help="Only the observation of this name.")] = None,
    url: Url = None,
) -> None:
    """Write sums over folds of trajectories to a file.

    The rows are those of the table. That is what fits start from: `sweepmill fit` reads the file without a service,
    and errors are by jackknife.
    Trajectory k belongs to fold k modulo the length of the lists `numerators` and `denominators` of a row.

    Example: sweepmill folds 3b9f6c1e -o transition.arrow
    """
    with Client(url) as client:
        print(client.sweep(key).download_folds(output, name))
