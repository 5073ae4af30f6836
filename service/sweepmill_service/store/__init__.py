"""The single door to the database: every SQL statement of the service is in this package."""

from sweepmill_service.store.errors import AmbiguousKey, ShortKey, UnknownKey
from sweepmill_service.store.requests import UNSET, Submission
from sweepmill_service.store.store import Store
from sweepmill_service.store.tables import TableEntry

__all__ = ["UNSET", "AmbiguousKey", "ShortKey", "Store", "Submission", "TableEntry", "UnknownKey"]
