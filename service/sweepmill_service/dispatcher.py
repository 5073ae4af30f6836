"""The dispatcher: one thread that keeps the pool busy and the store up to date.

drain -> commit -> note faults -> look for new requests -> refill the window -> watch the pool. Whatever fails on
the way pauses it with a reason and is tried again; results in memory are kept meanwhile. A restart has nothing to
recover.
"""

import logging
import threading
import time
from dataclasses import dataclass
from typing import Protocol
from uuid import uuid4

from sqlalchemy.exc import DataError, IntegrityError, SQLAlchemyError

from sweepmill.errors import SweepmillError
from sweepmill.messages import PoolStatus, WorkerStatus
from sweepmill_service.flights import Failed, Flights, Landed, unstorable
from sweepmill_service.following import Follower
from sweepmill_service.meter import Meter
from sweepmill_service.plan.plan import Plan
from sweepmill_service.plan.sweeps import Waiting
from sweepmill_service.plan.task import SizeRules, Task
from sweepmill_service.pool import Pool, PoolUnavailable, WorkerInfo
from sweepmill_service.rounds.thread import Rounds
from sweepmill_service.store import Store
from sweepmill_service.store.leadership import AlreadyServed, leadership
from sweepmill_service.store.results import Start

__all__ = ["AlreadyServed", "DispatchSettings", "Dispatcher"]

log = logging.getLogger(__name__)

DRAIN_SECONDS = 0.2
WORKERS_EVERY = 0.5
LEADERSHIP_EVERY = 2.0
PATIENCE_WITHOUT_WORKERS = 5.0
SLOWEST_RETRY = 30.0
LONGEST_PAUSE = 5.0
STANDBY = "standby: another dispatcher is active"
UNSTORABLE = (SweepmillError, ValueError, ArithmeticError, LookupError, IntegrityError, DataError)
POOL_TROUBLE = (PoolUnavailable, OSError, TimeoutError)


class DispatchSettings(Protocol):
    """The settings a dispatcher reads."""

    @property
    def batch_seconds(self) -> float: ...
    @property
    def first_batch_seconds(self) -> float: ...
    @property
    def window_per_thread(self) -> int: ...
    @property
    def attempts(self) -> int: ...


@dataclass
class _Retry:
    """When to try again, each time twice as late."""

    wait: float = 0.5
    at: float = 0.0

    def due(self) -> bool:
        return time.monotonic() >= self.at

    def failed(self) -> None:
        self.at = time.monotonic() + self.wait
        self.wait = min(2 * self.wait, SLOWEST_RETRY)

    def worked(self) -> None:
        self.wait, self.at = 0.5, 0.0


class Dispatcher:
    """Runs until stopped. Several may wait on one Postgres database; one of them is active."""

    def __init__(self, store: Store, pool: Pool, settings: DispatchSettings) -> None:
        self._store = store
        self._pool = pool
        self._settings = settings
        self._leadership = leadership(store.engine)
        self._stopping = threading.Event()
        self._thread = threading.Thread(target=self._run, name="sweepmill-dispatcher", daemon=True)
        self._finish_seconds = 0.0
        self._meter = Meter()
        self._workers: list[WorkerInfo] = []
        self._seen_workers_at = self._asked_leadership_at = self._asked_workers_at = 0.0
        self._open = False
        self._pool_retry, self._store_retry = _Retry(), _Retry()
        self._reasons: dict[str, str] = {"pool": "the pool is being started"}  # why nothing is handed out
        self._begin_run()

    # --- called from other threads

    def start(self) -> None:
        """Begin in a thread. Raises AlreadyServed if another service dispatches from the same SQLite file."""
        self._leadership.acquire()
        self._thread.start()

    def stop(self, seconds: float) -> None:
        """Hand out nothing more, wait at most so long for what is in the pool, store it, and end."""
        self._finish_seconds = seconds
        self._stopping.set()
        self._flights.wake()
        if self._thread.ident is not None:
            self._thread.join()
        else:
            self._leadership.release()

    def wake(self) -> None:
        """Look for new requests now rather than in a moment."""
        self._flights.wake()

    def status(self) -> PoolStatus:
        """The pool, what it computes, and why nothing is handed out if so."""
        cores = self._threads()
        reasons = [STANDBY] if "leadership" in self._reasons else list(self._reasons.values())
        return PoolStatus(
            ready=not reasons,
            reason="; ".join(reasons) or None,
            workers=[self._worker_status(worker) for worker in self._workers],
            cores=cores,
            in_flight=len(self._plan.under_way),
            window=self._window(),
            batches_committed=self._meter.batches,
            trajectories_per_second=self._meter.trajectories_per_second(),
            busy_fraction=self._meter.busy_fraction(cores),
        )

    def seconds_left(self, sweep: str) -> float | None:
        """Predicted seconds until a sweep settles if the pool were its own."""
        return self._plan.seconds_left(sweep, self._threads())

    def waiting(self) -> list[Waiting]:
        """Core-seconds that every request still has to be given."""
        return self._plan.waiting()

    def pace(self) -> float | None:
        """Core-seconds of sampling per core and second while there was enough work; None if unknown."""
        return self._meter.pace(self._threads())

    # --- the thread

    def _begin_run(self) -> None:
        """Forget everything: the store knows it all."""
        self._run_name = uuid4().hex
        sizes = SizeRules(self._settings.batch_seconds, self._settings.first_batch_seconds)
        self._plan = Plan(sizes)
        self._follower = Follower(self._store, self._plan)
        self._flights = Flights(self._pool, self._run_name[:8])
        self._rounds = Rounds(self._store, self._flights.wake)
        self._landed: list[Landed] = []
        self._failed: list[Failed] = []

    def _run(self) -> None:
        try:
            while not self._stopping.is_set():
                self._guarded_cycle()
            self._finish()
        finally:
            self._rounds.close()
            self._pool.close()
            self._leadership.release()

    def _guarded_cycle(self) -> None:
        try:
            self._cycle()
        except SQLAlchemyError as error:
            self._pause(f"the database does not work: {first_line(error)}")
        except POOL_TROUBLE as error:
            self._close_pool(f"the pool does not work: {first_line(error)}")
        except Exception as error:  # the thread must not die: report, and go on from what is stored
            log.exception("the dispatcher failed and starts afresh")
            self._begin_run()
            self._pause(f"internal error: {first_line(error)}")

    def _pause(self, reason: str) -> None:
        self._set_reason("store", reason)
        self._store_retry.failed()
        self._stopping.wait(min(self._store_retry.wait, LONGEST_PAUSE))

    def _set_reason(self, part: str, reason: str) -> None:
        if self._reasons.get(part) != reason:
            log.warning("nothing is handed out: %s", reason)
        self._reasons = {**self._reasons, part: reason}

    def _works(self, part: str) -> None:
        if part in self._reasons:
            log.info("the %s is ready", part)
            self._reasons = {name: why for name, why in self._reasons.items() if name != part}

    def _cycle(self) -> None:
        if not self._lead():
            self._stopping.wait(DRAIN_SECONDS)
            return
        if not self._ready_pool():
            self._stopping.wait(DRAIN_SECONDS)
        self._collect(DRAIN_SECONDS if self._open else 0.0)
        self._follower.look()
        self._judge_rounds()
        self._follower.stop_stuck()
        self._store_retry.worked()
        self._works("store")
        if self._open:
            self._watch()
            self._refill()
            self._meter.watch(self._threads(), len(self._plan.under_way) >= self._threads() > 0)

    def _lead(self) -> bool:
        """Whether this dispatcher is the active one."""
        standing_by = "leadership" in self._reasons
        if time.monotonic() < self._asked_leadership_at + LEADERSHIP_EVERY and not standing_by:
            return True
        leads = self._leadership.acquire()
        self._asked_leadership_at = time.monotonic()
        if leads:
            self._works("leadership")
        elif not standing_by:
            self._set_reason("leadership", STANDBY)
            self._close_pool("the pool is not open")
            self._pool_retry.worked()
            self._begin_run()
        return leads

    # --- results

    def _collect(self, seconds: float) -> None:
        """Take what ended and store it; what could not be stored stays for the next time."""
        for ended in self._flights.drain(seconds):
            if isinstance(ended, Landed):
                self._landed.append(ended)
            else:
                self._failed.append(ended)
        self._commit()
        self._note_faults()

    def _commit(self) -> None:
        if self._landed:
            self._store_all(tuple(self._landed))

    def _store_all(self, landed: tuple[Landed, ...]) -> None:
        """All in one transaction; if one result cannot be stored, each in its own, and that one is a fault."""
        try:
            outcome = self._store.commit([one.result for one in landed])
        except UNSTORABLE as error:
            if len(landed) > 1:
                for one in landed:
                    self._store_all((one,))
                return
            self._landed.remove(landed[0])
            self._failed.append(Failed(landed[0].task, unstorable(landed[0], error)))
            return
        for one in landed:
            self._landed.remove(one)
            self._plan.landed(one.task, one.result.seconds)
            self._meter.note(one.result.seconds, one.result.count)
        self._follower.apply(outcome)

    def _note_faults(self) -> None:
        while self._failed:
            one = self._failed[0]
            if one.fault is None:
                self._plan.lost(one.task)
            else:
                log.warning("%s failed: %s: %s", _short(one.task), one.fault.kind, one.fault.message)
                failures = self._store.record_fault(one.fault, self._settings.attempts)
                self._plan.lost(one.task, failures)
                if failures >= self._settings.attempts:
                    self._plan.stick(one.task.ensemble)
            self._failed.pop(0)

    # --- goals

    def _judge_rounds(self) -> None:
        """Have rounds judged whose places are all sampled, and go on as decided."""
        self._rounds.begin(self._plan.ripe())
        for known, decision in self._rounds.ended():
            if isinstance(decision, str):
                self._store.stick_sweep(known.sweep, decision)
            elif outcome := self._store.close_round(known, decision):
                self._follower.apply(outcome)
            self._follower.renew(known.sweep)

    # --- the window

    def _refill(self) -> None:
        tasks = self._choose()
        if not tasks:
            return
        try:
            self._store.log_starts([_start(task) for task in tasks], self._run_name)
            for task in tasks:
                self._flights.submit(task, self._follower.arguments(task))
        except (SQLAlchemyError, *POOL_TROUBLE):
            submitted = self._flights.tasks()
            for task in tasks:
                if task not in submitted:
                    self._plan.lost(task)
            raise

    def _choose(self) -> list[Task]:
        tasks: list[Task] = []
        threads = self._threads()
        while len(self._plan.under_way) < self._window():
            task = self._plan.choose(threads)
            if task is None:
                break
            tasks.append(task)
        return tasks

    def _window(self) -> int:
        return self._threads() * self._settings.window_per_thread

    def _threads(self) -> int:
        return sum(worker.threads for worker in self._workers)

    # --- the pool

    def _ready_pool(self) -> bool:
        """Open the pool if it is not, and give it up if its scheduler is gone."""
        if self._open and not self._pool.alive():
            self._close_pool("the connection to the scheduler was lost")
        if not self._open and self._pool_retry.due() and not self._stopping.is_set():
            self._pool_retry.failed()
            self._pool.open()
            self._open = True
            self._seen_workers_at = time.monotonic()
            self._asked_workers_at = 0.0
        return self._open

    def _watch(self) -> None:
        """Count workers, and give the pool up once it has none."""
        if time.monotonic() < self._asked_workers_at + WORKERS_EVERY:
            return
        self._workers = self._pool.workers()
        self._asked_workers_at = time.monotonic()
        if self._workers:
            self._seen_workers_at = time.monotonic()
            self._pool_retry.worked()
            self._works("pool")
        elif time.monotonic() > self._seen_workers_at + PATIENCE_WITHOUT_WORKERS:
            mismatches = "; ".join(self._pool.mismatches())
            self._close_pool(mismatches or "the pool has no workers")

    def _close_pool(self, reason: str) -> None:
        """Give up what is in the pool: it is handed out again."""
        self._set_reason("pool", reason)
        self._open = False
        self._workers = []
        for task in self._flights.abandon():
            self._plan.lost(task)
        self._pool.close()
        self._pool_retry.failed()

    def _finish(self) -> None:
        """Store what still comes in before the deadline."""
        deadline = time.monotonic() + self._finish_seconds
        while True:
            try:
                self._collect(DRAIN_SECONDS)
            except (SQLAlchemyError, *POOL_TROUBLE) as error:
                log.warning("while stopping: %s", first_line(error))
                self._stopping.wait(DRAIN_SECONDS)
            if not self._plan.under_way or not self._pool.alive() or time.monotonic() > deadline:
                return

    def _worker_status(self, worker: WorkerInfo) -> WorkerStatus:
        names = {self._flights.name(task): task for task in tuple(self._plan.under_way.values())}
        computing = [_short(names[name]) for name in worker.assigned if name in names]
        return WorkerStatus(name=worker.name, address=worker.address, threads=worker.threads, computing=computing)


def _start(task: Task) -> Start:
    return Start(
        ensemble=task.ensemble,
        first=task.first,
        count=task.count,
        observations=task.observations,
        attempt=task.attempt,
        sweep=task.sweep,
        owner=task.owner,
    )


def _short(task: Task) -> str:
    return f"{task.ensemble[:12]}:{task.first}+{task.count}"


def first_line(error: BaseException) -> str:
    """What went wrong, without the statement SQLAlchemy appends."""
    cause = getattr(error, "orig", None) or error
    return (str(cause).splitlines() or [type(cause).__name__])[0]
