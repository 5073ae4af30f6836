"""Real pools for tests, shared between dispatchers, and settings to run them with."""

import os
import time
from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

from distributed import Future

from sweepmill_service.pool import LocalPool, WorkerInfo


@dataclass
class QuickSettings:
    """Short batches."""

    batch_seconds: float = 0.3
    first_batch_seconds: float = 0.1
    window_per_thread: int = 2
    attempts: int = 3


class Borrowed:
    """A pool that stays open when a dispatcher gives it up."""

    def __init__(self, pool: LocalPool) -> None:
        self._pool = pool
        self.submitted = 0

    def open(self) -> None:
        """It is open."""

    def close(self) -> None:
        """It stays open."""

    def alive(self) -> bool:
        return self._pool.alive()

    def workers(self) -> list[WorkerInfo]:
        return self._pool.workers()

    def mismatches(self) -> list[str]:
        return self._pool.mismatches()

    def submit(self, key: str, *arguments: Any) -> Future:
        self.submitted += 1
        return self._pool.submit(key, *arguments)

    def gather(self, futures: list[Future]) -> list[Any]:
        return self._pool.gather(futures)

    def started(self, key: str) -> str | None:
        return self._pool.started(key)


def until(condition: Callable[[], bool], what: str, seconds: float = 60.0) -> None:
    """Poll until a condition holds; fail naming ``what`` at the deadline."""
    deadline = time.monotonic() + seconds
    while not condition():
        if time.monotonic() > deadline:
            raise AssertionError(f"not within {seconds:g} s: {what}")
        time.sleep(0.02)


def process_exists(pid: int) -> bool:
    """Whether a process runs (a zombie does not)."""
    try:
        with open(f"/proc/{pid}/stat") as file:
            return file.read().rpartition(")")[2].split()[0] != "Z"
    except OSError:
        return False


def worker_pids(pool: LocalPool) -> dict[str, int]:
    """Process ids of the workers by address."""
    pids: dict[str, int] = pool.client.run(os.getpid)
    return pids
