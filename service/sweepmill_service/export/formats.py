"""Writes a table in the format asked for, piece by piece."""

import json
from collections.abc import Callable, Iterator, Mapping
from functools import partial
from typing import Any

import pyarrow as pa
import pyarrow.csv
import pyarrow.ipc
import pyarrow.parquet

from sweepmill_service.export.content import Content

ARROW_METADATA = b"sweepmill"  # key of the table's metadata, as JSON, in the schema
Writer = Callable[[Content], Iterator[bytes]]


class Pieces:
    """A file object that hands over what was written to it."""

    def __init__(self) -> None:
        self.closed = False
        self._held: list[bytes] = []
        self._position = 0

    def write(self, data: bytes) -> int:
        """Keep a piece."""
        self._held.append(bytes(data))
        self._position += len(data)
        return len(data)

    def tell(self) -> int:
        """Bytes written so far."""
        return self._position

    def flush(self) -> None:
        """Nothing is held back from `take`."""

    def close(self) -> None:
        """Pieces written before can still be taken."""
        self.closed = True

    def take(self) -> bytes:
        """What was written since the last call."""
        data = b"".join(self._held)
        self._held.clear()
        return data


def write_json(content: Content) -> Iterator[bytes]:
    """`{"columns": {name: values}, "metadata": {...}}`, undefined numbers as null."""
    yield b'{"columns":{'
    for index, name in enumerate(content.schema.names):
        yield f"{',' if index else ''}{json.dumps(name)}:[".encode()
        for place, batch in enumerate(content.batches):  # never a whole column as Python numbers
            values = json.dumps(batch.column(name).to_pylist(), allow_nan=False, separators=(",", ":"))
            yield f"{',' if place else ''}{values[1:-1]}".encode()
        yield b"]"
    yield f'}},"metadata":{json.dumps(content.metadata, separators=(",", ":"))}}}'.encode()


def write_csv(content: Content) -> Iterator[bytes]:
    """Plain CSV (RFC 4180) with a header line; empty where a value is undefined. The metadata is not in it."""
    options = pyarrow.csv.WriteOptions(quoting_style="needed")
    return streamed(content, content.schema, partial(pyarrow.csv.CSVWriter, write_options=options))


def write_arrow(content: Content) -> Iterator[bytes]:
    """Arrow's streaming format with the metadata in the schema."""
    return streamed(content, with_metadata(content), pyarrow.ipc.new_stream)


def write_parquet(content: Content) -> Iterator[bytes]:
    """Parquet with the metadata in the schema."""
    return streamed(content, with_metadata(content), pyarrow.parquet.ParquetWriter)


def with_metadata(content: Content) -> pa.Schema:
    """The schema with the metadata in it."""
    return content.schema.with_metadata({ARROW_METADATA: json.dumps(content.metadata)})


def streamed(content: Content, schema: pa.Schema, open_writer: Callable[[Any, pa.Schema], Any]) -> Iterator[bytes]:
    """What a writer makes of the record batches, piece by piece."""
    pieces = Pieces()
    with pa.PythonFile(pieces, mode="w") as sink, open_writer(sink, schema) as writer:
        for batch in content.batches:
            writer.write_batch(batch.cast(schema))
            yield pieces.take()
    yield pieces.take()


WRITERS: Mapping[str, Writer] = {
    "json": write_json,
    "csv": write_csv,
    "arrow": write_arrow,
    "parquet": write_parquet,
}
