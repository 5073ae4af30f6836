"""sweepmill table"""

from pathlib import Path
from typing import Annotated

import typer

from sweepmill.cli.options import Key, Url
from sweepmill.client import Client
from sweepmill.table_files import MEDIA_TYPES, media_type


def _known_format(path: Path | None) -> Path | None:
    try:
        if path is not None:
            media_type(path)
    except ValueError as error:
        raise typer.BadParameter(str(error)) from error
    return path


def table(
    key: Key,
    output: Annotated[
        Path | None,
        typer.Option(
            "-o",
            "--output",
            metavar="FILE",
            callback=_known_format,
            dir_okay=False,
            help=f"Write a file; the suffix gives the format: {' '.join(MEDIA_TYPES)}.",
        ),
    ] = None,
    name: Annotated[str | None, typer.Option(help="Print only the observation of this name.")] = None,
    url: Url = None,
) -> None:
    """Print the table of a sweep, or write it to a file.

    A sweep that is still being sampled has a table too; the file appears complete or not at all.

    Example: sweepmill table 3b9f6c1e -o transition.csv
    """
    if output is not None and name is not None:
        raise typer.BadParameter("a file has all observations; --name is for printing")
    with Client(url) as client:
        sweep = client.sweep(key)
        if output is not None:
            print(sweep.download(output))
            return
        whole = sweep.table()
    known = sorted(set(whole.values("name")))
    if known and name is not None and name not in known:
        raise typer.BadParameter(f"no observation {name!r}: one of {', '.join(known)}")
    print((whole if name is None else whole.where(name=name)).text())
