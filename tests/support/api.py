"""The application behind a real socket, in a thread: what users reach, without a process of its own."""

import socket
import threading
import time
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from typing import Any

import httpx
import uvicorn

from sweepmill.sweep import Sweep
from sweepmill_service.app import create_app
from sweepmill_service.runtime import Runtime
from sweepmill_service.serve import server_configuration
from sweepmill_service.settings import Settings
from sweepmill_service.store import Store
from sweepmill_service.store.results import BatchResult, Kept
from sweepmill_worker.sample import sample_plain

PATIENCE = 60.0
COMMITTED_AT_ONCE = 100


@dataclass(frozen=True)
class Api:
    """A running application, a client of it, and the store behind it."""

    http: httpx.Client
    runtime: Runtime

    @property
    def store(self) -> Store:
        """The store the application answers from."""
        return self.runtime.store

    def submit(self, sweep: Sweep, **headers: str) -> httpx.Response:
        """POST a sweep as a client does."""
        body = sweep.normalized() | {"label": sweep.label, "priority": sweep.priority}
        return self.http.post("/v1/sweeps", json=body, headers=headers)


def eventually(condition: Callable[[], Any], what: str) -> Any:
    """The first true value of a condition, asked again and again. Raises AssertionError after a minute."""
    deadline = time.monotonic() + PATIENCE
    while time.monotonic() < deadline:
        if value := condition():
            return value
        time.sleep(0.02)
    raise AssertionError(f"in vain waited for: {what}")


@contextmanager
def serving(settings: Settings) -> Iterator[Api]:
    """Serve an application until the end of the block; its database is open when the block begins."""
    app = create_app(settings)
    server = uvicorn.Server(server_configuration(app, settings))
    runtime: Runtime = app.state.runtime
    with socket.create_server(("127.0.0.1", 0)) as listener:
        thread = threading.Thread(target=server.run, args=([listener],))
        thread.start()
        try:
            eventually(lambda: server.started and (runtime.is_ready() or runtime.failure), "the application")
            url = f"http://127.0.0.1:{listener.getsockname()[1]}"
            with httpx.Client(base_url=url, timeout=30, trust_env=False) as http:
                yield Api(http, runtime)
        finally:
            runtime.stopping.set()
            server.should_exit = True
            thread.join(PATIENCE)


def reading_only(database: str, **changes: Any) -> Settings:
    """Settings of an application that does not dispatch."""
    return Settings(database=database, dispatch=False, **changes)


def sampled_by_hand(store: Store, sweep: Sweep, upto: int, first: int = 0, owner: str = "local") -> None:
    """Sample trajectories [first, upto) of every ensemble of a stored sweep, as the pool would."""
    forms = [item.observation.normal_form() for item in sweep.observations]
    for begin in range(0, len(sweep.points), COMMITTED_AT_ONCE):
        keyed = [(p.ensemble.key, p.ensemble.normal_form()) for p in sweep.points[begin : begin + COMMITTED_AT_ONCE]]
        plain = ((key, sample_plain(form, forms, first, upto - first)) for key, form in keyed)
        store.commit([_result(key, result, sweep.key, owner) for key, result in plain])


def _result(ensemble: str, plain: dict[str, Any], sweep: str, owner: str) -> BatchResult:
    return BatchResult(
        ensemble=ensemble,
        first=plain["first"],
        count=plain["count"],
        accumulators=plain["accumulators"],
        digests=plain["digests"],
        seconds=plain["seconds"],
        worker="by-hand",
        versions=plain["versions"],
        sweep=sweep,
        owner=owner,
        values={key: Kept(*chunk) for key, chunk in plain["values"].items()},
    )
