"""Translates what goes wrong on the way to the service into the errors of this package."""

from collections.abc import Iterator
from contextlib import contextmanager

import httpx
from pydantic import ValidationError

from sweepmill import errors
from sweepmill.messages import Problem
from sweepmill.retry import retry_after

# HTTPError, RequestError and TransportError are left out: a new kind of failure directly below them is
# to be noticed (a test walks them) and judged, not swept along.
Kind = type[errors.Unreachable | errors.TimedOut | errors.UnexpectedAnswer]
HTTPX_FAILURES: dict[type[Exception], Kind] = {
    httpx.ConnectTimeout: errors.Unreachable,
    httpx.NetworkError: errors.Unreachable,
    httpx.ProxyError: errors.Unreachable,
    httpx.RemoteProtocolError: errors.Unreachable,  # among others: the service closed without an answer
    httpx.TimeoutException: errors.TimedOut,  # asking a slow service again would only add to its load
    httpx.LocalProtocolError: errors.UnexpectedAnswer,
    httpx.UnsupportedProtocol: errors.UnexpectedAnswer,
    httpx.DecodingError: errors.UnexpectedAnswer,
    httpx.TooManyRedirects: errors.UnexpectedAnswer,
    httpx.HTTPStatusError: errors.UnexpectedAnswer,
    httpx.InvalidURL: errors.UnexpectedAnswer,
    httpx.CookieConflict: errors.UnexpectedAnswer,
    httpx.StreamError: errors.UnexpectedAnswer,
}
HTTPX_ROOTS = (httpx.HTTPError, httpx.InvalidURL, httpx.CookieConflict, httpx.StreamError)

_STATUS_ERRORS: dict[int, type[errors.ServiceError]] = {
    401: errors.NotAllowed,
    403: errors.NotAllowed,
    404: errors.UnknownKey,
    409: errors.AmbiguousKey,
}
_TEMPORARY = (502, 503, 504)


def translated(error: Exception, url: str) -> errors.SweepmillError:
    """The error of this package for an httpx exception."""
    kinds = (HTTPX_FAILURES[base] for base in type(error).__mro__ if base in HTTPX_FAILURES)
    reason = str(error) or type(error).__name__
    return next(kinds, errors.UnexpectedAnswer)(url, reason)


@contextmanager
def translating(url: str) -> Iterator[None]:
    """Raise the errors of this package in place of those of httpx."""
    try:
        yield
    except HTTPX_ROOTS as error:
        raise translated(error, url) from error


def refusal(response: httpx.Response, url: str) -> errors.SweepmillError:
    """The error for a response that is not a success; its body has been read."""
    status = response.status_code
    problem = _problem(response)
    if status in _TEMPORARY:
        detail = problem.detail if problem else f"the service at {url} is not available ({status})"
        advice = retry_after(response.headers.get("Retry-After"))
        return errors.Unavailable(status, "unavailable", detail, advice)
    if problem is None:
        return errors.UnexpectedAnswer(url, f"status {status} without a problem document")
    faults = [errors.Fault(fault.get("path", ""), fault.get("message", "")) for fault in problem.faults]
    return _STATUS_ERRORS.get(status, errors.ServiceError)(status, problem.title, problem.detail, faults)


def _problem(response: httpx.Response) -> Problem | None:
    try:
        return Problem.model_validate_json(response.content)
    except ValidationError:
        return None
