"""What lives as long as the service: the store, the dispatcher and its pool, started behind the first requests."""

import logging
import threading

from alembic.util import CommandError
from sqlalchemy import Engine
from sqlalchemy.exc import SQLAlchemyError

from sweepmill.messages import PoolStatus
from sweepmill_service.database import DatabaseUnusable, open_database
from sweepmill_service.migrations import migrate
from sweepmill_service.problems import Unavailable
from sweepmill_service.settings import Settings, masked_url
from sweepmill_service.store import Store

log = logging.getLogger(__name__)
NO_POOL = PoolStatus(
    ready=False,
    reason="this process does not dispatch",
    workers=[],
    cores=0,
    in_flight=0,
    window=0,
    batches_committed=0,
    trajectories_per_second=0.0,
    busy_fraction=0.0,
)


class Runtime:
    """Opens in a thread of its own, so that `healthz` answers from the first moment."""

    def __init__(self, settings: Settings) -> None:
        self.settings = settings
        self.stopping = threading.Event()
        self.failure: str | None = None
        self._engine: Engine | None = None
        self._store: Store | None = None
        self._thread = threading.Thread(target=self._open, name="sweepmill-start", daemon=True)

    @property
    def store(self) -> Store:
        """The store. Raises Unavailable while the database is not open."""
        if self._store is None:
            raise Unavailable(self.failure or "the database is being opened")
        return self._store

    def start(self) -> None:
        """Begin to open database and pool; returns at once."""
        self._thread.start()

    def stop(self) -> None:
        """End event streams, finish the batches in flight or give up at the deadline, close the database."""
        self.stopping.set()
        self._thread.join(self.settings.stop_seconds)
        if self._engine is not None:
            self._engine.dispose()

    def unready(self) -> list[str]:
        """Why the service is not ready; empty when it is."""
        if self.failure is not None:
            return [self.failure]
        if self._store is None:
            return ["the database is being opened"]
        return []

    def is_ready(self) -> bool:
        """Whether sweeps are taken and sampled."""
        return not self.unready()

    def cores(self) -> int:
        """Cores that would sample: those of the pool, or those it is set to have."""
        return self.pool_status().cores or self.settings.workers

    def pool_status(self) -> PoolStatus:
        """The pool as the dispatcher of this process sees it."""
        return NO_POOL

    def _open(self) -> None:
        try:
            self._engine = open_database(self.settings.database)
            migrate(self._engine)
            self._store = Store(self._engine)
        except (DatabaseUnusable, SQLAlchemyError, OSError, CommandError) as error:
            self.failure = failure_line(self.settings, error)
            log.error("%s", self.failure)


def failure_line(settings: Settings, error: Exception) -> str:
    """One line that names the database, without its password, and the reason."""
    reason = str(getattr(error, "orig", None) or error).splitlines()[0]
    if isinstance(error, CommandError):
        reason = f"its schema is of a later release than this code ({reason})"
    return f"the database {masked_url(settings.database)} cannot be used: {reason}"
