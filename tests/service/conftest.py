"""Databases for the tests of the service: SQLite files, and a Postgres server started by the session."""

from collections.abc import Iterator
from contextlib import ExitStack, contextmanager
from pathlib import Path

import pytest
from sqlalchemy import Engine, event

from support.databases import DatabaseMaker, PostgresServer, Statements
from sweepmill_service.database import open_database
from sweepmill_service.migrations import migrate
from sweepmill_service.pool import LocalPool
from sweepmill_service.store import Store

TEMPLATE = "migrated"


@pytest.fixture(scope="session")
def postgres() -> Iterator[PostgresServer]:
    """A running server with a migrated database to copy from."""
    server = PostgresServer()
    try:
        server.execute(f"CREATE DATABASE {TEMPLATE}")
        engine = open_database(server.url(TEMPLATE))
        migrate(engine)
        engine.dispose()
        yield server
    finally:
        server.remove()


@pytest.fixture(params=["sqlite", "postgres"])
def backend(request: pytest.FixtureRequest) -> str:
    """Each test that asks for it runs on both databases."""
    return str(request.param)


@pytest.fixture
def make_database(backend: str, tmp_path: Path, request: pytest.FixtureRequest) -> DatabaseMaker:
    """Context manager that gives the URL of a fresh database, migrated or empty."""
    count = 0

    @contextmanager
    def sqlite(migrated: bool = True) -> Iterator[str]:
        nonlocal count
        count += 1
        url = f"sqlite:///{tmp_path / f'{count}.sqlite'}"
        if migrated:
            engine = open_database(url)
            migrate(engine)
            engine.dispose()
        yield url

    @contextmanager
    def postgres(migrated: bool = True) -> Iterator[str]:
        server: PostgresServer = request.getfixturevalue("postgres")
        with server.database(TEMPLATE if migrated else "template1") as url:
            yield url

    return sqlite if backend == "sqlite" else postgres


@pytest.fixture
def database_url(make_database: DatabaseMaker) -> Iterator[str]:
    """URL of a fresh migrated database."""
    with make_database() as url:
        yield url


@pytest.fixture
def engine(database_url: str) -> Iterator[Engine]:
    """Engine on a fresh migrated database."""
    engine = open_database(database_url)
    yield engine
    engine.dispose()


@pytest.fixture
def store(engine: Engine) -> Store:
    """Store on a fresh migrated database."""
    return Store(engine)


@pytest.fixture
def statements(engine: Engine) -> Iterator[Statements]:
    """Counts what is sent to the database; an executemany counts once."""
    counted = Statements()
    with ExitStack() as stack:
        event.listen(engine, "before_cursor_execute", counted.note)
        stack.callback(event.remove, engine, "before_cursor_execute", counted.note)
        yield counted


@pytest.fixture(scope="session")
def local_pool() -> Iterator[LocalPool]:
    """Two real worker processes, kernels compiled before."""
    pool = LocalPool(2)
    pool.open()
    yield pool
    pool.close()
