"""The event stream: current state, changes, resuming, the end. On both databases."""

import json
import threading
from collections.abc import Iterator
from contextlib import contextmanager
from typing import Any

import anyio
import httpx
import pytest
from sqlalchemy.exc import OperationalError

from support.api import Api, reading_only, sampled_by_hand, serving
from support.sweeps import small_sweep
from sweepmill.client import Client
from sweepmill.events import Event, parse_events
from sweepmill.messages import ProgressPage, SweepStatus
from sweepmill.sweep import Sweep
from sweepmill_service import events
from sweepmill_service.store import Store


@pytest.fixture
def api(database_url: str) -> Iterator[Api]:
    with serving(reading_only(database_url)) as running:
        yield running


@contextmanager
def following(api: Api, sweep: Sweep, after: str | None = None) -> Iterator[Iterator[Event]]:
    headers = {} if after is None else {"Last-Event-ID": after}
    with api.http.stream("GET", f"/v1/sweeps/{sweep.key}/events", headers=headers) as answer:
        assert answer.headers["content-type"].startswith("text/event-stream")
        yield parse_events(answer.iter_lines())


def body(event: Event) -> Any:
    return json.loads(event.data)


def ordinals(event: Event) -> list[int]:
    return [one["ordinal"] for one in body(event)["ensembles"]]


def test_the_current_state_comes_first_then_changes_then_the_end(api: Api) -> None:
    sweep = small_sweep(cap=20)
    api.submit(sweep)
    with following(api, sweep) as stream:
        first = next(stream)
        assert (first.name, ordinals(first)) == ("progress", [0, 1, 2])
        assert body(first)["status"]["state"] == "waiting"
        sampled_by_hand(api.store, sweep, 20)
        last = first
        for last in stream:
            assert int(last.id or 0) > int(first.id or 0)
    assert body(last)["status"]["state"] == "settled"
    assert int(last.id or 0) == api.store.commit_counter(sweep.key)


def test_resuming_brings_the_state_and_what_changed_since(api: Api) -> None:
    sweep = small_sweep(cap=20)
    api.submit(sweep)
    with following(api, sweep) as stream:
        seen = next(stream)
    one = Sweep.parse(sweep.normalized() | {"circuit": {**sweep.normalized()["circuit"][0], "measurement_rate": 0.4}})
    api.submit(one)
    sampled_by_hand(api.store, one, 7)
    with following(api, sweep, after=seen.id) as stream:
        resumed = next(stream)
    assert ordinals(resumed) == [2]
    assert body(resumed)["status"]["trajectories"] == 7
    with following(api, sweep, after=resumed.id) as stream:
        assert ordinals(next(stream)) == []
    for unknown in ("999999", "9" * 5000, "abc", "-1"):
        with following(api, sweep, after=unknown) as stream:
            assert ordinals(next(stream)) == [0, 1, 2]


def test_a_sweep_that_is_over_gives_one_event(api: Api) -> None:
    sweep = small_sweep(cap=10)
    api.submit(sweep)
    api.http.delete(f"/v1/sweeps/{sweep.key}")
    with following(api, sweep) as stream:
        (only,) = stream
    assert body(only)["status"]["state"] == "withdrawn"


def test_withdrawing_ends_the_stream(api: Api) -> None:
    sweep = small_sweep()
    api.submit(sweep)
    with following(api, sweep) as stream:
        next(stream)
        api.http.delete(f"/v1/sweeps/{sweep.key}")
        assert [body(event)["status"]["state"] for event in stream] == ["withdrawn"]


def test_the_client_follows_a_sweep(api: Api) -> None:
    sweep = small_sweep(cap=10)
    with Client(str(api.http.base_url), owner="local") as client:
        remote = client.submit(sweep)
        worker = threading.Thread(target=sampled_by_hand, args=(api.store, sweep, 10))
        worker.start()
        assert remote.wait(timeout=60, progress=False).state == "settled"
        worker.join()


def test_a_reader_who_reads_nothing_holds_up_nobody(api: Api) -> None:
    sweep = small_sweep(rates=400, cap=20)
    api.submit(sweep)
    with httpx.Client(base_url=api.http.base_url, trust_env=False) as idle:
        answers = [idle.stream("GET", f"/v1/sweeps/{sweep.key}/events") for _ in range(12)]
        for answer in answers:
            answer.__enter__()
        assert api.http.get(f"/v1/sweeps/{sweep.key}").status_code == 200
        with following(api, sweep) as stream:
            assert len(ordinals(next(stream))) == 400
        for answer in answers:
            answer.__exit__(None, None, None)


def test_stopping_the_service_ends_its_streams(api: Api) -> None:
    sweep = small_sweep()
    api.submit(sweep)
    with following(api, sweep) as stream:
        next(stream)
        api.runtime.stopping.set()
        assert list(stream) == []


def test_many_ensembles_come_in_pages_of_which_the_last_has_the_id(
    store: Store, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(events, "ENSEMBLES_PER_EVENT", 2)
    sweep = small_sweep(rates=5)
    store.submit(sweep, "ada")
    feed = events.Feed(store, sweep.key, None)
    parsed = list(parse_events(b"".join(feed.changes()).decode().split("\n")))
    assert [ordinals(event) for event in parsed] == [[0, 1], [2, 3], [4]]
    assert [event.id for event in parsed] == [None, None, str(store.commit_counter(sweep.key))]
    assert list(feed.changes()) == []


class Forgetful:
    """A store that answers once and then loses its database."""

    def __init__(self, store: Store) -> None:
        self.store = store
        self.answers = 0

    def commit_counter(self, key: str) -> int:
        self.answers += 1
        if self.answers > 1:
            raise OperationalError("select", {}, Exception("gone"))
        return self.store.commit_counter(key)

    def sweep_status(self, key: str) -> SweepStatus:
        return self.store.sweep_status(key)

    def progress(self, *arguments: Any) -> ProgressPage:
        return self.store.progress(*arguments)


def test_a_stream_outlives_its_database_with_heartbeats(store: Store, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(events, "HEARTBEAT_SECONDS", 0.0)
    monkeypatch.setattr(events, "POLL_SECONDS", 0.01)
    sweep = small_sweep()
    store.submit(sweep, "ada")
    feed = events.Feed(Forgetful(store), sweep.key, None)  # type: ignore[arg-type]

    async def first_pieces() -> list[bytes]:
        pieces: list[bytes] = []
        async for piece in events.stream(feed, threading.Event(), events.limiter()):
            pieces.append(piece)
            if len(pieces) == 5:
                break
        return pieces

    retry, state, *rest = anyio.run(first_pieces)
    assert retry == events.RETRY
    assert b"event: progress" in state
    assert rest == [events.HEARTBEAT] * 3
