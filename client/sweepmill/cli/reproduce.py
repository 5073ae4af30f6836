"""sweepmill reproduce"""

import os
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Annotated

import typer

from sweepmill.cli.options import Url
from sweepmill.client import Client
from sweepmill.published import catalogue, named
from sweepmill.text import aligned, duration

SETTINGS = {"SWEEPMILL_KERNELS": "[]"}  # compiled when the first batch needs them: a result needs few


def reproduce(
    name: Annotated[
        str | None, typer.Argument(metavar="[NAME]", help="Which result; without one, all are listed.")
    ] = None,
    quick: Annotated[bool, typer.Option("--quick", help="Few trajectories: a first look in seconds.")] = False,
    show: Annotated[bool, typer.Option("--show", help="Print the specification and do nothing.")] = False,
    directory: Annotated[
        Path, typer.Option(metavar="DIRECTORY", file_okay=False, help="Where figures and the database go.")
    ] = Path("reproduced"),
    url: Url = None,
) -> None:
    """Find a published result again, and print ours beside it.

    Runs on the service at --url or SWEEPMILL_URL, else on one that it starts on this machine for the time of the run
    (extra `server`). The exit code is 1 if a value that decides is not reproduced. Needs the extra `analysis`.

    Example: sweepmill reproduce projective-ising-critical-point
    """
    if name is None:
        print(listing())
        return
    entry = named(name)
    if show:
        print(entry.specification.read_text(encoding="utf-8"), end="")
        return
    from sweepmill.published.run import reproduce as run

    directory.mkdir(parents=True, exist_ok=True)
    with _client(url, directory) as client:
        found = run(entry, client, entry.published.quick if quick else None, directory)
    print(found.text())
    if not found.reproduced and not quick:
        raise typer.Exit(1)


def listing() -> str:
    """All results, one a line."""
    rows = [
        [one.name, one.published.result, one.published.headline, duration(one.published.seconds)] for one in catalogue()
    ]
    return aligned(["name", "result", "known", "two cores"], rows)


@contextmanager
def _client(url: str | None, directory: Path) -> Iterator[Client]:
    if url is not None or os.environ.get("SWEEPMILL_URL"):
        with Client(url) as client:
            yield client
        return
    from sweepmill.demo import service

    database = f"sqlite:///{(directory / 'reproduced.sqlite').resolve()}"
    print(f"Starting a service on {database} (the first run compiles kernels) …", flush=True)
    with service(database, SETTINGS) as address, Client(address) as client:
        yield client
