"""Runs inside worker processes: ends them with the service, loads the kernels, says when a batch begins.

Workers of a local pool must not outlive a killed service. The parent-death signal of Linux belongs to the thread
that started the process, which is not the service's main thread, so the parent is watched instead.
"""

import os
import platform
import threading
from collections.abc import Sequence
from typing import Any

from distributed.diagnostics.plugin import WorkerPlugin

from sweepmill_worker.warm import warm

CHECK_SECONDS = 0.5
STARTED_TOPIC = "sweepmill-started"


class Lifeline(WorkerPlugin):  # type: ignore[misc]  # Dask is not typed
    """Ends a worker process whose parent is not ``parent`` any more."""

    name = "sweepmill-lifeline"

    def __init__(self, parent: int) -> None:
        self.parent = parent

    def setup(self, worker: Any) -> None:
        """Start to watch."""
        threading.Thread(target=_watch, args=(self.parent,), name=self.name, daemon=True).start()


class StartReporter(WorkerPlugin):  # type: ignore[misc]
    """Reports each task that begins to run: only these can have brought a worker down."""

    name = "sweepmill-start-reporter"

    def setup(self, worker: Any) -> None:
        """Remember who reports."""
        self.worker = worker
        self.where = f"{platform.node()} {worker.address}"

    def transition(self, key: Any, start: str, finish: str, **_more: Any) -> None:
        """Called by the worker at each change of a task's state."""
        if finish == "executing":
            self.worker.log_event(STARTED_TOPIC, {"task": str(key), "worker": self.where})


class KernelLoader(WorkerPlugin):  # type: ignore[misc]
    """Loads the compiled kernels before the first batch, so that its measured cost is that of sampling."""

    name = "sweepmill-kernel-loader"

    def __init__(self, sites: int, kernels: Sequence[str]) -> None:
        self.sites = sites
        self.kernels = tuple(kernels)

    def setup(self, worker: Any) -> None:
        """Compiles only what the cache does not hold."""
        warm(self.sites, self.kernels)


def _watch(parent: int) -> None:
    while os.getppid() == parent:
        threading.Event().wait(CHECK_SECONDS)
    os._exit(0)
