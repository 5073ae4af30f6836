"""The service as users run it: `sweepmill serve` in a process of its own."""

import os
import selectors
import signal
import subprocess
import sys
import time
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path

import psutil

READY = "Sweepmill is ready at "
START_SECONDS = 180.0  # the first start on a machine compiles the kernels


def until(condition: Callable[[], object], what: str, seconds: float = 60.0) -> None:
    """Poll a condition. Raises AssertionError after ``seconds``."""
    deadline = time.monotonic() + seconds
    while not condition():
        assert time.monotonic() < deadline, f"in vain waited {seconds:.0f} s for: {what}"
        time.sleep(0.02)


def environment(**settings: str) -> dict[str, str]:
    """The environment with these SWEEPMILL_* variables and none of the person who runs the tests."""
    rest = {name: value for name, value in os.environ.items() if not name.startswith("SWEEPMILL_")}
    return rest | {f"SWEEPMILL_{name.upper()}": value for name, value in settings.items()}


class Service:
    """A running service; ``options`` are those of the command line, ``settings`` become SWEEPMILL_* variables."""

    def __init__(self, database: str, *options: str, **settings: str) -> None:
        command = [sys.executable, "-m", "sweepmill", "serve", "--port", "0", "--database", database, *options]
        self.process = subprocess.Popen(command, stdout=subprocess.PIPE, text=True, env=environment(**settings))
        self.url = self._ready_url()

    def _ready_url(self) -> str:
        assert self.process.stdout is not None
        deadline = time.monotonic() + START_SECONDS
        with selectors.DefaultSelector() as selector:
            selector.register(self.process.stdout, selectors.EVENT_READ)
            while selector.select(max(0.0, deadline - time.monotonic())):
                line = self.process.stdout.readline()
                if line.startswith(READY):
                    return line.removeprefix(READY).strip()
                if not line:
                    break
        self.process.kill()
        raise AssertionError(f"the service ended with {self._wait()} before it was ready")

    def family(self) -> list[psutil.Process]:
        """All processes started by the service, at any depth."""
        children: list[psutil.Process] = psutil.Process(self.process.pid).children(recursive=True)
        return children

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
def service(database: str, *options: str, **settings: str) -> Iterator[Service]:
    """A service that is stopped, if it still runs, at the end of the block."""
    running = Service(database, *options, **settings)
    try:
        yield running
    finally:
        if running.process.poll() is None:
            running.stop()
