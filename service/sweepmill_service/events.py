"""Progress of one sweep as server-sent events (WHATWG HTML, "Server-sent events").

Nothing is queued for a reader: each look at the database yields what changed since that reader's last event, so a slow
one sees fewer and larger steps and holds up nobody.
"""

import logging
import threading
import time
from collections.abc import AsyncIterator, Callable, Iterator

import anyio
import anyio.to_thread
from sqlalchemy.exc import DBAPIError
from sqlalchemy.exc import TimeoutError as PoolTimeout

from sweepmill.messages import EnsembleProgress, Message, SweepStatus
from sweepmill_service.store import Store

POLL_SECONDS = 0.5
HEARTBEAT_SECONDS = 15.0
ENSEMBLES_PER_EVENT = 500
FINAL_STATES = ("settled", "withdrawn", "stuck")
HEARTBEAT = b": still here\n\n"
RETRY = b"retry: 2000\n\n"
# Streams share few threads, so that many of them leave the others to the requests.
_THREADS = 4
Forecast = Callable[[SweepStatus], SweepStatus]
log = logging.getLogger(__name__)


class ProgressEvent(Message):
    """Data of one event: the sweep, and the ensembles that changed since the last event."""

    status: SweepStatus
    ensembles: list[EnsembleProgress]


class Feed:
    """What one reader has seen of a sweep, and what is new to it. Reads the database: not for the event loop."""

    def __init__(self, store: Store, key: str, seen: int | None, forecast: Forecast = lambda status: status) -> None:
        self.store = store
        self.forecast = forecast
        self.key = key
        self.seen = seen
        self.finished = False
        self._started = False

    def changes(self) -> Iterator[bytes]:
        """Events for everything since the last one; at first the current state even if nothing changed."""
        commit = self.store.commit_counter(self.key)
        if self._started and commit == self.seen:
            return
        status = self.forecast(self.store.sweep_status(self.key))
        if self.seen is not None and self.seen > status.commit:
            self.seen = None  # an id of another database: show everything
        yield from self._pages(status)
        self._started, self.seen = True, status.commit
        self.finished = status.state in FINAL_STATES

    def _pages(self, status: SweepStatus) -> Iterator[bytes]:
        """Only the last page carries the id: a reader cut off before it resumes from where it was."""
        after: int | None = None
        while True:
            page = self.store.progress(self.key, self.seen, ENSEMBLES_PER_EVENT, after)
            body = ProgressEvent(status=status, ensembles=page.ensembles)
            yield frame(body, None if page.next is not None else status.commit)
            if page.next is None:
                return
            after = page.next


def frame(body: ProgressEvent, identity: int | None) -> bytes:
    """One event in wire format; the JSON is one line."""
    line = "" if identity is None else f"id: {identity}\n"
    return f"{line}event: progress\ndata: {body.model_dump_json()}\n\n".encode()


async def stream(feed: Feed, stopping: threading.Event, limiter: anyio.CapacityLimiter) -> AsyncIterator[bytes]:
    """Events until the sweep cannot proceed by itself or the service stops."""
    yield RETRY
    last = time.monotonic()
    while not stopping.is_set():
        async for event in _in_threads(feed, limiter):
            yield event
            last = time.monotonic()
        if feed.finished:
            return
        if time.monotonic() - last > HEARTBEAT_SECONDS:
            yield HEARTBEAT
            last = time.monotonic()
        await anyio.sleep(POLL_SECONDS)


async def _in_threads(feed: Feed, limiter: anyio.CapacityLimiter) -> AsyncIterator[bytes]:
    changes = feed.changes()
    while True:
        try:
            event = await anyio.to_thread.run_sync(next, changes, None, limiter=limiter)
        except (DBAPIError, PoolTimeout) as error:
            log.warning("an event stream waits for the database: %s", str(error).splitlines()[0])
            return
        if event is None:
            return
        yield event


def limiter() -> anyio.CapacityLimiter:
    """The threads all event streams of one service share."""
    return anyio.CapacityLimiter(_THREADS)
