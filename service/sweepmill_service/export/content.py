"""A table in memory: Arrow record batches, a fraction of the size of the totals they come from."""

from collections.abc import Sequence
from typing import Any, NamedTuple

import pyarrow as pa

ROWS_PER_BATCH = 8192


class Content(NamedTuple):
    """Record batches of one schema, and the metadata of the table."""

    schema: pa.Schema
    batches: list[pa.RecordBatch]
    metadata: dict[str, Any]


class Rows:
    """Collects rows, turning every few thousand into a record batch."""

    def __init__(self, schema: pa.Schema) -> None:
        self.schema = schema
        self.batches: list[pa.RecordBatch] = []
        self.count = 0
        self._columns: list[list[Any]] = [[] for _ in schema]

    def extend(self, constant: Sequence[Any], varying: Sequence[Sequence[Any]]) -> None:
        """Add rows that begin with the same values."""
        if not varying:
            return
        added = len(varying)
        for column, value in zip(self._columns, constant, strict=False):
            column.extend([value] * added)
        for column, values in zip(self._columns[len(constant) :], zip(*varying, strict=True), strict=True):
            column.extend(values)
        self.count += added
        if len(self._columns[0]) >= ROWS_PER_BATCH:
            self._flush()

    def finished(self) -> list[pa.RecordBatch]:
        """All record batches."""
        if self._columns[0]:
            self._flush()
        return self.batches

    def _flush(self) -> None:
        # from_pandas: nan, a number that is undefined, becomes null
        arrays = [
            pa.array(values, field.type, from_pandas=True)
            for values, field in zip(self._columns, self.schema, strict=True)
        ]
        self.batches.append(pa.record_batch(arrays, schema=self.schema))
        self._columns = [[] for _ in self.schema]
