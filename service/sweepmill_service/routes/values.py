"""Values of single trajectories, of observations that keep them."""

from http import HTTPStatus
from typing import Annotated

from fastapi import APIRouter, Header, Query
from starlette.responses import Response, StreamingResponse

from sweepmill_service import examples
from sweepmill_service.export.answer import answer_headers, entity_tag
from sweepmill_service.export.values import VALUE_WRITERS, Kept
from sweepmill_service.negotiate import MEDIA_TYPES, choose_format, matches
from sweepmill_service.openapi import problems
from sweepmill_service.routes.dependencies import KeyPrefix, StoreOf

router = APIRouter(prefix="/v1", tags=["results"])
OFFERED = {form: MEDIA_TYPES[form] for form in VALUE_WRITERS}
_BINARY = {"schema": {"type": "string", "format": "binary"}}
_TEXT = {"schema": {"type": "string"}, "example": examples.VALUES}


@router.get(
    "/sweeps/{key}/values",
    response_class=Response,
    responses={
        200: {
            "description": "One row per ensemble, trajectory and coordinate",
            "content": {media: _TEXT if media == "text/csv" else _BINARY for media in OFFERED.values()},
        },
        304: {"description": "The copy at hand is current"},
        **problems(404, 406, 409, 422, 503),
    },
)
def read_values(
    key: KeyPrefix,
    store: StoreOf,
    name: Annotated[
        str | None, Query(description="Which observation; needed where several keep their values", examples=["entropy"])
    ] = None,
    accept: Annotated[
        str | None, Header(description=f"One of {', '.join(OFFERED.values())}; an Arrow stream by default")
    ] = None,
    held: Annotated[str | None, Header(alias="If-None-Match", description="ETags of copies at hand")] = None,
) -> Response:
    """What an observation with `keep_values` read off every trajectory its table rests on, in their order.

    Columns: the axes, layer, position, trajectory, and value, or numerator and denominator of a ratio. The answer is
    sent while it is read from the database; it is too large for JSON.
    """
    form = choose_format(accept, OFFERED, "values")
    kept = Kept.find(store, store.find_sweep(key), name)
    etag = entity_tag(f"values {kept.item.name}", kept.sweep, kept.version(), form)
    if matches(held, etag):
        return Response(status_code=HTTPStatus.NOT_MODIFIED, headers=answer_headers(etag))
    pieces = VALUE_WRITERS[form](kept.content(store))
    return StreamingResponse(pieces, headers=answer_headers(etag), media_type=MEDIA_TYPES[form])
