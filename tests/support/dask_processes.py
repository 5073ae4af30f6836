"""A Dask scheduler and workers as processes of their own."""

import os
import signal
import socket
import subprocess
import sys
from collections.abc import Mapping
from pathlib import Path

QUIET = {"DASK_LOGGING__DISTRIBUTED": "critical", "DASK_DISTRIBUTED__SCHEDULER__ALLOWED_FAILURES": "0"}


def free_port() -> int:
    """A port that is free now."""
    with socket.socket() as listener:
        listener.bind(("127.0.0.1", 0))
        return int(listener.getsockname()[1])


class DaskProcesses:
    """Started one by one, all killed at the end."""

    def __init__(self, home: Path) -> None:
        self.port = free_port()
        self._home = home
        self._running: list[subprocess.Popen[bytes]] = []

    @property
    def address(self) -> str:
        """Of the scheduler."""
        return f"tcp://127.0.0.1:{self.port}"

    def scheduler(self) -> subprocess.Popen[bytes]:
        """Start the scheduler, on the same port each time."""
        where = ["--host", "127.0.0.1", "--port", str(self.port)]
        return self._start("dask_scheduler", [*where, "--no-dashboard", "--dashboard-address", "127.0.0.1:0"])

    def worker(self, environment: Mapping[str, str] | None = None) -> subprocess.Popen[bytes]:
        """Start a worker of one thread."""
        size = ["--nthreads", "1", "--no-nanny", "--no-dashboard", "--local-directory", str(self._home)]
        return self._start("dask_worker", [self.address, *size], environment)

    def kill_all(self) -> None:
        """Leave nothing running."""
        for process in self._running:
            process.send_signal(signal.SIGKILL)
            process.wait(30)
        self._running.clear()

    def _start(
        self, module: str, arguments: list[str], environment: Mapping[str, str] | None = None
    ) -> subprocess.Popen[bytes]:
        process = subprocess.Popen(
            [sys.executable, "-m", f"distributed.cli.{module}", *arguments],
            env=os.environ | QUIET | dict(environment or {}),
            stdout=subprocess.DEVNULL,
            stderr=subprocess.DEVNULL,
        )
        self._running.append(process)
        return process
