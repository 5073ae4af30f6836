"""Where an analysis takes its data from: a sweep at the service, or a file written earlier."""

import re
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Annotated

import typer

from sweepmill.client import Client
from sweepmill.errors import SweepmillError
from sweepmill.folds import Folds
from sweepmill.remote import RemoteSweep
from sweepmill.table import BY_FOLD, FOLDS, Table
from sweepmill.table_files import MEDIA_TYPES, read_columns
from sweepmill.text import short

FIGURES = (".png", ".svg", ".pdf")
Source = Annotated[
    str,
    typer.Argument(
        metavar="SOURCE", help="Key of a sweep (8 digits or more), or a file of `sweepmill folds` or `sweepmill table`."
    ),
]


def is_file(source: str) -> bool:
    """Whether a source is a file; misuse of the command where it is neither that nor can be a key."""
    path = Path(source)
    if path.is_file():
        return True
    if path.suffix in MEDIA_TYPES:
        raise typer.BadParameter(f"SOURCE {source}: there is no such file")
    if not re.fullmatch("[0-9a-fA-F]{8,64}", source):
        raise typer.BadParameter(f"SOURCE {source!r} is no file, and no key: that has 8 to 64 hexadecimal digits")
    return False


def read_file(source: str) -> Table:
    """The folds or the table in a file. Raises SweepmillError for other contents."""
    columns, metadata = read_columns(Path(source))
    if "name" not in columns or "mean" not in columns:
        raise SweepmillError(f"{source} has no columns `name` and `mean`: it is neither a table nor folds of a sweep")
    return (Folds if all(name in columns for name in FOLDS) else Table)(columns, metadata)


def read_source(source: str, name: str | None, url: str | None) -> Table:
    """Folds of the observation of that name, or of all, from the service; or whatever a file holds."""
    if is_file(source):
        return read_file(source)
    with remote(source, url) as sweep:
        return sweep.folds(_checked(sweep, name))


def read_histograms(source: str, url: str | None) -> Table:
    """Exact histograms by fold, which the service has. Raises SweepmillError for a file without them."""
    if not is_file(source):
        with remote(source, url) as sweep:
            return sweep.histograms(folds=True)
    columns, metadata = read_columns(Path(source))
    if BY_FOLD not in columns:
        raise SweepmillError(f"{source} has no histograms by fold: give the key of the sweep, whose service has them")
    return Table(columns, metadata)


@contextmanager
def remote(source: str, url: str | None) -> Iterator[RemoteSweep]:
    """The sweep of a key at the service."""
    with Client(url) as client:
        yield client.sweep(source)


def _checked(sweep: RemoteSweep, name: str | None) -> str | None:
    names = sweep.status().names
    if name is not None and name not in names:
        raise typer.BadParameter(f"no observation {name!r}: one of {', '.join(names)}")
    return name if name is not None or len(names) > 1 else names[0]


def headline(source: str, table: Table) -> str:
    """What the data are: the sweep, its ensembles and trajectories, and whether there are folds."""
    sweep = table.metadata.get("sweep")
    parts = [f"sweep {short(str(sweep))}" if sweep else source]
    if table.ensembles:
        parts.append(_counted(len(table.ensembles), "ensemble"))
    if any(not one.get("frozen", True) for one in table.ensembles):
        parts[0] += " (still being sampled)"
    if table.ensembles and "trajectories" in table:
        per_ensemble = [table.values("trajectories")[one["rows"][0]] for one in table.ensembles]
        parts.append(_counted(sum(per_ensemble), "trajectory", "trajectories"))
    by_fold = next((table.values(name) for name in (FOLDS[0], BY_FOLD) if name in table), [])
    least = min(map(len, by_fold), default=0)
    parts.append(f"{least} folds" if least else "no folds, so errors are propagated from the table")
    return ", ".join(parts)


def _counted(number: int, one: str, many: str = "") -> str:
    return f"{number:,} {one if number == 1 else many or one + 's'}"


def figure_path(path: Path | None) -> Path | None:
    """Misuse of the command for a suffix that no figure has."""
    if path is not None and path.suffix not in FIGURES:
        raise typer.BadParameter(f"{path.name}: the suffix gives the format, one of {', '.join(FIGURES)}")
    return path
