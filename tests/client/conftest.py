"""One service for the tests of the client."""

from collections.abc import Iterator

import pytest

from support.services import service


@pytest.fixture(scope="session")
def service_url(tmp_path_factory: pytest.TempPathFactory) -> Iterator[str]:
    """One service for all tests of the client; tests keep out of each other's way by `circuit.replicate`."""
    database = f"sqlite:///{tmp_path_factory.mktemp('service') / 'service.sqlite'}"
    with service(database, workers="1", batch_seconds="0.5") as running:  # a stop waits for the batches in flight
        yield running.url
