"""Tasks in the pool: handed over, and taken back when they end."""

import traceback
from collections import Counter
from collections.abc import Iterable
from concurrent.futures import CancelledError
from dataclasses import dataclass
from queue import Empty, SimpleQueue
from typing import Any

from distributed import Future, KilledWorker
from distributed.scheduler import NoValidWorkerError, NoWorkerError

from sweepmill_service.plan.task import Task
from sweepmill_service.pool import Pool, difference
from sweepmill_service.store.results import BatchFault, BatchResult, Kept

SPARED = 3  # losses of a worker that a task not seen to begin is not blamed for
TRACEBACK_LINES = 40


@dataclass(frozen=True, eq=False)
class Landed:
    """A task that came back with a result."""

    task: Task
    result: BatchResult


@dataclass(frozen=True)
class Failed:
    """A task that came back without one; ``fault`` is None where it is not to blame."""

    task: Task
    fault: BatchFault | None


class Flights:
    """The futures of one dispatcher run."""

    def __init__(self, pool: Pool, run: str) -> None:
        self._pool = pool
        self._run = run
        self._ended: SimpleQueue[str | None] = SimpleQueue()
        self._futures: dict[str, tuple[Task, Future]] = {}
        self._spared: Counter[tuple[str, int]] = Counter()

    def __len__(self) -> int:
        return len(self._futures)

    def submit(self, task: Task, arguments: tuple[Any, ...]) -> None:
        """Hand a task over to the pool."""
        key = self.name(task)
        future = self._pool.submit(key, *arguments)
        self._futures[key] = (task, future)
        future.add_done_callback(lambda _: self._ended.put(key))

    def name(self, task: Task) -> str:
        """The task's name in the pool, which other services may share."""
        return f"{task.key}-{self._run}"

    def wake(self) -> None:
        """End a wait in :meth:`drain`; may be called from any thread."""
        self._ended.put(None)

    def drain(self, seconds: float) -> list[Landed | Failed]:
        """Tasks that ended, after waiting for the first at most so long."""
        keys = dict.fromkeys(key for key in self._wait(seconds) if key in self._futures)
        ended = {key: self._futures[key] for key in keys if self._futures[key][1].status != "pending"}
        finished = {key: future for key, (_, future) in ended.items() if future.status == "finished"}
        results = self._gather(finished)
        landings = [self._landing(key, task, future, results) for key, (task, future) in ended.items()]
        for key in ended:
            del self._futures[key]
        return landings

    def tasks(self) -> set[Task]:
        """What is in the pool."""
        return {task for task, _ in self._futures.values()}

    def abandon(self) -> list[Task]:
        """Forget everything in the pool; what it computes on is not taken back."""
        tasks = [task for task, _ in self._futures.values()]
        self._futures.clear()
        return tasks

    def _wait(self, seconds: float) -> Iterable[str | None]:
        try:
            yield self._ended.get(timeout=seconds)
            while True:
                yield self._ended.get_nowait()
        except Empty:
            return

    def _gather(self, finished: dict[str, Future]) -> dict[str, Any]:
        """Results by name; one that was lost with its worker is missing."""
        if not finished:
            return {}
        try:
            return dict(zip(finished, self._pool.gather(list(finished.values())), strict=True))
        except (OSError, TimeoutError, CancelledError, KilledWorker):
            return {}

    def _landing(self, key: str, task: Task, future: Future, results: dict[str, Any]) -> Landed | Failed:
        worker = self._pool.started(key)
        if key in results:
            return _judge_result(task, results[key], worker or "unknown")
        if future.status != "error":
            return Failed(task, None)
        error, trace = _error_of(future)
        if isinstance(error, NoWorkerError | NoValidWorkerError):
            return Failed(task, None)
        if isinstance(error, KilledWorker):
            return Failed(task, self._worker_lost(task, worker, error))
        return Failed(task, fault_of(task, type(error).__name__, str(error), worker or "unknown", trace))

    def _worker_lost(self, task: Task, worker: str | None, error: KilledWorker) -> BatchFault | None:
        """Every task assigned to a dead worker fails; only one that had begun can be the cause."""
        place = (task.ensemble, task.first)
        self._spared[place] += 1
        if worker is None and self._spared[place] <= SPARED:
            return None
        where = worker or str(getattr(error.last_worker, "address", "unknown"))
        return fault_of(task, "worker lost", "the worker process died while computing", where)


def _error_of(future: Future) -> tuple[BaseException, str]:
    try:
        error = future.exception(timeout=10)
        lines = traceback.format_tb(future.traceback(timeout=10))
    except (OSError, TimeoutError, CancelledError) as lost:
        return lost, ""
    return error, "".join(lines[-TRACEBACK_LINES:])


def _judge_result(task: Task, result: dict[str, Any], worker: str) -> Landed | Failed:
    """A result made with other versions is refused by name: it might not be the same numbers."""
    reported = {**result["versions"], "revisions": result["results_revision"]}
    if why := difference(reported):
        return Failed(task, fault_of(task, "versions differ", f"the worker {why}", worker))
    stored = BatchResult(
        ensemble=task.ensemble,
        first=task.first,
        count=task.count,
        accumulators=result["accumulators"],
        digests=result["digests"],
        seconds=result["seconds"],
        worker=worker,
        versions=result["versions"],
        sweep=task.sweep,
        owner=task.owner,
        values={key: Kept(*chunk) for key, chunk in result.get("values", {}).items()},
    )
    return Landed(task, stored)


def fault_of(task: Task, kind: str, message: str, worker: str, trace: str = "") -> BatchFault:
    return BatchFault(
        ensemble=task.ensemble,
        first=task.first,
        count=task.count,
        kind=kind[:32],
        message=message,
        traceback=trace,
        worker=worker,
    )


def unstorable(landed: Landed, error: Exception) -> BatchFault:
    """A result that the store cannot take: a fault of its batch, or it would block all others."""
    return fault_of(landed.task, "cannot be stored", f"{type(error).__name__}: {error}", landed.result.worker)
