"""The client: submits sweeps to a service and reads what it has sampled."""

import re
from collections.abc import Iterator
from types import TracebackType
from typing import Any, Self

import httpx

from sweepmill.connection import connection
from sweepmill.errors import KeyMismatch, NotAKey, ServiceError, SpecificationError
from sweepmill.identity import KEY_DIGITS, SHORTEST_PREFIX
from sweepmill.messages import (
    EnsembleRecord,
    Estimate,
    PoolStatus,
    Submitted,
    SweepList,
    SweepState,
    SweepStatus,
    Trajectory,
)
from sweepmill.remote import RemoteSweep
from sweepmill.retry import Retry
from sweepmill.revisions import all_revisions
from sweepmill.sweep import Sweep
from sweepmill.transport import Body, Transport

RECOMPUTE_SECONDS = 600.0  # recomputing one deep trajectory is the only slow answer


class Client:
    """A connection to one service; close it, or use it as a context manager.

    Arguments that are not given come from SWEEPMILL_URL (default http://127.0.0.1:8765), SWEEPMILL_TOKEN
    and SWEEPMILL_OWNER (default: the login name). `timeout` is in seconds, for each answer. `transport`
    replaces the network, for tests. All methods raise subclasses of SweepmillError and nothing of httpx.
    """

    def __init__(
        self,
        url: str | None = None,
        token: str | None = None,
        owner: str | None = None,
        timeout: float = 60.0,
        retry: Retry | None = None,
        transport: httpx.BaseTransport | None = None,
    ) -> None:
        self._transport = Transport(connection(url, token, owner), timeout, retry or Retry(), transport)

    def __enter__(self) -> Self:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, traceback: TracebackType | None
    ) -> None:
        self.close()

    def close(self) -> None:
        """Close all connections."""
        self._transport.close()

    @property
    def url(self) -> str:
        """Address of the service."""
        return self._transport.connection.url

    @property
    def owner(self) -> str:
        """Whose requests this client makes."""
        return self._transport.connection.owner

    def submit(self, sweep: Sweep) -> RemoteSweep:
        """Submit a sweep, or join it if it is there; repeating does no harm.

        Raises SpecificationError where the service refuses it, KeyMismatch where the two sides compute
        different keys.
        """
        answer = self._specify(Submitted, "/v1/sweeps", sweep)
        if answer.key != sweep.key:
            raise KeyMismatch(sweep.key, answer.key, all_revisions(), answer.revisions)
        return RemoteSweep(self._transport, answer.key, answer)

    def estimate(self, sweep: Sweep) -> Estimate:
        """What a sweep would cost and what of it is there already; stores nothing. Raises like `submit`."""
        return self._specify(Estimate, "/v1/estimate", sweep)

    def _specify(self, kind: type[Body], path: str, sweep: Sweep) -> Body:
        try:
            return self._transport.fetch(kind, "POST", path, json=_body(sweep))
        except ServiceError as error:
            if error.faults:
                raise SpecificationError(error.faults) from error
            raise

    def sweep(self, key: str) -> RemoteSweep:
        """A sweep that is there, by its key or at least 8 of its first digits.

        Raises NotAKey, UnknownKey, AmbiguousKey.
        """
        status = self._transport.fetch(SweepStatus, "GET", f"/v1/sweeps/{digits(key)}")
        return RemoteSweep(self._transport, status.key)

    def sweeps(
        self,
        owner: str | None = None,
        state: SweepState | None = None,
        family: str | None = None,
        page: int = 50,
    ) -> Iterator[SweepStatus]:
        """Sweeps, newest first, fetched `page` at a time."""
        filters: dict[str, Any] = {"owner": owner, "state": state, "family": family}
        query = {name: value for name, value in filters.items() if value is not None} | {"limit": page}
        while True:
            part = self._transport.fetch(SweepList, "GET", "/v1/sweeps", params=query)
            yield from part.sweeps
            if part.next is None:
                return
            query["after"] = part.next

    def ensemble(self, key: str) -> EnsembleRecord:
        """Parameters, counts and provenance of one ensemble. Raises NotAKey, UnknownKey, AmbiguousKey."""
        return self._transport.fetch(EnsembleRecord, "GET", f"/v1/ensembles/{digits(key)}")

    def trajectory(self, key: str, k: int) -> Trajectory:
        """Trajectory `k` of an ensemble, recomputed by the service with every observation it has there."""
        path = f"/v1/ensembles/{digits(key)}/trajectories/{k}"
        return self._transport.fetch(Trajectory, "GET", path, timeout=RECOMPUTE_SECONDS)

    def pool(self) -> PoolStatus:
        """Workers, cores and what they are computing."""
        return self._transport.fetch(PoolStatus, "GET", "/v1/pool")

    def health(self) -> bool:
        """Whether the service answers; raises Unreachable if nothing does."""
        return self._transport.call("GET", "/healthz").is_success


def digits(key: str) -> str:
    """A key or its beginning, fit for a path. Raises NotAKey."""
    if not re.fullmatch(f"[0-9a-f]{{{SHORTEST_PREFIX},{KEY_DIGITS}}}", key.lower()):
        raise NotAKey(key)
    return key.lower()


def _body(sweep: Sweep) -> dict[str, Any]:
    """The normal form, with what belongs to the request and not to the sweep."""
    request = {"label": sweep.label, "priority": sweep.priority}
    return sweep.normalized() | {name: value for name, value in request.items() if value}
