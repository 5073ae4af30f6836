"""sweepmill dispatch"""

from __future__ import annotations

import signal
import threading
from typing import TYPE_CHECKING

from sweepmill.cli.settings import Database, Scheduler, Workers, settings_from
from sweepmill.errors import SweepmillError
from sweepmill.extras import needing

if TYPE_CHECKING:
    from sweepmill_service.runtime import Runtime

LOOK_SECONDS = 0.2


def dispatch(database: Database = None, workers: Workers = None, scheduler: Scheduler = None) -> None:
    """Run a dispatcher and its pool without a service.

    It works beside services started with --no-dispatch, on the same database. On Postgres a second dispatcher
    waits until the first one ends. One line is printed when the pool is ready. Needs the extra `server`.

    Example: sweepmill dispatch --database postgresql+psycopg:///sweepmill --workers 8
    """
    settings = settings_from(database=database, workers=workers, scheduler=scheduler)
    with needing("sweepmill dispatch", "server"):
        from sweepmill_service.logs import configure_logs
        from sweepmill_service.runtime import Runtime
    configure_logs(settings)
    _run(Runtime(settings), _stop_signal())


def _stop_signal() -> threading.Event:
    """Set by SIGTERM and SIGINT."""
    stop = threading.Event()
    for kind in (signal.SIGTERM, signal.SIGINT):
        signal.signal(kind, lambda *_: stop.set())
    return stop


def _run(runtime: Runtime, stop: threading.Event) -> None:
    """Dispatch until told to stop. Raises SweepmillError where that is not possible."""
    runtime.start()
    announced = False
    while runtime.failure is None and not stop.wait(LOOK_SECONDS):
        if not announced and runtime.is_ready():
            print("Sweepmill dispatches", flush=True)
            announced = True
    runtime.stop()
    if runtime.failure is not None:
        raise SweepmillError(runtime.failure)
