"""Retries and the translation of failures, on a transport without a network."""

import inspect
from collections.abc import Callable
from datetime import UTC, datetime

import httpx
import pytest

from support.specs import small
from sweepmill import Client, Retry, Sweep, errors
from sweepmill.failures import HTTPX_FAILURES, HTTPX_ROOTS, translated
from sweepmill.revisions import all_revisions

FAST = Retry(attempts=3, first=0.0, obeyed=0.0)
KEY = "5a0c77d2"
POOL = {
    "ready": True,
    "workers": [],
    "cores": 2,
    "in_flight": 0,
    "window": 4,
    "batches_committed": 7,
    "trajectories_per_second": 0.0,
    "busy_fraction": 0.0,
}
Answer = httpx.Response | Exception


def client_of(*answers: Answer, calls: list[httpx.Request] | None = None, retry: Retry = FAST) -> Client:
    """A client whose service gives these answers, one after the other, and the last one for ever."""
    remaining = list(answers)

    def handle(request: httpx.Request) -> httpx.Response:
        if calls is not None:
            calls.append(request)
        answer = remaining.pop(0) if len(remaining) > 1 else remaining[0]
        if isinstance(answer, Exception):
            raise answer
        return answer

    return Client("http://service.example:1", retry=retry, transport=httpx.MockTransport(handle))


def problem(status: int, detail: str = "no", **more: object) -> httpx.Response:
    return httpx.Response(status, json={"title": "t", "status": status, "detail": detail, **more})


def httpx_errors() -> list[type[Exception]]:
    """Every exception class of httpx that has no subclasses."""

    def leaves(kind: type[Exception]) -> list[type[Exception]]:
        below = kind.__subclasses__()
        return [leaf for sub in below for leaf in leaves(sub)] if below else [kind]

    public = [v for v in vars(httpx).values() if inspect.isclass(v) and issubclass(v, Exception)]
    roots = [kind for kind in public if not any(issubclass(kind, other) and kind != other for other in public)]
    assert set(roots) == set(HTTPX_ROOTS)
    return [leaf for root in roots for leaf in leaves(root)]


def instance(kind: type[Exception]) -> Exception:
    """An instance without knowing its constructor."""
    return kind.__new__(kind)


@pytest.mark.parametrize("kind", httpx_errors())
def test_every_exception_of_httpx_is_translated_by_a_rule_of_its_own(kind: type[Exception]) -> None:
    assert any(base in HTTPX_FAILURES for base in kind.__mro__), f"{kind.__name__} has no rule"
    error = translated(instance(kind), "http://service.example")
    assert isinstance(error, errors.SweepmillError)
    assert "http://service.example" in str(error)


def test_an_unreachable_service_is_named_with_what_to_do() -> None:
    with pytest.raises(errors.Unreachable, match=r"http://service\.example:1 .*is `sweepmill serve` running"):
        client_of(httpx.ConnectError("refused")).pool()


@pytest.mark.parametrize(
    "failure",
    [
        httpx.ConnectError("x"),
        httpx.ReadError("x"),
        httpx.RemoteProtocolError("x"),
        problem(502),
        problem(503),
        problem(504),
    ],
)
def test_a_passing_failure_is_tried_again(failure: Answer) -> None:
    calls: list[httpx.Request] = []
    assert client_of(failure, failure, httpx.Response(200, json=POOL), calls=calls).pool().cores == 2
    assert len(calls) == 3


def test_attempts_are_limited() -> None:
    calls: list[httpx.Request] = []
    with pytest.raises(errors.Unavailable, match="the database is full"):
        client_of(problem(503, "the database is full"), calls=calls).pool()
    assert len(calls) == FAST.attempts


@pytest.mark.parametrize(
    ("failure", "expected"),
    [
        (problem(401), errors.NotAllowed),
        (problem(403), errors.NotAllowed),
        (problem(404), errors.UnknownKey),
        (problem(409), errors.AmbiguousKey),
        (problem(500), errors.ServiceError),
        (httpx.Response(500, text="<html>"), errors.UnexpectedAnswer),
        (httpx.Response(200, text="<html>"), errors.UnexpectedAnswer),
        (httpx.Response(302, headers={"Location": "http://elsewhere.example"}), errors.UnexpectedAnswer),
        (httpx.ReadTimeout("slow"), errors.TimedOut),
    ],
)
def test_a_lasting_failure_is_raised_at_once(failure: Answer, expected: type[Exception]) -> None:
    calls: list[httpx.Request] = []
    with pytest.raises(expected) as caught:
        client_of(failure, calls=calls).ensemble(KEY)
    assert type(caught.value) is expected
    assert len(calls) == 1


def test_faults_of_a_refusal_are_listed_with_their_paths() -> None:
    answer = problem(422, "refused", faults=[{"path": "body.priority", "message": "is null"}])
    with pytest.raises(errors.ServiceError) as caught:
        client_of(answer).sweep(KEY)
    assert caught.value.faults == (errors.Fault("body.priority", "is null"),)
    assert str(caught.value) == "refused\nbody.priority: is null"


def test_the_advice_of_retry_after_is_followed_up_to_a_limit() -> None:
    slept: list[float] = []
    failures = [errors.Unavailable(503, "", retry_after=7.0), errors.Unavailable(503, "", retry_after=1e9)]

    def action() -> str:
        if failures:
            raise failures.pop(0)
        return "done"

    assert Retry(first=0.1, obeyed=60.0).run(action, slept.append) == "done"
    assert slept == [7.0, 60.0]


def test_pauses_grow_and_are_capped() -> None:
    pauses = list(Retry(attempts=8, first=1.0, longest=10.0).pauses())
    assert len(pauses) == 7
    for n, pause in enumerate(pauses):
        assert min(10.0, 2.0**n) / 2 <= pause <= min(10.0, 2.0**n)


def test_retry_after_reads_seconds_and_dates() -> None:
    from sweepmill.retry import retry_after

    now = datetime(2030, 1, 1, 12, 0, 0, tzinfo=UTC)
    assert retry_after(None) is None
    assert retry_after("120") == 120.0
    assert retry_after("Tue, 01 Jan 2030 12:00:30 GMT", now) == 30.0
    assert retry_after("Tue, 01 Jan 2030 11:00:00 GMT", now) == 0.0
    assert retry_after("soon", now) is None


@pytest.mark.parametrize("key", ["", "short", "5a0c77d2/../pool", "g" * 64, "a" * 65])
def test_what_is_no_key_is_not_asked_for(key: str) -> None:
    calls: list[httpx.Request] = []
    client = client_of(problem(404), calls=calls)
    asks: list[Callable[[str], object]] = [client.sweep, client.ensemble, lambda k: client.trajectory(k, 0)]
    for ask in asks:
        with pytest.raises(errors.NotAKey):
            ask(key)
    assert not calls


def test_requests_carry_owner_and_token_and_the_token_is_not_shown() -> None:
    calls: list[httpx.Request] = []

    def handle(request: httpx.Request) -> httpx.Response:
        calls.append(request)
        return httpx.Response(200, json=POOL)

    with Client(
        "http://service.example", token="s3cret", owner="mara", transport=httpx.MockTransport(handle)
    ) as client:
        client.pool()
        assert "s3cret" not in repr(client._transport.connection)
    assert calls[0].headers["Authorization"] == "Bearer s3cret"
    assert calls[0].headers["Sweepmill-Owner"] == "mara"


def test_another_key_than_the_local_one_is_reported_with_the_revisions_that_differ() -> None:
    sweep = Sweep.parse(small())
    status = {
        "key": "c" * 64,
        "state": "waiting",
        "families": [],
        "axes": [],
        "names": [],
        "requests": [],
        "ensembles": 4,
        "settled": 0,
        "trajectories": 0,
        "trajectories_cap": 1200,
        "core_seconds": 0.0,
        "created_at": 0.0,
        "commit": 0,
    }
    answer = {
        "key": "c" * 64,
        "created": True,
        "status": status,
        "sampled_ensembles": 0,
        "sampled_trajectories": 0,
        "revisions": all_revisions() | {"quantity:entropy": 7},
    }
    with pytest.raises(errors.KeyMismatch, match="quantity:entropy is 1 here and 7 there") as caught:
        client_of(httpx.Response(201, json=answer)).submit(sweep)
    assert (caught.value.local, caught.value.remote) == (sweep.key, "c" * 64)
