"""The client against a real service."""

from collections.abc import Callable, Iterator
from concurrent.futures import ThreadPoolExecutor
from itertools import count
from pathlib import Path
from queue import Queue
from typing import Any

import httpx
import pytest

from support.services import service
from sweepmill import (
    Client,
    RemoteSweep,
    Retry,
    SpecificationError,
    Sweep,
    SweepStuck,
    SweepWithdrawn,
    Table,
    UnknownKey,
    Unreachable,
    WaitTimeout,
)
from sweepmill.messages import SweepStatus

WAIT = 120.0
_replicates = count(1000)


def specification(**stop: Any) -> dict[str, Any]:
    """A small sweep whose ensembles no other test has."""
    return {
        "circuit": {
            "family": "hybrid-clifford",
            "sites": [4, 8],
            "measurement_rate": [0.1, 0.2],
            "layers": 8,
            "replicate": next(_replicates),
        },
        "observe": [
            {"quantity": "entropy", "histogram": True},
            {"quantity": "entropy", "name": "series", "at": [2, 4, 8]},
            {"quantity": "outcome-randomness"},
        ],
        "stop": {"trajectories": 60, **stop},
    }


def small() -> Sweep:
    return Sweep.parse(specification())


def endless() -> Sweep:
    """A sweep that will not settle while a test looks."""
    return Sweep.parse(specification(trajectories=9_000_000))


@pytest.fixture
def client(service_url: str) -> Iterator[Client]:
    with Client(service_url, owner="mara") as client:
        yield client


@pytest.fixture(scope="module")
def settled(service_url: str) -> Iterator[RemoteSweep]:
    """A sweep that has settled."""
    with Client(service_url, owner="mara") as client:
        sweep = client.submit(small())
        sweep.wait(progress=False, timeout=WAIT)
        yield sweep


def test_submitting_twice_joins_and_the_key_is_the_local_one(client: Client) -> None:
    sweep = small()
    first, again = client.submit(sweep), client.submit(sweep)
    assert first.key == again.key == sweep.key
    assert first.submitted is not None
    assert first.submitted.created
    assert again.submitted is not None
    assert not again.submitted.created
    assert client.sweep(sweep.key[:12].upper()).key == sweep.key


def test_label_and_priority_travel_with_the_request_and_not_with_the_sweep(client: Client, service_url: str) -> None:
    body = specification()
    plain, labelled = Sweep.parse(body), Sweep.parse(body | {"label": "mine", "priority": 3})
    client.submit(plain)
    with Client(service_url, owner="jon") as other:
        status = other.submit(labelled).status()
    assert status.key == plain.key
    assert {r.owner: (r.label, r.priority) for r in status.requests} == {"mara": (None, 0), "jon": ("mine", 3)}


def test_an_estimate_stores_nothing(client: Client) -> None:
    sweep = small()
    estimate = client.estimate(sweep)
    assert (estimate.key, estimate.ensembles, estimate.trajectories_cap) == (sweep.key, 4, 240)
    with pytest.raises(UnknownKey):
        client.sweep(sweep.key)


def test_limits_of_the_server_refuse_a_sweep_with_every_fault(client: Client) -> None:
    body = specification()
    body["circuit"] |= {"sites": [8, 4096], "layers": 200_000}
    for ask in (client.submit, client.estimate):
        with pytest.raises(SpecificationError) as caught:
            ask(Sweep.parse(body))
        assert len(caught.value.faults) >= 2
        assert all(fault.path and fault.message for fault in caught.value.faults)


def test_sweeps_are_listed_over_pages_newest_first(service_url: str) -> None:
    with Client(service_url, owner="lister") as client:
        keys = [client.submit(small()).key for _ in range(3)]
        assert [status.key for status in client.sweeps(owner="lister", page=1)] == keys[::-1]
        assert list(client.sweeps(owner="lister", family="no-such-family")) == []


def test_requests_are_amended(client: Client) -> None:
    sweep = client.submit(endless())
    own = sweep.amend(label="α", priority=-3).requests[0]
    assert (own.label, own.priority) == ("α", -3)
    assert sweep.amend(priority=0).requests[0].label == "α"
    assert sweep.amend(label="").requests[0].label is None
    sweep.withdraw()


def test_withdrawing_and_submitting_again_restores(client: Client, service_url: str) -> None:
    specification = endless()
    sweep = client.submit(specification)
    with Client(service_url, owner="stranger") as other, pytest.raises(UnknownKey, match="stranger"):
        other.sweep(sweep.key).withdraw()
    assert sweep.withdraw().state == "withdrawn"
    with pytest.raises(SweepWithdrawn):
        sweep.wait(progress=False, timeout=WAIT)
    assert client.submit(specification).status().state in ("waiting", "sampling")
    sweep.withdraw()


class LosesAnswers(httpx.BaseTransport):
    """Delivers every request, and loses the answer to the first one of a method."""

    def __init__(self, method: str) -> None:
        self.method = method
        self.inner = httpx.HTTPTransport()

    def handle_request(self, request: httpx.Request) -> httpx.Response:
        response = self.inner.handle_request(request)
        if request.method != self.method:
            return response
        self.method = ""
        response.close()
        raise httpx.ReadError("connection lost")

    def close(self) -> None:
        self.inner.close()


@pytest.mark.parametrize(
    ("method", "act"),
    [
        ("POST", lambda sweep: sweep.status()),
        ("PATCH", lambda sweep: sweep.amend(priority=1)),
        ("DELETE", RemoteSweep.withdraw),
    ],
)
def test_a_lost_answer_is_asked_for_again(
    service_url: str, method: str, act: Callable[[RemoteSweep], SweepStatus]
) -> None:
    with Client(service_url, owner="mara", transport=LosesAnswers(method)) as client:
        sweep = client.submit(endless())
        assert act(sweep).key == sweep.key
        if method != "DELETE":
            assert [r.owner for r in sweep.status().requests] == ["mara"]
            sweep.withdraw()
        assert sweep.status().state == "withdrawn"


def test_waiting_shows_progress_up_to_settled(client: Client) -> None:
    seen: list[SweepStatus] = []
    sweep = client.submit(small())
    last = sweep.wait(progress=seen.append, timeout=WAIT)
    assert last == seen[-1]
    assert (last.state, last.settled, last.trajectories) == ("settled", 4, 240)
    assert [s.commit for s in seen] == sorted(s.commit for s in seen)


def test_waiting_ends_at_its_timeout_and_the_sweep_goes_on(client: Client) -> None:
    sweep = client.submit(endless())
    with pytest.raises(WaitTimeout, match="goes on"):
        sweep.wait(progress=False, timeout=0.2)
    assert sweep.withdraw().state == "withdrawn"


def test_a_sweep_whose_budget_is_spent_is_stuck_and_says_so(client: Client) -> None:
    body = specification(trajectories=9_000_000, budget=0.01)
    with pytest.raises(SweepStuck, match="budget"):
        client.submit(Sweep.parse(body)).wait(progress=False, timeout=WAIT)


def test_waiting_outlives_a_restart_of_the_service(tmp_path: Path) -> None:
    seen: Queue[SweepStatus] = Queue()

    def watch(url: str, key: str) -> None:
        with Client(url) as client:
            client.sweep(key).wait(seen.put, timeout=WAIT)

    database = f"sqlite:///{tmp_path / 'service.sqlite'}"
    with ThreadPoolExecutor(1) as threads:
        with service(database, "--no-dispatch") as first, Client(first.url) as client:
            url = first.url
            key = client.submit(endless()).key
            watching = threads.submit(watch, url, key)
            assert seen.get(timeout=WAIT).state == "waiting"
        port = str(httpx.URL(url).port)
        with service(database, "--no-dispatch", "--port", port), Client(url) as client:
            assert not watching.done()
            client.sweep(key).withdraw()
            with pytest.raises(SweepWithdrawn):
                watching.result(WAIT)


def test_the_table_has_one_row_per_ensemble_observation_and_coordinate(settled: RemoteSweep) -> None:
    table = settled.table()
    assert table.axes == ("sites", "measurement_rate")
    assert len(table) == 4 * (1 + 3 + 1)
    assert set(table["trajectories"]) == {60}
    assert set(table["met_by"]) == {"cap"}
    assert table.where(name="series")["layer"].tolist() == [2, 4, 8] * 4
    assert (table["standard_error"] > 0).all()
    assert len(table.ensembles) == 4
    assert table.to_xarray()["series"]["mean"].shape == (2, 2, 3)


def test_histograms_hold_every_trajectory(settled: RemoteSweep) -> None:
    histograms = settled.histograms()
    assert set(histograms["name"]) == {"entropy"}
    for ensemble in histograms.ensembles:
        began, ended = ensemble["rows"]
        assert histograms["occurrences"][began:ended].sum() % 60 == 0  # one reading for each layer of the last cell


def test_progress_of_ensembles_is_in_table_order(settled: RemoteSweep) -> None:
    progress = list(settled.ensembles())
    assert [one.ordinal for one in progress] == [0, 1, 2, 3]
    assert [one.ensemble for one in progress] == [one["key"] for one in settled.table().ensembles]
    assert list(settled.ensembles(since=settled.status().commit)) == []


def test_an_ensemble_and_its_trajectories_can_be_looked_at(client: Client, settled: RemoteSweep) -> None:
    key = settled.table().ensembles[0]["key"]
    record = client.ensemble(key[:10])
    assert record.parameters["sites"] == 4
    assert {one.trajectories for one in record.observations} == {60}
    trajectory = client.trajectory(key, 59)
    assert (trajectory.ensemble, trajectory.trajectory) == (key, 59)
    assert len(trajectory.observations) == 3


@pytest.mark.parametrize("suffix", ["json", "csv", "arrow", "parquet"])
def test_downloads_hold_the_same_table(settled: RemoteSweep, tmp_path: Path, suffix: str) -> None:
    path = settled.download(tmp_path / f"table.{suffix}")
    assert [file.name for file in tmp_path.iterdir()] == [path.name]
    read, table = Table.read(path), settled.table()
    assert read.columns == table.columns
    assert read["mean"].tolist() == table["mean"].tolist()
    assert read["layer"].tolist() == table["layer"].tolist()
    assert suffix == "csv" or read.metadata == table.metadata


class BreaksBodies(httpx.BaseTransport):
    """Breaks every body of a table off in its middle."""

    def __init__(self) -> None:
        self.inner = httpx.HTTPTransport()

    def handle_request(self, request: httpx.Request) -> httpx.Response:
        response = self.inner.handle_request(request)
        if not request.url.path.endswith("/table"):
            return response
        body = response.read()
        response.close()
        return httpx.Response(200, stream=Half(body))

    def close(self) -> None:
        self.inner.close()


class Half(httpx.SyncByteStream):
    def __init__(self, body: bytes) -> None:
        self.body = body

    def __iter__(self) -> Iterator[bytes]:
        yield self.body[: len(self.body) // 2]
        raise httpx.ReadError("connection lost")


def test_a_download_that_breaks_off_leaves_the_file_as_it_was(
    service_url: str, settled: RemoteSweep, tmp_path: Path
) -> None:
    path = tmp_path / "table.csv"
    path.write_text("as it was")
    with Client(service_url, transport=BreaksBodies(), retry=Retry(attempts=2, first=0.0)) as client:
        sweep = client.sweep(settled.key)
        with pytest.raises(Unreachable):
            sweep.download(path)
    assert path.read_text() == "as it was"
    assert list(tmp_path.iterdir()) == [path]


def test_pool_and_health_are_read(client: Client) -> None:
    assert client.health()
    pool = client.pool()
    assert pool.ready
    assert pool.cores == 1
