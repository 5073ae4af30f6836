"""The service itself: pool, health, metrics."""

from http import HTTPStatus
from typing import Any

from fastapi import APIRouter, Request
from starlette.responses import Response

from sweepmill.messages import PoolStatus
from sweepmill_service import examples
from sweepmill_service.metrics import CONTENT_TYPE
from sweepmill_service.openapi import described, problems
from sweepmill_service.problems import RETRY_SECONDS, Refusal
from sweepmill_service.routes.dependencies import RuntimeOf

router = APIRouter(tags=["service"])


@router.get("/", responses={200: described("Where things are", examples.INDEX)})
async def read_index() -> dict[str, str]:
    """Links to start from."""
    return examples.INDEX


@router.get("/v1/pool", responses={200: described("The pool", examples.POOL)})
def read_pool(runtime: RuntimeOf) -> PoolStatus:
    """Workers, cores, throughput, and what each worker computes."""
    return runtime.pool_status()


@router.get("/healthz", responses={200: described("The process answers", {"status": "ok"})})
async def read_health() -> dict[str, str]:
    """Liveness: answered at once, whatever the database and the pool do."""
    return {"status": "ok"}


@router.get("/readyz", responses={200: described("Schema and pool are ready", {"status": "ready"}), **problems(503)})
def read_readiness(runtime: RuntimeOf) -> dict[str, Any]:
    """Readiness: 503 with the reasons until sweeps are taken and sampled."""
    reasons = runtime.unready()
    if reasons:
        headers = {"Retry-After": str(RETRY_SECONDS)}
        raise Refusal(HTTPStatus.SERVICE_UNAVAILABLE, "; ".join(reasons), headers=headers)
    return {"status": "ready"}


@router.get(
    "/metrics",
    response_class=Response,
    responses={200: {"description": "Metrics as Prometheus text", "content": {"text/plain": {}}}},
)
def read_metrics(request: Request) -> Response:
    """Requests and pool in numbers."""
    return Response(request.app.state.metrics.text(), media_type=CONTENT_TYPE)
