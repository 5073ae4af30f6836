"""The guard before everything: who may be called what, how large and how deep a body may be.

Without tokens the service is open to whoever reaches the port, so a page in the user's own browser must not: a page
cannot choose Host, cannot hide its Origin, and cannot send application/json to a foreign origin unasked.
"""

import re
from http import HTTPStatus
from typing import Any

import numpy as np
from starlette.datastructures import Headers, MutableHeaders
from starlette.types import ASGIApp, Message, Receive, Scope, Send

from sweepmill_service.problems import Refusal, problem
from sweepmill_service.settings import LOOPBACK, ServerLimits

SECURITY_HEADERS = {
    "X-Content-Type-Options": "nosniff",
    "Content-Security-Policy": "default-src 'none'; frame-ancestors 'none'",
    "Referrer-Policy": "no-referrer",
    "Cross-Origin-Resource-Policy": "same-origin",
}
_WITH_BODY = ("POST", "PUT", "PATCH")
_JSON_STRING = re.compile(rb'"(?:[^"\\]|\\.)*"', re.DOTALL)
_STEP = np.zeros(256, np.int64)
_STEP[list(b"[{")] = 1
_STEP[list(b"]}")] = -1


class Guard:
    """Pure ASGI middleware: refuses, or passes the request on with its body read."""

    def __init__(self, app: ASGIApp, limits: ServerLimits) -> None:
        self.app = app
        self.limits = limits

    async def __call__(self, scope: Scope, receive: Receive, send: Send) -> None:
        if scope["type"] != "http":
            await self.app(scope, receive, send)
            return
        guarded = _with_headers(send)
        try:
            check_origin(Headers(scope=scope))
            receive = await self._checked_body(scope, receive)
        except Refusal as refusal:
            await problem(refusal, scope["path"])(scope, receive, guarded)
            return
        await self.app(scope, receive, guarded)

    async def _checked_body(self, scope: Scope, receive: Receive) -> Receive:
        headers = Headers(scope=scope)
        if scope["method"] not in _WITH_BODY:
            return receive
        check_content_type(headers)
        check_length(headers, self.limits.body_bytes)
        body = await read_body(receive, self.limits.body_bytes)
        check_depth(body, self.limits.json_depth)
        return _replay(body, receive)


def check_origin(headers: Headers) -> None:
    """Raises Refusal for a Host that is not loopback (a name rebound to it) or an Origin other than the service."""
    host = headers.get("host", "")
    if _name_of(host) not in LOOPBACK:
        raise Refusal(HTTPStatus.MISDIRECTED_REQUEST, f"this service answers to {', '.join(LOOPBACK)}, not to {host!r}")
    origin = headers.get("origin")
    if origin is not None and origin.partition("://")[2] != host:
        raise Refusal(HTTPStatus.FORBIDDEN, f"requests of pages from {origin} are refused")


def _name_of(authority: str) -> str:
    name = authority[: authority.index("]") + 1] if authority.startswith("[") and "]" in authority else authority
    if not name.startswith("["):
        name = name.partition(":")[0]
    return name.strip("[]").lower()


def check_content_type(headers: Headers) -> None:
    """Raises Refusal for a body that is not declared as JSON."""
    kind = headers.get("content-type", "").partition(";")[0].strip().lower()
    if kind != "application/json":
        detail = f"a body must be application/json, got {kind or 'no content type'}"
        raise Refusal(HTTPStatus.UNSUPPORTED_MEDIA_TYPE, detail, headers={"Accept": "application/json"})


def check_length(headers: Headers, limit: int) -> None:
    """Raises Refusal for a body announced as larger than ``limit`` bytes."""
    length = headers.get("content-length", "0")
    if length.isdecimal() and int(length) > limit:
        raise _too_large(limit)


async def read_body(receive: Receive, limit: int) -> bytes:
    """The whole body, however it is cut into chunks. Raises Refusal beyond ``limit`` bytes."""
    chunks: list[bytes] = []
    size, more = 0, True
    while more:
        message = await receive()
        chunks.append(message.get("body", b""))
        size += len(chunks[-1])
        if size > limit:
            raise _too_large(limit)
        more = message["type"] == "http.request" and message.get("more_body", False)
    return b"".join(chunks)


def _too_large(limit: int) -> Refusal:
    # The rest of the body is not read, so the connection cannot be used again.
    detail = f"a body may have {limit} bytes here (limits.body_bytes)"
    return Refusal(HTTPStatus.REQUEST_ENTITY_TOO_LARGE, detail, headers={"Connection": "close"})


def check_depth(body: bytes, limit: int) -> None:
    """Raises Refusal for JSON nested deeper than ``limit``, before any parser recurses into it."""
    steps = _STEP[np.frombuffer(_JSON_STRING.sub(b"", body), np.uint8)]
    if steps.size and steps.cumsum().max() > limit:
        raise Refusal(HTTPStatus.BAD_REQUEST, f"JSON may be nested {limit} deep here (limits.json_depth)")


def _replay(body: bytes, receive: Receive) -> Receive:
    """A receive that hands out the body once, then whatever comes on the connection."""
    pending: list[Message] = [{"type": "http.request", "body": body, "more_body": False}]

    async def replayed() -> Message:
        return pending.pop() if pending else await receive()

    return replayed


def _with_headers(send: Send) -> Send:
    async def sending(message: Any) -> None:
        if message["type"] == "http.response.start":
            headers = MutableHeaders(scope=message)
            for name, value in SECURITY_HEADERS.items():
                headers.setdefault(name, value)
            headers.setdefault("Cache-Control", "no-store")
        await send(message)

    return sending
