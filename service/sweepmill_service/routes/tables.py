"""Results: the aggregated table and the histograms of a sweep."""

from collections.abc import Mapping
from functools import partial
from typing import Annotated, Any

from fastapi import APIRouter, Header, Query
from starlette.responses import Response

from sweepmill_service import examples
from sweepmill_service.export.answer import table_answer
from sweepmill_service.export.folds import folds_of
from sweepmill_service.export.histograms import histogram_content
from sweepmill_service.export.tables import table_content
from sweepmill_service.negotiate import MEDIA_TYPES, NESTED
from sweepmill_service.openapi import problems
from sweepmill_service.routes.dependencies import KeyPrefix, StoreOf

router = APIRouter(prefix="/v1", tags=["results"])
Accept = Annotated[str | None, Header(description=f"One of {', '.join(MEDIA_TYPES.values())}; JSON by default")]
IfNoneMatch = Annotated[str | None, Header(alias="If-None-Match", description="ETags of copies at hand")]


def _responses(
    description: str, example: dict[str, Any], offered: Mapping[str, str] = MEDIA_TYPES
) -> dict[int | str, dict[str, Any]]:
    binary: dict[str, Any] = {"schema": {"type": "string", "format": "binary"}}
    content: dict[str, Any] = dict.fromkeys(offered.values(), binary)
    content["application/json"] = {"schema": {"$ref": "#/components/schemas/Table"}, "example": example}
    if "text/csv" in content:
        content["text/csv"] = {"schema": {"type": "string"}}
    return {
        200: {"description": description, "content": content},
        304: {"description": "The copy at hand is current"},
        **problems(404, 406, 409, 422, 503),
    }


@router.get(
    "/sweeps/{key}/table",
    response_class=Response,
    responses=_responses("One row per ensemble, observation and coordinate", examples.TABLE),
)
def read_table(key: KeyPrefix, store: StoreOf, accept: Accept = None, held: IfNoneMatch = None) -> Response:
    """The aggregated table, also of a sweep that is still being sampled; a settled one never changes again."""
    return table_answer(store, store.find_sweep(key), "table", table_content, accept, held)


@router.get(
    "/sweeps/{key}/histograms",
    response_class=Response,
    responses=_responses("One row per ensemble, observation, coordinate and value that occurred", examples.HISTOGRAMS),
)
def read_histograms(
    key: KeyPrefix,
    store: StoreOf,
    folds: Annotated[
        bool,
        Query(description="Also a list `by_fold`: occurrences in trajectories k of every fold, k modulo its length"),
    ] = False,
    accept: Accept = None,
    held: IfNoneMatch = None,
) -> Response:
    """Exact histograms of the observations that ask for one; with `folds`, what their statistical errors rest on."""
    kind, offered = ("histograms by fold", NESTED) if folds else ("histograms", MEDIA_TYPES)
    content = partial(histogram_content, by_fold=folds)
    return table_answer(store, store.find_sweep(key), kind, content, accept, held, offered)


@router.get(
    "/sweeps/{key}/folds",
    response_class=Response,
    responses=_responses("One row per ensemble, observation and coordinate", examples.FOLDS, NESTED),
)
def read_folds(
    key: KeyPrefix,
    store: StoreOf,
    name: Annotated[str | None, Query(max_length=64, description="Only the observation of this name")] = None,
    accept: Annotated[str | None, Header(description=f"One of {', '.join(NESTED.values())}; JSON by default")] = None,
    held: IfNoneMatch = None,
) -> Response:
    """Sums over folds of trajectories, for jackknife errors of anything that is computed from means.

    Trajectory k belongs to fold k modulo the length of the lists. The mean without fold r is
    sum(numerators without r) / sum(denominators without r); it is that of the table if nothing is left out.
    """
    return table_answer(store, store.find_sweep(key), f"folds {name or ''}", folds_of(name), accept, held, NESTED)
