"""Progress as server-sent events: the only coroutine among the routes."""

from typing import Annotated

import anyio.to_thread
from fastapi import APIRouter, Header, Query, Request
from starlette.responses import StreamingResponse

from sweepmill_service import examples
from sweepmill_service.events import Feed, stream
from sweepmill_service.openapi import problems
from sweepmill_service.routes.dependencies import KeyPrefix, RuntimeOf, StoreOf

router = APIRouter(prefix="/v1", tags=["sweeps"])
LONGEST_ID = 18
_HEADERS = {"Cache-Control": "no-store", "X-Accel-Buffering": "no"}


@router.get(
    "/sweeps/{key}/events",
    response_class=StreamingResponse,
    responses={
        200: {
            "description": "Events named `progress`; the id is the sweep's commit counter, the data a `ProgressEvent`",
            "content": {"text/event-stream": {"schema": {"type": "string"}, "example": examples.EVENT}},
        },
        **problems(404, 409, 422, 503),
    },
)
async def follow_sweep(
    key: KeyPrefix,
    request: Request,
    runtime: RuntimeOf,
    store: StoreOf,
    last_event_id: Annotated[str | None, Header(alias="Last-Event-ID", description="Resume after this commit")] = None,
    after: Annotated[int | None, Query(ge=0, lt=2**63, description="The same, for a first connection")] = None,
) -> StreamingResponse:
    """The current state, then changes, until the sweep is settled, withdrawn or stuck."""
    limiter = request.app.state.stream_threads
    full = await anyio.to_thread.run_sync(store.find_sweep, key, limiter=limiter)
    feed = Feed(store, full, resume_after(last_event_id, after), runtime.forecast)
    events = stream(feed, runtime.stopping, limiter)
    return StreamingResponse(events, media_type="text/event-stream", headers=_HEADERS)


def resume_after(last_event_id: str | None, after: int | None) -> int | None:
    """The commit a reader has seen; an id that is not one of ours counts as none."""
    known = last_event_id is not None and last_event_id.isdecimal() and len(last_event_id) <= LONGEST_ID
    return int(last_event_id) if known and last_event_id else after
