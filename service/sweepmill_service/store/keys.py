"""Keys shortened to an unambiguous prefix."""

from sqlalchemy import Connection, Table, select

from sweepmill_service.store.errors import SHORTEST, AmbiguousKey, ShortKey, UnknownKey

HEXADECIMAL = frozenset("0123456789abcdef")
LONGEST = 64
SHOWN = 5


def find(connection: Connection, table: Table, prefix: str) -> str:
    """The full key; raises ShortKey, UnknownKey or AmbiguousKey."""
    if len(prefix) < SHORTEST or not HEXADECIMAL.issuperset(prefix):
        raise ShortKey(prefix)
    key = table.c.key
    bounds = (key >= prefix, key <= prefix.ljust(LONGEST, "f"))
    keys = list(connection.scalars(select(key).where(*bounds).order_by(key).limit(SHOWN)))
    if not keys or len(prefix) > LONGEST:
        raise UnknownKey(table.name, prefix)
    if len(keys) > 1:
        raise AmbiguousKey(table.name, prefix, keys)
    return str(keys[0])
