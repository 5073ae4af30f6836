"""Where the numbers come from: a sweep of the service, a specification, or files."""

import json
import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from pathlib import Path
from typing import TYPE_CHECKING

from sweepmill.ensemble import LAYERED, Ensemble
from sweepmill.errors import SweepmillError, UnknownKey
from sweepmill.messages import EnsembleProgress
from sweepmill.sweep import Sweep
from sweepmill.table import COUNTS, Table
from sweepmill.table_files import MEDIA_TYPES

if TYPE_CHECKING:
    from sweepmill.client import Client

_KEY = re.compile(r"[0-9a-fA-F]{8,64}")


@dataclass(frozen=True)
class Source:
    """What is known of one sweep: its table, its histograms, and its ensembles by their keys, as far as given."""

    table: Table | None = None
    histograms: Table | None = None
    ensembles: Mapping[str, Ensemble] = field(default_factory=dict)
    key: str | None = None


def read_source(given: Sequence[str | Path], client: "Client | None" = None) -> Source:
    """A key or a specification, whose numbers the client fetches; or files, with or without their specification.

    Files are the table and the histograms of one sweep. Raises SweepmillError where they do not fit together,
    OSError, and what the client raises.
    """
    texts = [str(one) for one in given]
    if len(texts) == 1 and _KEY.fullmatch(texts[0]) and not Path(texts[0]).exists():
        return _fetched(texts[0], _needed(client))
    tables, specification = _files([Path(one) for one in texts])
    if not tables and specification is not None:
        return _fetched(specification.key, _needed(client), specification)
    return _together(tables, specification)


def _needed(client: "Client | None") -> "Client":
    if client is None:
        raise SweepmillError("a key and a specification need a service to ask: give a client, or files")
    return client


def _fetched(key: str, client: "Client", specification: Sweep | None = None) -> Source:
    try:
        remote = client.sweep(key)
    except UnknownKey:
        if specification is None:
            raise
        raise SweepmillError("the service does not have this sweep yet: submit its specification first") from None
    if specification is None:
        families = remote.status().families
        ensembles = {one.ensemble: _ensemble(client, one, families) for one in remote.ensembles()}
    else:
        ensembles = {point.ensemble.key: point.ensemble for point in specification.points}
    return Source(remote.table(), remote.histograms(), ensembles, remote.key)


def _ensemble(client: "Client", progress: EnsembleProgress, families: Sequence[str]) -> Ensemble:
    """What the progress tells is the whole ensemble, unless there are several families or circuits as data."""
    if len(families) == 1 and families[0] != LAYERED:
        ensemble = Ensemble.of(families[0], **progress.parameters)
        if ensemble.key == progress.ensemble:
            return ensemble
    record = client.ensemble(progress.ensemble)
    return Ensemble.from_normal_form({"family": record.family, "revision": record.revision, **record.parameters})


def _files(paths: Sequence[Path]) -> tuple[list[Table], Sweep | None]:
    tables, specifications = [], []
    for path in paths:
        if not path.exists():
            raise SweepmillError(f"{path} is neither a file nor a key (8 to 64 hexadecimal digits)")
        if path.suffix == ".toml" or (path.suffix == ".json" and not _is_table(path)):
            specifications.append(Sweep.read(path))
        elif path.suffix in MEDIA_TYPES:
            tables.append(Table.read(path))
        else:
            known = ", ".join((".toml", *MEDIA_TYPES))
            raise SweepmillError(f"{path.name}: the suffix gives the format, one of {known}")
    if len(specifications) > 1:
        raise SweepmillError("give one specification: a report is about one sweep")
    return tables, specifications[0] if specifications else None


def _is_table(path: Path) -> bool:
    try:
        body = json.loads(path.read_bytes())
    except ValueError as error:
        raise SweepmillError(f"{path} is not JSON: {error}") from error
    return isinstance(body, dict) and {"columns", "metadata"} <= body.keys()


def _together(tables: Sequence[Table], specification: Sweep | None) -> Source:
    kinds = {all(name in one for name in COUNTS): one for one in tables}
    if len(kinds) < len(tables):
        raise SweepmillError("give at most one table and one file of histograms: a report is about one sweep")
    keys = {str(one.metadata["sweep"]) for one in tables if "sweep" in one.metadata}
    if specification is not None:
        keys.add(specification.key)
    if len(keys) > 1:
        raise SweepmillError(f"these files are of {len(keys)} sweeps: a report is about one")
    points = () if specification is None else specification.points
    ensembles = {point.ensemble.key: point.ensemble for point in points}
    return Source(kinds.get(False), kinds.get(True), ensembles, next(iter(keys), None))
