"""sweepmill values"""

from pathlib import Path
from typing import Annotated

import typer

from sweepmill.cli.options import Key, Url
from sweepmill.client import Client
from sweepmill.values import FORMATS


def _known_format(path: Path) -> Path:
    if path.suffix not in FORMATS:
        raise typer.BadParameter(f"{path.name}: the suffix gives the format, one of {', '.join(FORMATS)}")
    return path


def values(
    key: Key,
    output: Annotated[
        Path,
        typer.Option(
            "-o",
            "--output",
            metavar="FILE",
            callback=_known_format,
            dir_okay=False,
            help=f"The file; the suffix gives the format: {' '.join(FORMATS)}.",
        ),
    ],
    of: Annotated[
        str | None, typer.Option(metavar="NAME", help="Which observation; needed where several keep their values.")
    ] = None,
    url: Url = None,
) -> None:
    """Write the values of every trajectory to a file.

    Of an observation with keep_values = true, one row per ensemble, trajectory and coordinate: the trajectories that
    the table rests on, in their order. The file appears complete or not at all.

    Example: sweepmill values 3b9f6c1e --of i3 -o i3.parquet
    """
    with Client(url) as client:
        print(client.sweep(key).download_values(output, of))
