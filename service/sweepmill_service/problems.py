"""Every error leaves as a problem document of RFC 9457."""

import logging
from collections.abc import Iterable, Mapping
from http import HTTPStatus
from typing import Any

from fastapi import FastAPI, Request
from fastapi.exceptions import RequestValidationError
from sqlalchemy.exc import DataError, DBAPIError
from sqlalchemy.exc import TimeoutError as PoolTimeout
from starlette.exceptions import HTTPException
from starlette.responses import JSONResponse, Response

from sweepmill.errors import Fault, SpecificationError
from sweepmill.faults import message_of
from sweepmill.messages import Problem
from sweepmill_service.store.errors import AmbiguousKey, ShortKey, UnknownKey

MEDIA_TYPE = "application/problem+json"
RETRY_SECONDS = 5
log = logging.getLogger(__name__)


class Refusal(Exception):
    """A request that cannot be answered, with the status and the words to say so."""

    def __init__(
        self,
        status: HTTPStatus,
        detail: str,
        faults: Iterable[Fault] = (),
        headers: Mapping[str, str] | None = None,
    ) -> None:
        super().__init__(detail)
        self.status = status
        self.detail = detail
        self.faults = tuple(faults)
        self.headers = dict(headers or {})


class Unavailable(Refusal):
    """A request that would be answered later: the database or the pool is not there now."""

    def __init__(self, detail: str) -> None:
        super().__init__(HTTPStatus.SERVICE_UNAVAILABLE, detail, headers={"Retry-After": str(RETRY_SECONDS)})


def problem(refusal: Refusal, instance: str | None = None) -> JSONResponse:
    """The response for a refusal."""
    body = Problem(
        title=refusal.status.phrase,
        status=refusal.status.value,
        detail=refusal.detail,
        instance=instance,
        faults=[{"path": fault.path, "message": fault.message} for fault in refusal.faults],
    )
    headers = {**refusal.headers, "Cache-Control": "no-store"}
    return JSONResponse(body.model_dump(), refusal.status.value, headers, MEDIA_TYPE)


def install(app: FastAPI) -> None:
    """Answer every exception the application may raise."""
    for kind, convert in _CONVERSIONS.items():
        app.add_exception_handler(kind, _handler(convert))


def _handler(convert: Any) -> Any:
    # A coroutine, so that it runs without the thread pool, which may be what is exhausted.
    async def handle(request: Request, error: Exception) -> Response:
        return problem(convert(error), request.url.path)

    return handle


def _from_http(error: HTTPException) -> Refusal:
    status = HTTPStatus(error.status_code)
    detail = error.detail if error.detail != status.phrase else status.description
    return Refusal(status, detail, headers=error.headers)


def _from_validation(error: RequestValidationError) -> Refusal:
    """Parameters or a body that do not fit the interface."""
    if any(fault["type"] == "json_invalid" for fault in error.errors()):
        unread = [Fault(_path(fault["loc"]), fault["msg"]) for fault in error.errors()]
        return Refusal(HTTPStatus.BAD_REQUEST, "the body is not JSON", unread)
    faults = [Fault(_path(fault["loc"]), message_of(fault)) for fault in error.errors()]
    return Refusal(HTTPStatus.UNPROCESSABLE_ENTITY, "the request does not fit the interface", faults)


def _path(location: tuple[str | int, ...]) -> str:
    """`body.priority`, `query.limit`, `header.Sweepmill-Owner`."""
    return ".".join(str(part) for part in location)


def _from_specification(error: SpecificationError) -> Refusal:
    count = len(error.faults)
    detail = f"the specification is refused: {count} fault{'s' if count != 1 else ''}; nothing is stored"
    return Refusal(HTTPStatus.UNPROCESSABLE_ENTITY, detail, error.faults)


def _from_short_key(error: ShortKey) -> Refusal:
    return Refusal(HTTPStatus.UNPROCESSABLE_ENTITY, str(error), [Fault("path.key", str(error))])


def _from_unknown_key(error: UnknownKey) -> Refusal:
    return Refusal(HTTPStatus.NOT_FOUND, str(error))


def _from_ambiguous_key(error: AmbiguousKey) -> Refusal:
    faults = [Fault("path.key", candidate) for candidate in error.candidates]
    return Refusal(HTTPStatus.CONFLICT, str(error), faults)


def _from_database(error: DBAPIError | PoolTimeout) -> Refusal:
    """The database is locked, full or gone; its own first line says which, and never holds a password."""
    reason = str(error.orig).splitlines()[0] if isinstance(error, DBAPIError) else "no connection is free"
    log.warning("the database does not answer: %s", reason)
    return Unavailable(f"the database does not answer: {reason}")


def _from_unstorable(error: DataError | UnicodeEncodeError) -> Refusal:
    """Text that no database takes, such as half a character of UTF-16; Postgres takes no NUL either."""
    reason = str(error.orig if isinstance(error, DataError) else error).splitlines()[0]
    return Refusal(HTTPStatus.UNPROCESSABLE_ENTITY, f"a value cannot be stored: {reason}")


def _from_anything(error: Exception) -> Refusal:
    """An error of ours. The log has the traceback; the answer has no internals."""
    return Refusal(HTTPStatus.INTERNAL_SERVER_ERROR, "the service failed at this request; its log says more")


_CONVERSIONS: dict[type[Exception], Any] = {
    Refusal: lambda refusal: refusal,
    HTTPException: _from_http,
    RequestValidationError: _from_validation,
    SpecificationError: _from_specification,
    ShortKey: _from_short_key,
    UnknownKey: _from_unknown_key,
    AmbiguousKey: _from_ambiguous_key,
    DBAPIError: _from_database,
    DataError: _from_unstorable,
    UnicodeEncodeError: _from_unstorable,
    PoolTimeout: _from_database,
    Exception: _from_anything,
}
