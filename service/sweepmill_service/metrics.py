"""Prometheus metrics, in a registry of their own per application."""

import time
from collections.abc import Callable, Iterator
from typing import Any

from prometheus_client import CollectorRegistry, Counter, Histogram, generate_latest
from prometheus_client.core import CounterMetricFamily, GaugeMetricFamily
from prometheus_client.registry import Collector
from starlette.types import ASGIApp, Receive, Scope, Send

from sweepmill.messages import PoolStatus

CONTENT_TYPE = "text/plain; version=0.0.4; charset=utf-8"
_SECONDS = (0.005, 0.02, 0.1, 0.5, 2.0, 10.0)


class Metrics:
    """Counts of requests, and the pool as it is when asked."""

    def __init__(self, pool: Callable[[], PoolStatus]) -> None:
        self.registry = CollectorRegistry()
        self.requests = Counter(
            "sweepmill_requests", "Requests answered", ("method", "route", "status"), registry=self.registry
        )
        self.seconds = Histogram(
            "sweepmill_request_seconds",
            "Time to the first byte of the answer",
            ("route",),
            registry=self.registry,
            buckets=_SECONDS,
        )
        self.registry.register(PoolMetrics(pool))

    def text(self) -> bytes:
        """All metrics in the text format."""
        return generate_latest(self.registry)


class PoolMetrics(Collector):
    """Numbers of the pool, read at the moment of collection."""

    def __init__(self, pool: Callable[[], PoolStatus]) -> None:
        self.pool = pool

    def collect(self) -> Iterator[Any]:
        """Gauges and counters; without a database query."""
        status = self.pool()
        yield GaugeMetricFamily("sweepmill_pool_ready", "1 if batches are dispatched", value=status.ready)
        yield GaugeMetricFamily("sweepmill_pool_workers", "Worker processes", value=len(status.workers))
        yield GaugeMetricFamily("sweepmill_pool_cores", "Worker threads", value=status.cores)
        yield GaugeMetricFamily("sweepmill_pool_in_flight", "Batches handed to workers", value=status.in_flight)
        yield GaugeMetricFamily("sweepmill_pool_busy", "Sampling per core and second", value=status.busy_fraction)
        yield GaugeMetricFamily(
            "sweepmill_trajectories_per_second", "Over the last minute", value=status.trajectories_per_second
        )
        yield CounterMetricFamily("sweepmill_batches", "Batches stored", value=status.batches_committed)


class Instrument:
    """Pure ASGI middleware that counts and times requests by route, never by path: paths are unbounded."""

    def __init__(self, app: ASGIApp, metrics: Metrics) -> None:
        self.app = app
        self.metrics = metrics

    async def __call__(self, scope: Scope, receive: Receive, send: Send) -> None:
        if scope["type"] != "http":
            await self.app(scope, receive, send)
            return
        began = time.monotonic()

        async def sending(message: Any) -> None:
            if message["type"] == "http.response.start":
                self._count(scope, message["status"], time.monotonic() - began)
            await send(message)

        await self.app(scope, receive, sending)

    def _count(self, scope: Scope, status: int, seconds: float) -> None:
        route = getattr(scope.get("route"), "path", "none")
        method = scope["method"] if scope["method"] in ("GET", "POST", "PATCH", "DELETE") else "other"
        self.metrics.requests.labels(method, route, str(status)).inc()
        self.metrics.seconds.labels(route).observe(seconds)
