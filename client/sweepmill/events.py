"""Reads server-sent events (WHATWG HTML, "Server-sent events") from lines of text."""

from collections.abc import Iterable, Iterator
from typing import NamedTuple


class Event(NamedTuple):
    """One event; `id` is the last one the stream gave, None before the first."""

    id: str | None
    name: str
    data: str


def parse_events(lines: Iterable[str]) -> Iterator[Event]:
    """Events in the order they arrive; what the end of the stream cuts off is dropped, as the format asks."""
    last_id: str | None = None
    name, data = "", list[str]()
    for line in lines:
        if not line:
            if data:
                yield Event(last_id, name or "message", "\n".join(data))
            name, data = "", []
            continue
        field, _, value = line.partition(":")  # a comment is a field without a name
        value = value.removeprefix(" ")
        if field == "data":
            data.append(value)
        elif field == "event":
            name = value
        elif field == "id" and "\0" not in value:
            last_id = value
