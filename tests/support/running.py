"""Runs a service as users do: a process of its own, with a pool and a database of its own."""

import os
import selectors
import signal
import subprocess
import sys
import time
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

READY = "Sweepmill is ready at "
START_SECONDS = 120.0  # the first start on a machine compiles the kernels
STOP_SECONDS = 30.0


def environment() -> dict[str, str]:
    """The environment without settings of the person who runs the tests."""
    return {name: value for name, value in os.environ.items() if not name.startswith("SWEEPMILL_")}


@contextmanager
def running_service(directory: Path, *options: str) -> Iterator[str]:
    """Address of a service that ends with the block."""
    database = f"sqlite:///{directory / 'service.sqlite'}"
    variables = environment() | {"SWEEPMILL_BATCH_SECONDS": "0.5"}  # a stop waits for the batches in flight
    command = [sys.executable, "-m", "sweepmill", "serve", "--port", "0", "--database", database, *options]
    with (directory / "service.log").open("w") as log:
        process = subprocess.Popen(command, stdout=subprocess.PIPE, stderr=log, text=True, env=variables)
    try:
        yield _address(process, directory / "service.log")
    finally:
        process.send_signal(signal.SIGTERM)
        try:
            process.wait(STOP_SECONDS)
        finally:
            process.kill()
            process.wait()
            if process.stdout is not None:
                process.stdout.close()


def _address(process: subprocess.Popen[str], log: Path) -> str:
    assert process.stdout is not None
    with selectors.DefaultSelector() as selector:
        selector.register(process.stdout, selectors.EVENT_READ)
        deadline = time.monotonic() + START_SECONDS
        while time.monotonic() < deadline and selector.select(deadline - time.monotonic()):
            line = process.stdout.readline()
            if line.startswith(READY):
                return line.removeprefix(READY).strip()
            if not line:
                break
    raise AssertionError(f"the service did not become ready:\n{log.read_text()}")
