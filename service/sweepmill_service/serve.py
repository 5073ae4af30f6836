"""Running the service as a process: one event loop, one line on standard output when it is ready."""

import asyncio
import contextlib
import json
import logging
import os
import signal
import socket
from collections.abc import Iterator

import uvicorn
from fastapi import FastAPI

from sweepmill.errors import SweepmillError
from sweepmill_service.app import create_app
from sweepmill_service.logs import configure_logs
from sweepmill_service.runtime import Runtime
from sweepmill_service.settings import Settings, masked_url

READY_POLL_SECONDS = 0.05
DISPATCH_POLL_SECONDS = 0.2
STOP_SIGNALS = (signal.SIGTERM, signal.SIGINT)
CONNECTIONS_WAIT_SECONDS = 5
log = logging.getLogger(__name__)


class CannotServe(SweepmillError):
    """The service cannot run; the message says why in one line."""


def serve(settings: Settings) -> int:
    """Serve until SIGTERM or SIGINT; returns 0 after a clean stop. Raises CannotServe."""
    configure_logs(settings)
    try:
        listener = listen(settings.host, settings.port)
    except OSError as error:
        raise CannotServe(f"cannot listen on {settings.host}:{settings.port}: {error.strerror}") from error
    runtime = asyncio.run(_serve(settings, listener))
    return _outcome(runtime)


def dispatch(settings: Settings) -> int:
    """Dispatch without HTTP until SIGTERM or SIGINT; returns 0 after a clean stop. Raises CannotServe."""
    configure_logs(settings)
    runtime = Runtime(settings.model_copy(update={"dispatch": True}))
    for kind in STOP_SIGNALS:
        signal.signal(kind, lambda *_: os._exit(1) if runtime.stopping.is_set() else runtime.stopping.set())
    runtime.start()
    announced = False
    while not runtime.stopping.wait(DISPATCH_POLL_SECONDS) and runtime.failure is None:
        if not announced and runtime.is_ready():
            print(f"Sweepmill dispatches from {masked_url(settings.database)}", flush=True)
            announced = True
    runtime.stop()
    return _outcome(runtime)


def _outcome(runtime: Runtime) -> int:
    if runtime.failure is not None:
        raise CannotServe(runtime.failure)
    return 0


def show_settings(settings: Settings) -> str:
    """The settings as JSON, secrets masked."""
    return json.dumps(settings.masked(), indent=2)


def listen(host: str, port: int) -> socket.socket:
    """A listening socket; port 0 picks a free one. Raises OSError."""
    family = socket.AF_INET6 if ":" in host else socket.AF_INET
    return socket.create_server((host, port), family=family, backlog=2048)


def address(listener: socket.socket) -> str:
    """URL of a listening socket."""
    host, port = listener.getsockname()[:2]
    return f"http://[{host}]:{port}" if ":" in host else f"http://{host}:{port}"


def server_configuration(app: FastAPI, settings: Settings) -> uvicorn.Config:
    """How uvicorn serves the application: one process, logs as configured, no advertisement of itself."""
    return uvicorn.Config(
        app,
        log_config=None,
        access_log=settings.log_level == "debug",
        server_header=False,
        timeout_graceful_shutdown=CONNECTIONS_WAIT_SECONDS,
    )


class Server(uvicorn.Server):
    """A server that a signal stops for good: uvicorn's own would raise the signal again afterwards."""

    def __init__(self, config: uvicorn.Config, runtime: Runtime) -> None:
        super().__init__(config)
        self.runtime = runtime

    @contextlib.contextmanager
    def capture_signals(self) -> Iterator[None]:
        """Both signals stop the server."""
        loop = asyncio.get_running_loop()
        for kind in STOP_SIGNALS:
            loop.add_signal_handler(kind, self.stop)
        yield

    def stop(self) -> None:
        """End event streams, then connections, then the pool; the second time end at once."""
        if self.should_exit:
            os._exit(1)  # whatever is lost thereby is sampled again: nothing half done is ever stored
        self.should_exit = True
        self.runtime.stopping.set()


async def _serve(settings: Settings, listener: socket.socket) -> Runtime:
    app = create_app(settings)
    runtime: Runtime = app.state.runtime
    server = Server(server_configuration(app, settings), runtime)
    log.warning("no tokens are configured: the service is open to everyone who can log in to this machine")
    announcing = asyncio.create_task(_announce(server, address(listener)))
    with listener:
        await server.serve(sockets=[listener])
    announcing.cancel()
    return runtime


async def _announce(server: Server, url: str) -> None:
    """Print the one line once everything is ready; stop the server if that cannot be."""
    runtime = server.runtime
    while not (server.started and await asyncio.to_thread(runtime.is_ready)):
        if runtime.failure is not None:
            server.stop()
            return
        await asyncio.sleep(READY_POLL_SECONDS)
    print(f"Sweepmill is ready at {url}", flush=True)
