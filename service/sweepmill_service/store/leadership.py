"""One dispatcher at a time: a lock file beside a SQLite database, an advisory lock on a Postgres server.

Correctness does not depend on it: two dispatchers would only compute the same batches twice.
"""

import contextlib
from pathlib import Path
from typing import Protocol

from filelock import FileLock, Timeout
from sqlalchemy import Connection, Engine, text
from sqlalchemy.exc import SQLAlchemyError

from sweepmill_service.database import sqlite_file

ADVISORY_LOCK = 0x53574D4C  # of the database, so that several services can share a server


class AlreadyServed(Exception):
    """Another service dispatches from this SQLite file."""

    def __init__(self, path: Path) -> None:
        self.path = path
        super().__init__(
            f"another service is running on {path}: stop it, name another database, or use Postgres for several"
        )


class Leadership(Protocol):
    """The right to dispatch."""

    def acquire(self) -> bool:
        """Take it if it is free; True while it is held. Raises AlreadyServed, or what the database raises."""

    def release(self) -> None:
        """Give it up; never raises."""


def leadership(engine: Engine) -> Leadership:
    """The kind that fits the database."""
    path = sqlite_file(engine)
    return AdvisoryLeadership(engine) if path is None else FileLeadership(path)


class FileLeadership:
    """A lock file, which the system releases when the process ends, however it ends."""

    def __init__(self, path: Path) -> None:
        self._path = path
        self._lock = FileLock(f"{path}.dispatcher.lock", thread_local=False)

    def acquire(self) -> bool:
        """Take the lock. Raises AlreadyServed."""
        if not self._lock.is_locked:
            try:
                self._lock.acquire(timeout=0)
            except Timeout:
                raise AlreadyServed(self._path) from None
        return True

    def release(self) -> None:
        """Give it up."""
        self._lock.release(force=True)


class AdvisoryLeadership:
    """A session lock on a connection of its own: it ends with the connection."""

    def __init__(self, engine: Engine) -> None:
        self._engine = engine
        self._connection: Connection | None = None
        self._held = False

    def acquire(self) -> bool:
        """Take the lock if it is free, and see whether it is still held otherwise."""
        try:
            return self._acquire()
        except SQLAlchemyError:
            self.release()
            raise

    def release(self) -> None:
        """Give it back and close the connection, which ends the lock in any case."""
        connection, self._connection = self._connection, None
        held, self._held = self._held, False
        if connection is None:
            return
        with contextlib.suppress(SQLAlchemyError):
            if held:
                connection.execute(text("SELECT pg_advisory_unlock(:key)"), {"key": ADVISORY_LOCK})
            connection.invalidate()
            connection.close()

    def _acquire(self) -> bool:
        if self._connection is None:
            self._connection = self._engine.connect().execution_options(isolation_level="AUTOCOMMIT")
        if self._held:
            self._connection.execute(text("SELECT 1"))
        else:
            asked = self._connection.execute(text("SELECT pg_try_advisory_lock(:key)"), {"key": ADVISORY_LOCK})
            self._held = bool(asked.scalar())
        return self._held
