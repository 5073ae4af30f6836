"""One service for the tests of the client."""

from collections.abc import Iterator

import pytest

from support.running import running_service


@pytest.fixture(scope="session")
def service_url(tmp_path_factory: pytest.TempPathFactory) -> Iterator[str]:
    """One service for all tests of the client; tests keep out of each other's way by `circuit.replicate`."""
    with running_service(tmp_path_factory.mktemp("service"), "--workers", "1") as url:
        yield url
