"""Interrupted work: SIGKILL for the service and for a worker, and nothing is lost, doubled or changed."""

import sqlite3
from pathlib import Path
from typing import Any, NamedTuple

import psutil
import pytest

from support.databases import PostgresServer
from support.services import Service, service, until
from sweepmill import Client, Sweep

WORKERS, WINDOW_PER_THREAD = 2, 2
SETTINGS = {
    "workers": str(WORKERS),
    "batch_seconds": "0.25",
    "first_batch_seconds": "0.1",
    "window_per_thread": str(WINDOW_PER_THREAD),
}
SWEEP: dict[str, Any] = {
    "circuit": {
        "family": "hybrid-clifford",
        "sites": [64, 96],
        "measurement_rate": [0.12, 0.16, 0.2],
        "layers": {"per_site": 4},
    },
    "observe": [
        {"quantity": "entropy", "region": "every-cut", "histogram": False},
        {"name": "i3", "quantity": "tripartite-information", "histogram": True, "keep_values": True},
        {"quantity": "outcome-randomness"},
    ],
    "stop": {"trajectories": 3000, "at_least": 200, "standard_error": {"of": "i3", "below": 0.016}},
}


class Result(NamedTuple):
    """The table as a file, what it rests on (keys, ranges of trajectories, digests), and kept values as a file."""

    table: bytes
    ensembles: list[dict[str, Any]]
    values: bytes


def result(url: str, key: str, directory: Path) -> Result:
    with Client(url) as client:
        remote = client.sweep(key)
        path = remote.download(directory / "table.csv")
        values = remote.download_values(directory / "values.arrow", "i3")
        return Result(path.read_bytes(), remote.table().ensembles, values.read_bytes())


def range_of(ensemble: dict[str, Any]) -> int:
    """Trajectories that an ensemble settled with."""
    (number,) = {total["trajectories"][1] for total in ensemble["observations"].values()}
    return int(number)


def committed(url: str, key: str) -> int:
    with Client(url) as client:
        return client.sweep(key).status().trajectories


def settle(url: str, key: str) -> None:
    with Client(url) as client:
        assert client.sweep(key).wait(progress=False, timeout=200).state == "settled"


def wait_for_progress(url: str, key: str, more: int) -> None:
    reached = committed(url, key) + more
    until(lambda: committed(url, key) >= reached, f"{reached} trajectories")


def kill_and_see_every_process_gone(running: Service) -> None:
    family = running.kill()
    assert len(family) >= WORKERS
    _, alive = psutil.wait_procs(family, timeout=15)
    assert not alive, f"outlived their service: {alive}"


@pytest.fixture(scope="module")
def undisturbed(tmp_path_factory: pytest.TempPathFactory) -> Result:
    """The same sweep on one worker, with batches of another size, never interrupted."""
    directory = tmp_path_factory.mktemp("undisturbed")
    with service(f"sqlite:///{directory / 'a.sqlite'}", workers="1", batch_seconds="1.5") as running:
        with Client(running.url) as client:
            key = client.submit(Sweep.parse(SWEEP)).key
        settle(running.url, key)
        return result(running.url, key, directory)


def interrupt(database: str, directory: Path) -> Result:
    """Kill the service twice and a worker once; then let the sweep settle."""
    first = Service(database, **SETTINGS)
    with Client(first.url) as client:
        key = client.submit(Sweep.parse(SWEEP)).key
    wait_for_progress(first.url, key, 500)
    kill_and_see_every_process_gone(first)

    second = Service(database, **SETTINGS)
    wait_for_progress(second.url, key, 500)
    second.workers()[0].kill()
    wait_for_progress(second.url, key, 800)
    kill_and_see_every_process_gone(second)

    with service(database, **SETTINGS) as third:
        settle(third.url, key)
        return result(third.url, key, directory)


def test_a_sweep_killed_three_times_gives_the_undisturbed_table_and_values_bit_for_bit(
    undisturbed: Result, tmp_path: Path
) -> None:
    file = tmp_path / "b.sqlite"
    assert interrupt(f"sqlite:///{file}", tmp_path) == undisturbed
    assert len(undisturbed.values) > 8 * sum(range_of(one) for one in undisturbed.ensembles)
    with sqlite3.connect(file) as connection:
        (starts,) = connection.execute("SELECT count(*) FROM start").fetchone()
        (commits,) = connection.execute(
            'SELECT count(*) FROM (SELECT DISTINCT ensemble, "first" FROM batch)'
        ).fetchone()
    connection.close()
    kills, window = 3, WORKERS * WINDOW_PER_THREAD
    assert 0 <= starts - commits <= window * kills


def test_the_same_holds_on_postgres(undisturbed: Result, postgres_server: PostgresServer, tmp_path: Path) -> None:
    with postgres_server.database() as url:
        assert interrupt(url, tmp_path) == undisturbed
