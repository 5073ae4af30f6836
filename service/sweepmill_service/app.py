"""The application: routes, guard, metrics, and what lives as long as the service."""

from collections.abc import AsyncIterator
from contextlib import asynccontextmanager
from importlib.metadata import version

import anyio.to_thread
from fastapi import FastAPI

from sweepmill_service import events, problems
from sweepmill_service.guard import Guard
from sweepmill_service.metrics import Instrument, Metrics
from sweepmill_service.openapi import document
from sweepmill_service.routes import ensembles, service, sweeps, tables, values
from sweepmill_service.routes import events as event_routes
from sweepmill_service.runtime import Runtime
from sweepmill_service.settings import Settings

DESCRIPTION = "Ensemble averages over monitored quantum circuits: sampled once, shared by all, exact."
TAGS = [
    {"name": "sweeps", "description": "Submitting sweeps and following them"},
    {"name": "results", "description": "Tables of what was sampled"},
    {"name": "ensembles", "description": "Provenance, and single trajectories"},
    {"name": "service", "description": "The pool and the service itself"},
]
# Fewer than the connections of the database pool, so that a request never waits for a connection.
REQUEST_THREADS = 32


def create_app(settings: Settings) -> FastAPI:
    """The application for these settings. Database and pool are opened when it starts, not here."""
    runtime = Runtime(settings)
    metrics = Metrics(runtime.pool_status)
    app = FastAPI(
        title="Sweepmill",
        version=version("sweepmill"),
        description=DESCRIPTION,
        openapi_tags=TAGS,
        docs_url=None,  # both pages load scripts from elsewhere
        redoc_url=None,
        lifespan=_lifespan,
    )
    app.state.runtime = runtime
    app.state.metrics = metrics
    for module in (sweeps, event_routes, tables, values, ensembles, service):
        app.include_router(module.router)
    app.add_middleware(Guard, limits=settings.limits)
    app.add_middleware(Instrument, metrics=metrics)
    problems.install(app)
    app.openapi = document(app)  # type: ignore[method-assign]
    return app


@asynccontextmanager
async def _lifespan(app: FastAPI) -> AsyncIterator[None]:
    runtime: Runtime = app.state.runtime
    anyio.to_thread.current_default_thread_limiter().total_tokens = REQUEST_THREADS
    app.state.stream_threads = events.limiter()
    runtime.start()
    yield
    await anyio.to_thread.run_sync(runtime.stop)
