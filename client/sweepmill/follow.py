"""Follows a sweep until it settles: by its event stream, or by asking where that does not work."""

import time
from collections.abc import Callable, Iterator
from dataclasses import dataclass, field

from pydantic import ValidationError

from sweepmill.errors import (
    ServiceError,
    SweepStuck,
    SweepWithdrawn,
    TimedOut,
    Unavailable,
    Unreachable,
    WaitTimeout,
)
from sweepmill.events import parse_events
from sweepmill.messages import Message, SweepStatus
from sweepmill.transport import Transport

SILENCE = 45.0  # seconds without even a heartbeat after which a stream counts as lost
PAUSE = 1.0  # seconds between questions where there is no stream
FRUITLESS = 3  # streams in a row that brought nothing before asking takes over


class Progress(Message):
    """Data of one event, as far as following needs it."""

    status: SweepStatus


@dataclass
class Deadline:
    """A point in time, or never."""

    key: str
    seconds: float | None
    end: float = field(init=False)

    def __post_init__(self) -> None:
        self.end = float("inf") if self.seconds is None else time.monotonic() + self.seconds

    def left(self, at_most: float) -> float:
        """Seconds left, at most so many. Raises WaitTimeout when none are."""
        left = self.end - time.monotonic()
        if left <= 0:
            raise WaitTimeout(self.key, self.seconds or 0.0)
        return min(left, at_most)

    def near(self) -> bool:
        """Whether a single read of a stream could last beyond it."""
        return self.end - time.monotonic() < SILENCE


@dataclass
class Follower:
    """One sweep being watched. A lost connection is borne for `patience` seconds, then raised."""

    transport: Transport
    key: str
    deadline: Deadline
    patience: float = 600.0
    sleep: Callable[[float], None] = time.sleep
    last_id: str | None = None
    fruitless: int = 0

    def statuses(self) -> Iterator[SweepStatus]:
        """Statuses as they change, the last one settled.

        Raises SweepStuck, SweepWithdrawn, WaitTimeout, and Unreachable beyond the patience.
        """
        while True:
            status = self._ask()
            yield status
            if _final(status):
                return
            for status in self._streamed():
                yield status
                if _final(status):
                    return
            self.sleep(self.deadline.left(PAUSE))

    def _ask(self) -> SweepStatus:
        """The status now, however often that must be asked within the patience."""
        lost_since = time.monotonic()
        while True:
            try:
                return self.transport.fetch(SweepStatus, "GET", f"/v1/sweeps/{self.key}")
            except (Unreachable, Unavailable, TimedOut):
                if time.monotonic() - lost_since > self.patience:
                    raise
            self.sleep(self.deadline.left(PAUSE))

    def _streamed(self) -> Iterator[SweepStatus]:
        """Statuses of one event stream until it ends or breaks; none near the deadline, which a read could miss."""
        if self.fruitless >= FRUITLESS or self.deadline.near():
            return
        self.fruitless += 1
        try:
            yield from self._events()
        except (Unreachable, TimedOut, ServiceError, ValidationError):
            return  # asking, next, tells whether the service or only the stream is at fault

    def _events(self) -> Iterator[SweepStatus]:
        headers = {"Accept": "text/event-stream"} | ({"Last-Event-ID": self.last_id} if self.last_id else {})
        with self.transport.stream(f"/v1/sweeps/{self.key}/events", headers, SILENCE) as response:
            for event in parse_events(self._in_time(response.iter_lines())):
                self.fruitless = 0
                self.last_id = event.id
                yield Progress.model_validate_json(event.data).status

    def _in_time(self, lines: Iterator[str]) -> Iterator[str]:
        for line in lines:  # heartbeats too, so that a quiet stream ends as well
            if self.deadline.near():
                return
            yield line


def _final(status: SweepStatus) -> bool:
    if status.state == "stuck":
        raise SweepStuck(status.key, status.reason or "the service gives no reason")
    if status.state == "withdrawn":
        raise SweepWithdrawn(status.key)
    return status.state == "settled"


def follow(transport: Transport, key: str, timeout: float | None) -> Iterator[SweepStatus]:
    """Statuses of a sweep until it settles; see `Follower`."""
    return Follower(transport, key, Deadline(key, timeout)).statuses()
