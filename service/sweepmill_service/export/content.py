"""A table in memory: Arrow record batches, a fraction of the size of the totals they come from."""

from collections.abc import Iterable
from typing import Any, NamedTuple

import pyarrow as pa

ROWS_PER_BATCH = 8192


class Content(NamedTuple):
    """Record batches of one schema, the metadata of the table, and a digest of the N it rests on."""

    schema: pa.Schema
    batches: Iterable[pa.RecordBatch]
    metadata: dict[str, Any]
    version: str


class Rows:
    """Collects rows, turning every few thousand into a record batch."""

    def __init__(self, schema: pa.Schema) -> None:
        self.schema = schema
        self.batches: list[pa.RecordBatch] = []
        self.count = 0
        self._pending: list[tuple[Any, ...]] = []

    def append(self, row: tuple[Any, ...]) -> None:
        """Add one row: a value for every column."""
        self._pending.append(row)
        self.count += 1
        if len(self._pending) >= ROWS_PER_BATCH:
            self._flush()

    def finished(self) -> list[pa.RecordBatch]:
        """All record batches."""
        if self._pending:
            self._flush()
        return self.batches

    def _flush(self) -> None:
        # from_pandas: nan, a number that is undefined, becomes null
        columns = zip(zip(*self._pending, strict=True), self.schema, strict=True)
        arrays = [pa.array(values, field.type, from_pandas=True) for values, field in columns]
        self.batches.append(pa.record_batch(arrays, schema=self.schema))
        self._pending = []
