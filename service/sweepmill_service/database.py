"""Opening a database: SQLite for one service on one machine, Postgres for several."""

import sqlite3
from pathlib import Path
from typing import Any

from sqlalchemy import Connection, Engine, create_engine, event
from sqlalchemy.engine import URL, make_url

WRITES = "sweepmill_writes"  # execution option of connections that are going to write
NETWORK_FILE_SYSTEMS = frozenset({"nfs", "nfs4", "cifs", "smb3", "smbfs", "fuse.sshfs", "lustre", "gpfs", "afs", "9p"})
POSTGRES_SESSION = (
    "-c statement_timeout=60000 -c lock_timeout=15000 -c idle_in_transaction_session_timeout=60000 -c jit=off"
)


class DatabaseUnusable(Exception):
    """The database cannot serve as a store; the message says why and what would."""


def open_database(url: str) -> Engine:
    """Engine for a SQLAlchemy URL (``sqlite:///file`` or ``postgresql://...``).

    Raises DatabaseUnusable for other databases, for SQLite in memory and for SQLite on a network file system.
    """
    parsed = make_url(url)
    if parsed.get_backend_name() == "sqlite":
        return _open_sqlite(parsed)
    if parsed.get_backend_name() in ("postgresql", "postgres"):
        return _open_postgres(parsed)
    raise DatabaseUnusable(f"database {parsed.get_backend_name()!r} is not supported: use sqlite or postgresql")


def writing(engine: Engine) -> Engine:
    """The same pool, for transactions that write.

    On SQLite they begin IMMEDIATE: a transaction that reads first and writes later otherwise fails as soon as
    another one wrote in between, busy timeout or not.
    """
    return engine.execution_options(**{WRITES: True})


def _open_postgres(url: URL) -> Engine:
    return create_engine(
        url.set(drivername="postgresql+psycopg"),
        pool_size=10,
        max_overflow=40,
        pool_pre_ping=True,
        connect_args={"options": POSTGRES_SESSION, "connect_timeout": 10},
    )


def _open_sqlite(url: URL) -> Engine:
    if not url.database or url.database == ":memory:":
        raise DatabaseUnusable("SQLite in memory keeps nothing: name a file, as in sqlite:///sweepmill.sqlite")
    path = Path(url.database).absolute()
    path.parent.mkdir(parents=True, exist_ok=True)
    kind = file_system(path.parent)
    if kind in NETWORK_FILE_SYSTEMS:
        raise DatabaseUnusable(
            f"{path} lies on a network file system ({kind}), where SQLite's write-ahead log is not safe: "
            "use a local disk or Postgres"
        )
    engine = create_engine(
        url.set(drivername="sqlite+pysqlite", database=str(path)),
        pool_size=10,
        max_overflow=40,
        connect_args={"timeout": 15.0, "check_same_thread": False},
    )
    event.listen(engine, "connect", _configure_sqlite)
    event.listen(engine, "begin", _begin_sqlite)
    return engine


def _configure_sqlite(connection: sqlite3.Connection, _record: object) -> None:
    connection.isolation_level = None  # BEGIN is ours, see _begin_sqlite
    mode = connection.execute("PRAGMA journal_mode=WAL").fetchone()[0]
    if mode != "wal":
        raise DatabaseUnusable(f"SQLite cannot keep a write-ahead log here (journal mode {mode!r})")
    connection.execute("PRAGMA synchronous=FULL")  # acknowledged means kept, power cuts included
    connection.execute("PRAGMA foreign_keys=ON")


def _begin_sqlite(connection: Connection) -> None:
    writes = connection.get_execution_options().get(WRITES, False)
    connection.exec_driver_sql("BEGIN IMMEDIATE" if writes else "BEGIN")


def file_system(path: Path, mounts: str = "/proc/self/mounts") -> str | None:
    """Type of the file system that holds a directory, where the system tells (Linux)."""
    try:
        lines = Path(mounts).read_text().splitlines()
    except OSError:
        return None
    fields = [line.split() for line in lines]
    holding = [(len(f[1]), f[2]) for f in fields if path.resolve().is_relative_to(f[1].replace("\\040", " "))]
    return max(holding)[1] if holding else None


def sqlite_file(engine: Engine) -> Path | None:
    """The file of a SQLite database, None for a server."""
    url: Any = engine.url
    return Path(url.database) if url.get_backend_name() == "sqlite" else None
