"""Optional dependencies: imported where they are used, with a message that names the extra."""

from collections.abc import Iterator
from contextlib import contextmanager

from sweepmill.errors import MissingExtra


@contextmanager
def needing(feature: str, extra: str) -> Iterator[None]:
    """Around the imports a feature needs. Raises MissingExtra where one of them is not installed."""
    try:
        yield
    except ModuleNotFoundError as error:
        if (error.name or "").startswith("sweepmill"):
            raise  # part of this distribution: no extra would bring it
        raise MissingExtra(feature, extra) from error
