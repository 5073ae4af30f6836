"""The service as users run it: `sweepmill serve` in a process of its own."""

import os
import signal
import subprocess
import sys
import time
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path

import psutil

READY = "Sweepmill is ready at "


def until(condition: Callable[[], object], what: str, seconds: float = 60.0) -> None:
    """Poll a condition. Raises AssertionError after ``seconds``."""
    deadline = time.monotonic() + seconds
    while not condition():
        assert time.monotonic() < deadline, f"in vain waited {seconds:.0f} s for: {what}"
        time.sleep(0.02)


class Service:
    """A running service; ``settings`` become SWEEPMILL_* variables."""

    def __init__(self, database: str, workers: int, **settings: str) -> None:
        variables = {f"SWEEPMILL_{name.upper()}": value for name, value in settings.items()}
        options = ["--port", "0", "--database", database, "--workers", str(workers)]
        self.process = subprocess.Popen(
            [sys.executable, "-m", "sweepmill", "serve", *options],
            stdout=subprocess.PIPE,
            text=True,
            env=os.environ | variables,
        )
        self.url = self._ready_url()

    def _ready_url(self) -> str:
        assert self.process.stdout is not None
        for line in self.process.stdout:
            if line.startswith(READY):
                return line.removeprefix(READY).strip()
        raise AssertionError(f"the service ended with {self.process.wait()} before it was ready")

    def family(self) -> list[psutil.Process]:
        """All processes started by the service, at any depth."""
        return psutil.Process(self.process.pid).children(recursive=True)

    def workers(self) -> list[psutil.Process]:
        """The worker processes: those of the family that have loaded the kernels' compiler."""
        return [child for child in self.family() if "llvmlite" in _maps(child)]

    def kill(self) -> list[psutil.Process]:
        """SIGKILL, nothing else; returns the processes that were its family."""
        family = self.family()
        self.process.kill()
        self._wait()
        return family

    def stop(self) -> int:
        """SIGTERM and wait; returns the exit code."""
        self.process.send_signal(signal.SIGTERM)
        return self._wait()

    def _wait(self) -> int:
        code = self.process.wait(timeout=60)
        if self.process.stdout is not None:
            self.process.stdout.close()
        return code


def _maps(process: psutil.Process) -> str:
    try:
        return Path(f"/proc/{process.pid}/maps").read_text()
    except OSError:
        return ""


@contextmanager
def service(database: str, workers: int = 2, **settings: str) -> Iterator[Service]:
    """A service that is stopped, if it still runs, at the end of the block."""
    running = Service(database, workers, **settings)
    try:
        yield running
    finally:
        if running.process.poll() is None:
            running.stop()
