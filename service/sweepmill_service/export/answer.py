"""The HTTP answer with a table: format by Accept, a validator, and 304 for a copy that is current."""

import gc
import hashlib
from collections.abc import Callable, Iterator, Mapping
from contextlib import contextmanager
from http import HTTPStatus
from importlib.metadata import version

from starlette.responses import Response, StreamingResponse

from sweepmill.revisions import results_revision
from sweepmill_service.export.content import Content
from sweepmill_service.export.formats import WRITERS
from sweepmill_service.negotiate import MEDIA_TYPES, choose_format, matches
from sweepmill_service.store import Store

Build = Callable[[Store, str], Content]


def table_answer(
    store: Store,
    key: str,
    kind: str,
    build: Build,
    accept: str | None,
    held: str | None,
    offered: Mapping[str, str] = MEDIA_TYPES,
) -> Response:
    """Raises Refusal (406) where none of the formats `offered` is acceptable."""
    form = choose_format(accept, offered)
    if held is not None:
        etag = entity_tag(kind, key, store.table_version(key), form)
        if matches(held, etag):
            return Response(status_code=HTTPStatus.NOT_MODIFIED, headers=answer_headers(etag))
    with _no_collections():
        content = build(store, key)
    etag = entity_tag(kind, key, content.version, form)
    return StreamingResponse(WRITERS[form](content), headers=answer_headers(etag), media_type=MEDIA_TYPES[form])


@contextmanager
def _no_collections() -> Iterator[None]:
    """A large table makes a million objects and no cycles: looking for some took a third of its time."""
    gc.disable()
    try:
        yield
    finally:
        gc.enable()


def answer_headers(etag: str) -> dict[str, str]:
    """Headers of an answer that a client may keep and ask about again."""
    return {"ETag": etag, "Vary": "Accept", "Cache-Control": "private, no-cache"}


def entity_tag(kind: str, key: str, numbers: str, form: str) -> str:
    """Strong validator: a table is a function of the sweep, the N of each ensemble, the format and the code."""
    parts = (kind, key, numbers, form, version("sweepmill"), results_revision())
    return f'"{hashlib.sha256(chr(10).join(parts).encode()).hexdigest()[:32]}"'
