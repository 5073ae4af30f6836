"""Server-sent events as WHATWG HTML describes them, and following a sweep through interruptions."""

import json
from collections.abc import Iterator

import httpx
import pytest

from sweepmill import Retry, SweepStuck, SweepWithdrawn, UnknownKey, Unreachable, WaitTimeout
from sweepmill.connection import connection
from sweepmill.events import Event, parse_events
from sweepmill.follow import FRUITLESS, SILENCE, Deadline, Follower
from sweepmill.transport import Transport

KEY = "3b9f6c1e" * 8


def test_examples_of_the_format_description_are_read() -> None:
    """The examples at the end of the section "Interpreting an event stream" (from memory)."""
    assert list(parse_events(["data: YHOO", "data: +2", "data: 10", ""])) == [Event(None, "message", "YHOO\n+2\n10")]
    stream = [": test stream", "", "data: first event", "id: 1", "", "data:second event", "id", "", "data:  third", ""]
    assert list(parse_events(stream)) == [
        Event("1", "message", "first event"),
        Event("", "message", "second event"),
        Event("", "message", " third"),
    ]
    assert [e.data for e in parse_events(["data", "", "data", "data", "", "data:"])] == ["", "\n"]
    assert [e.data for e in parse_events(["data:test", "", "data: test", ""])] == ["test", "test"]


def test_an_event_without_an_id_keeps_the_last_one() -> None:
    events = list(parse_events(["id: 7", "event: progress", "data: a", "", "data: b", ""]))
    assert events == [Event("7", "progress", "a"), Event("7", "message", "b")]


def status(state: str, commit: int, reason: str | None = None) -> dict[str, object]:
    return {
        "key": KEY,
        "state": state,
        "reason": reason,
        "families": ["hybrid-clifford"],
        "axes": [],
        "names": ["entropy"],
        "requests": [],
        "ensembles": 4,
        "settled": commit,
        "trajectories": 100 * commit,
        "trajectories_cap": 400,
        "core_seconds": 0.0,
        "created_at": 0.0,
        "commit": commit,
    }


class Cut(httpx.SyncByteStream):
    """A body that breaks off after its parts, as a lost connection does."""

    def __init__(self, *parts: str) -> None:
        self.parts = parts

    def __iter__(self) -> Iterator[bytes]:
        for part in self.parts:
            yield part.encode()
        raise httpx.ReadError("connection lost")


def event(state: str, commit: int) -> str:
    return f"id: {commit}\nevent: progress\ndata: {json.dumps({'status': status(state, commit), 'ensembles': []})}\n\n"


class Service:
    """Answers questions for the status and streams from two lists; an exception among them is raised."""

    def __init__(self, statuses: list[object], streams: list[object]) -> None:
        self.statuses, self.streams = statuses, streams
        self.stream_requests: list[httpx.Request] = []

    def __call__(self, request: httpx.Request) -> httpx.Response:
        streaming = request.url.path.endswith("/events")
        if streaming:
            self.stream_requests.append(request)
        answer = (self.streams if streaming else self.statuses).pop(0)
        if isinstance(answer, Exception):
            raise answer
        return answer if isinstance(answer, httpx.Response) else httpx.Response(200, json=answer)

    def follower(self, timeout: float | None = None, patience: float = 600.0) -> Follower:
        transport = Transport(connection("http://a.example"), 5.0, Retry(attempts=1), httpx.MockTransport(self))
        return Follower(transport, KEY, Deadline(KEY, timeout), patience, sleep=lambda seconds: None)


def test_statuses_come_from_the_stream() -> None:
    body = ": still here\n\n" + event("sampling", 1) + event("settled", 4)
    service = Service([status("waiting", 0)], [httpx.Response(200, text=body)])
    assert [s.commit for s in service.follower().statuses()] == [0, 1, 4]


def test_a_lost_stream_is_resumed_from_the_last_event() -> None:
    lost = httpx.Response(200, stream=Cut(event("sampling", 1), event("sampling", 2), "id: 3\ndata: {"))
    service = Service(
        [status("waiting", 0), status("sampling", 3)], [lost, httpx.Response(200, text=event("settled", 4))]
    )
    assert [s.commit for s in service.follower().statuses()] == [0, 1, 2, 3, 4]
    assert [r.headers.get("Last-Event-ID") for r in service.stream_requests] == [None, "2"]


def test_a_service_that_restarts_is_waited_for() -> None:
    gone: list[object] = [httpx.ConnectError("refused"), httpx.Response(503, text="")]
    service = Service([status("sampling", 1), *gone, status("settled", 4)], [httpx.ReadError("lost")])
    assert [s.state for s in service.follower().statuses()] == ["sampling", "settled"]


def test_patience_with_an_unreachable_service_ends() -> None:
    service = Service([httpx.ConnectError("refused")], [])
    with pytest.raises(Unreachable):
        list(service.follower(patience=-1.0).statuses())


def test_asking_takes_over_where_streams_bring_nothing() -> None:
    questions: list[object] = [status("sampling", n) for n in range(FRUITLESS + 2)]
    streams: list[object] = [httpx.Response(404, json={"title": "", "status": 404, "detail": ""})] * FRUITLESS
    service = Service([*questions, status("settled", 9)], streams)
    assert [s.commit for s in service.follower().statuses()][-1] == 9
    assert len(service.stream_requests) == FRUITLESS


def test_a_stuck_sweep_is_raised_with_its_reason() -> None:
    service = Service([status("stuck", 1, "budget of 10 core-seconds spent")], [])
    with pytest.raises(SweepStuck, match="budget of 10 core-seconds spent"):
        list(service.follower().statuses())


def test_a_withdrawn_sweep_will_not_settle() -> None:
    service = Service([status("sampling", 1)], [httpx.Response(200, text=event("withdrawn", 2))])
    with pytest.raises(SweepWithdrawn):
        list(service.follower().statuses())


def test_waiting_ends_at_its_deadline() -> None:
    service = Service([status("sampling", 1)] * 100_000, [])
    with pytest.raises(WaitTimeout, match=r"within 0\.05 s"):
        list(service.follower(timeout=0.05).statuses())


def test_a_stream_of_heartbeats_is_left_before_it_outlasts_the_deadline() -> None:
    class Heartbeats(httpx.SyncByteStream):
        def __iter__(self) -> Iterator[bytes]:
            while True:
                yield b": still here\n\n"

    service = Service([status("sampling", 1), status("settled", 4)], [httpx.Response(200, stream=Heartbeats())])
    assert [s.commit for s in service.follower(timeout=SILENCE + 0.05).statuses()] == [1, 4]
    assert len(service.stream_requests) == 1


def test_a_refusal_is_raised_and_not_waited_out() -> None:
    service = Service([httpx.Response(404, json={"title": "", "status": 404, "detail": "no such sweep"})], [])
    with pytest.raises(UnknownKey, match="no such sweep"):
        list(service.follower().statuses())
