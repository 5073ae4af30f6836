"""Requests to the service: repeated where that can help, failures translated."""

from collections.abc import Iterator, Mapping
from contextlib import contextmanager
from typing import Any, TypeVar

import httpx
from pydantic import BaseModel, ValidationError

from sweepmill.connection import Connection
from sweepmill.errors import UnexpectedAnswer
from sweepmill.failures import refusal, translating
from sweepmill.retry import Retry

Body = TypeVar("Body", bound=BaseModel)


class Transport:
    """One HTTP connection pool to one service.

    Every call of the interface is idempotent (submitting too: a sweep's key is the hash of its content), so
    each is repeated after a lost connection or a 502, 503 or 504.
    """

    def __init__(
        self, connection: Connection, timeout: float, retry: Retry, transport: httpx.BaseTransport | None
    ) -> None:
        self.connection = connection
        self.retry = retry
        self.http = httpx.Client(
            base_url=connection.url,
            headers=connection.headers,
            timeout=httpx.Timeout(timeout, connect=min(timeout, 10.0)),
            transport=transport,
            trust_env=not connection.loopback,
        )

    def close(self) -> None:
        """Close all connections."""
        self.http.close()

    def fetch(self, kind: type[Body], method: str, path: str, **options: Any) -> Body:
        """Call and read the answer as a message of the given kind."""
        response = self.call(method, path, **options)
        try:
            return kind.model_validate_json(response.content)
        except ValidationError as error:
            raise UnexpectedAnswer(self.connection.url + path, f"the body is no {kind.__name__}: {error}") from error

    def call(self, method: str, path: str, **options: Any) -> httpx.Response:
        """Call and return a successful response, its body read."""
        return self.retry.run(lambda: self._once(method, path, **options))

    def _once(self, method: str, path: str, **options: Any) -> httpx.Response:
        with translating(self.connection.url):
            response = self.http.request(method, path, **options)
        self._check(response)
        return response

    @contextmanager
    def stream(self, path: str, headers: Mapping[str, str], timeout: float | None = None) -> Iterator[httpx.Response]:
        """A successful response whose body is still to be read; not repeated. `timeout` per read, seconds."""
        extra: dict[str, Any] = {} if timeout is None else {"timeout": httpx.Timeout(timeout, connect=10.0)}
        with (
            translating(self.connection.url),
            self.http.stream("GET", path, headers=headers, **extra) as response,
        ):
            if not response.is_success:
                response.read()
            self._check(response)
            yield response

    def _check(self, response: httpx.Response) -> None:
        if response.is_redirect:
            target = response.headers.get("Location", "nowhere")
            raise UnexpectedAnswer(self.connection.url, f"it redirects to {target}; use that address instead")
        if not response.is_success:
            raise refusal(response, self.connection.url)
