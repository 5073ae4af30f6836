"""Reads the files a table comes in, and names their formats."""

import json
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any

from sweepmill.errors import SweepmillError
from sweepmill.extras import needing
from sweepmill.table_convert import ARROW_METADATA

MEDIA_TYPES = {
    ".json": "application/json",
    ".csv": "text/csv",
    ".arrow": "application/vnd.apache.arrow.stream",
    ".parquet": "application/vnd.apache.parquet",
}
Columns = tuple[Mapping[str, Sequence[Any]], Mapping[str, Any]]


def media_type(path: Path) -> str:
    """Media type for the suffix of a file. Raises ValueError for other suffixes."""
    if path.suffix not in MEDIA_TYPES:
        raise ValueError(f"{path.name}: the suffix gives the format, one of {', '.join(MEDIA_TYPES)}")
    return MEDIA_TYPES[path.suffix]


def read_columns(path: Path) -> Columns:
    """Columns and metadata of a file. Raises ValueError, OSError, SweepmillError, MissingExtra."""
    media_type(path)
    if path.suffix != ".json":
        return _read_arrow(path)
    try:
        body = json.loads(path.read_bytes())
        return body["columns"], body["metadata"]
    except (ValueError, KeyError, TypeError) as error:
        raise SweepmillError(f"{path} is not the table of a sweep") from error


def _read_arrow(path: Path) -> Columns:
    table = arrow_table(path)
    stored = (table.schema.metadata or {}).get(ARROW_METADATA, b"{}")
    return table.to_pydict(), json.loads(stored)


def arrow_table(path: Path) -> Any:
    """The `pyarrow.Table` in a file. Raises OSError, SweepmillError, MissingExtra."""
    with needing(f"reading {path.suffix} files", "analysis"):
        import pyarrow as pa
        import pyarrow.csv
        import pyarrow.ipc
        import pyarrow.parquet
    try:
        if path.suffix == ".parquet":
            return pa.parquet.read_table(path)
        if path.suffix == ".csv":
            return pa.csv.read_csv(path)
        with pa.ipc.open_stream(path.read_bytes()) as stream:
            return stream.read_all()
    except pa.ArrowInvalid as error:
        raise SweepmillError(f"{path} is not the table of a sweep: {error}") from error


def write_columns(path: Path, columns: Mapping[str, Sequence[Any]], metadata: Mapping[str, Any]) -> None:
    """Write columns and metadata; the suffix gives the format. Raises ValueError, OSError, MissingExtra."""
    media_type(path)
    if path.suffix == ".json":
        path.write_text(json.dumps({"columns": columns, "metadata": metadata}), encoding="utf-8")
        return
    with needing(f"writing {path.suffix} files", "analysis"):
        import pyarrow as pa
        import pyarrow.csv
        import pyarrow.ipc
        import pyarrow.parquet
    table = pa.table(dict(columns)).replace_schema_metadata({ARROW_METADATA: json.dumps(metadata)})
    if path.suffix == ".parquet":
        pa.parquet.write_table(table, path)
    elif path.suffix == ".csv":
        pa.csv.write_csv(table, path, pa.csv.WriteOptions(quoting_style="needed"))
    else:
        with pa.ipc.new_stream(str(path), table.schema) as stream:
            stream.write_table(table)
