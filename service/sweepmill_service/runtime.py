"""What lives as long as the service: the store, the dispatcher and its pool, started behind the first requests."""

import logging
import threading

from alembic.util import CommandError
from sqlalchemy import Engine
from sqlalchemy.exc import SQLAlchemyError

from sweepmill.messages import PoolStatus, SweepStatus
from sweepmill_service.database import DatabaseUnusable, open_database
from sweepmill_service.dispatcher import STANDBY, AlreadyServed, Dispatcher, first_line
from sweepmill_service.migrations import migrate
from sweepmill_service.plan.sweeps import Waiting
from sweepmill_service.pool import ExternalPool, LocalPool, Pool, Tls
from sweepmill_service.problems import Unavailable
from sweepmill_service.settings import Settings, masked_url
from sweepmill_service.store import Store

log = logging.getLogger(__name__)
OPENING = "the database is being opened"
GIVE_UP_SECONDS = 10.0  # beyond the time a stop grants to the batches in flight


class Runtime:
    """Opens in a thread of its own, so that `healthz` answers from the first moment."""

    def __init__(self, settings: Settings) -> None:
        self.settings = settings
        self.stopping = threading.Event()
        self.failure: str | None = None
        self._engine: Engine | None = None
        self._store: Store | None = None
        self._dispatcher: Dispatcher | None = None
        self._thread = threading.Thread(target=self._open, name="sweepmill-start", daemon=True)

    @property
    def store(self) -> Store:
        """The store. Raises Unavailable while the database is not open."""
        if self._store is None:
            raise Unavailable(self.failure or OPENING)
        return self._store

    def start(self) -> None:
        """Begin to open database and pool; returns at once."""
        self._thread.start()

    def stop(self) -> None:
        """End event streams, finish the batches in flight or give up at the deadline, close the database."""
        self.stopping.set()
        closing = threading.Thread(target=self._close, name="sweepmill-stop", daemon=True)
        closing.start()
        closing.join(self.settings.stop_seconds + GIVE_UP_SECONDS)
        if closing.is_alive():
            log.warning("batches in flight are given up; they are sampled again after the next start")

    def unready(self) -> list[str]:
        """Why sweeps are not taken or not sampled; empty when the service is ready."""
        if self._store is None or self.failure is not None:
            return [self.failure or OPENING]
        try:
            self._store.ping()
        except SQLAlchemyError as error:
            return [f"the database does not answer: {first_line(error)}"]
        pool = self.pool_status()
        # a standby answers all requests, and another service samples
        idle = self.settings.dispatch and not pool.ready and pool.reason != STANDBY
        return [pool.reason or "the pool is not ready"] if idle else []

    def is_ready(self) -> bool:
        """Whether sweeps are taken and sampled."""
        return not self.unready()

    def pace(self) -> float | None:
        """Core-seconds of sampling per core and second while there was enough work; None if unknown."""
        return None if self._dispatcher is None else self._dispatcher.pace()

    def waiting(self) -> list[Waiting]:
        """Core-seconds that every request still has to be given by the pool of this process."""
        return [] if self._dispatcher is None else self._dispatcher.waiting()

    def pool_status(self) -> PoolStatus:
        """The pool as the dispatcher of this process sees it."""
        if self._dispatcher is not None:
            return self._dispatcher.status()
        return no_pool("the pool is being started" if self.settings.dispatch else "this process does not dispatch")

    def forecast(self, status: SweepStatus) -> SweepStatus:
        """The status with the time the sweep would still take if the pool were its own."""
        if self._dispatcher is None:
            return status
        if status.goal is not None:
            return status.model_copy(
                update={"seconds_left": rounds_left(status, self.pool_status().cores or self.settings.workers)}
            )
        try:
            seconds = self._dispatcher.seconds_left(status.key)
        except KeyError:  # it settled at this moment
            seconds = None
        return status.model_copy(update={"seconds_left": seconds})

    def _open(self) -> None:
        try:
            self._engine = open_database(self.settings.database)
            migrate(self._engine)
            self._store = Store(self._engine)
            if self.settings.dispatch:
                self._dispatch(self._store)
        except (AlreadyServed, DatabaseUnusable, SQLAlchemyError, OSError, CommandError) as error:
            self.failure = failure_line(self.settings, error)

    def _dispatch(self, store: Store) -> None:
        dispatcher = Dispatcher(store, pool_for(self.settings), self.settings)
        dispatcher.start()
        self._dispatcher = dispatcher

    def _close(self) -> None:
        self._thread.join()
        if self._dispatcher is not None:
            self._dispatcher.stop(self.settings.stop_seconds)
        if self._engine is not None:
            self._engine.dispose()


def rounds_left(status: SweepStatus, cores: int) -> float | None:
    """Seconds to the goal as the last round predicts them: the work grows as error^-2; None where it cannot tell."""
    if status.state not in ("waiting", "sampling") or not status.answers:
        return None
    errors = [(one.error, one.below) for one in status.answers if not one.met]
    shrink = [max(0.0, (error / below) ** 2 - 1) for error, below in errors if error is not None]
    if len(shrink) < len(errors):
        return None
    return status.core_seconds * max(shrink, default=0.0) / max(1, cores)


def pool_for(settings: Settings) -> Pool:
    """Local worker processes, or the scheduler that the settings name."""
    if settings.scheduler is None:
        return LocalPool(settings.workers, settings.limits.sites, settings.kernels)
    ca, certificate, key = settings.tls_ca, settings.tls_certificate, settings.tls_key
    tls = None if ca is None or certificate is None or key is None else Tls(ca, certificate, key)
    return ExternalPool(settings.scheduler, tls)


def no_pool(reason: str) -> PoolStatus:
    """Status of a process that has no pool, or none yet."""
    return PoolStatus(
        ready=False,
        reason=reason,
        workers=[],
        cores=0,
        in_flight=0,
        window=0,
        batches_committed=0,
        trajectories_per_second=0.0,
        busy_fraction=0.0,
    )


def failure_line(settings: Settings, error: Exception) -> str:
    """One line that says why the service cannot run; the database without its password."""
    if isinstance(error, AlreadyServed):
        return str(error)
    reason = first_line(error)
    if isinstance(error, CommandError):
        reason = f"its schema is of a later release than this code ({reason})"
    return f"the database {masked_url(settings.database)} cannot be used: {reason}"
