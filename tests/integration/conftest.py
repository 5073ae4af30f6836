"""A Postgres server for tests of whole services."""

from collections.abc import Iterator

import pytest

from support.databases import PostgresServer


@pytest.fixture(scope="session")
def postgres_server() -> Iterator[PostgresServer]:
    """A running server without databases of ours."""
    server = PostgresServer()
    try:
        yield server
    finally:
        server.remove()
