"""Every error is a problem document (RFC 9457), whatever went wrong."""

import sqlite3
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import httpx
import pytest
from sqlalchemy import event

from support.api import Api, reading_only, sampled_by_hand, serving
from support.databases import PostgresServer
from support.specs import small
from support.sweeps import small_sweep
from sweepmill.messages import Problem
from sweepmill_service.database import open_database
from sweepmill_service.migrations import migrate
from sweepmill_service.store import Store


@pytest.fixture
def database(tmp_path: Path) -> Path:
    return tmp_path / "sweeps.sqlite"


@pytest.fixture
def api(database: Path) -> Iterator[Api]:
    with serving(reading_only(f"sqlite:///{database}")) as running:
        yield running


def problem_of(answer: httpx.Response, status: int) -> Problem:
    assert answer.status_code == status, answer.text
    assert answer.headers["content-type"] == "application/problem+json"
    assert answer.headers["cache-control"] == "no-store"
    problem = Problem.model_validate_json(answer.content)
    assert problem.status == status
    assert problem.detail
    return problem


def test_what_is_not_there_is_a_problem(api: Api) -> None:
    assert problem_of(api.http.get("/v2/sweeps"), 404).instance == "/v2/sweeps"
    refused = api.http.put("/v1/sweeps", json={})
    problem_of(refused, 405)
    assert set(refused.headers["allow"].split(", ")) <= {"GET", "POST"}
    assert "ensemble" in problem_of(api.http.get("/v1/ensembles/00000000"), 404).detail
    problem_of(api.http.get("/v1/sweeps/00000000/events"), 404)


def test_bodies_that_are_not_json_are_problems(api: Api) -> None:
    json = {"Content-Type": "application/json"}
    problem_of(api.http.post("/v1/sweeps", content=b"{", headers=json), 400)
    problem_of(api.http.post("/v1/sweeps", content=b"[1]", headers=json), 422)
    problem_of(api.http.post("/v1/sweeps", content=b"\xff\xfe", headers=json), 400)
    problem_of(api.http.post("/v1/sweeps", content=b'{"a": ' + b"9" * 5000 + b"}", headers=json), 400)
    problem_of(api.http.post("/v1/sweeps", content=b"a=1"), 415)
    problem_of(api.http.post("/v1/sweeps", data={"a": "1"}), 415)


def test_parameters_out_of_range_are_named(api: Api) -> None:
    problem = problem_of(api.http.get("/v1/sweeps", params={"limit": 0, "state": "running"}), 422)
    assert {fault["path"] for fault in problem.faults} == {"query.limit", "query.state"}


def test_no_acceptable_format_is_a_problem(api: Api) -> None:
    sweep = small_sweep()
    api.submit(sweep)
    answer = api.http.get(f"/v1/sweeps/{sweep.key}/table", headers={"Accept": "image/png"})
    assert "text/csv" in problem_of(answer, 406).detail


def test_an_ambiguous_key_lists_its_candidates(api: Api) -> None:
    sweep = small_sweep()
    api.submit(sweep)
    twin = sweep.key[:40] + ("0" if sweep.key[40] != "0" else "1") + sweep.key[41:]
    with api.store.engine.begin() as connection:
        columns = [row[1] for row in connection.exec_driver_sql("PRAGMA table_info(sweep)")]
        others = ", ".join(columns[1:])
        connection.exec_driver_sql(f"INSERT INTO sweep SELECT '{twin}', {others} FROM sweep")
    problem = problem_of(api.http.get(f"/v1/sweeps/{sweep.key[:12]}"), 409)
    assert {fault["message"] for fault in problem.faults} == {sweep.key, twin}
    assert api.http.get(f"/v1/sweeps/{sweep.key[:41]}").status_code == 200


def test_limits_are_named_with_what_would_pass(database: Path) -> None:
    with serving(reading_only(f"sqlite:///{database}", limits={"ensembles": 3, "sites": 10})) as api:
        too_many = problem_of(api.http.post("/v1/sweeps", json=small()), 422)
        assert [fault["path"] for fault in too_many.faults] == ["circuit.sites[1]", "circuit"]
        assert "at most 3 ensembles" in too_many.faults[1]["message"]
        large = problem_of(api.http.post("/v1/estimate", json=small(circuit__measurement_rate=0.1)), 422)
        assert [fault["path"] for fault in large.faults] == ["circuit.sites[1]"]


def test_a_trillion_ensembles_are_refused_without_expanding_them(api: Api) -> None:
    wide = {"from": 0.0, "to": 1.0, "points": 100_000}
    body = small(circuit__sites={"from": 2, "to": 200_000, "step": 2}, circuit__measurement_rate=wide)
    problem = problem_of(api.http.post("/v1/sweeps", json=body), 422)
    assert "10000000000" in problem.faults[1]["message"]


@pytest.mark.parametrize(
    ("changes", "path"),
    [
        ({"circuit__sites": [8, 10**30]}, "circuit.sites[1]"),
        ({"circuit__layers": 10**9}, "circuit.layers"),
        ({"circuit__layers": {"per_site": 10**18}}, "circuit.layers.per_site"),
        ({"stop__trajectories": 10**400}, "stop.trajectories"),
        ({"observe": [{"quantity": "entropy", "at": {"log_spaced": 10**9}}]}, "observe[0].at.log_spaced"),
    ],
)
def test_numbers_beyond_all_bounds_are_refused_at_once(api: Api, changes: dict[str, Any], path: str) -> None:
    problem = problem_of(api.http.post("/v1/sweeps", json=small(**changes)), 422)
    assert [fault["path"] for fault in problem.faults] == [path]


def test_a_trajectory_too_long_for_this_server_is_refused(database: Path) -> None:
    with serving(reading_only(f"sqlite:///{database}", limits={"trajectory_seconds": 1e-6})) as api:
        problem = problem_of(api.http.post("/v1/sweeps", json=small()), 422)
        assert "predicted to take" in problem.faults[0]["message"]


def test_a_locked_database_is_said_so_and_reading_goes_on(api: Api, database: Path) -> None:
    @event.listens_for(api.store.engine, "do_connect")
    def impatient(dialect: Any, record: Any, arguments: Any, options: dict[str, Any]) -> None:
        options["timeout"] = 0.1

    api.store.engine.dispose()
    other = sqlite3.connect(database, isolation_level=None)
    other.execute("BEGIN IMMEDIATE")
    answer = api.submit(small_sweep())
    assert "locked" in problem_of(answer, 503).detail
    assert int(answer.headers["retry-after"]) > 0
    assert api.http.get("/v1/sweeps").status_code == 200
    other.execute("ROLLBACK")
    other.close()
    assert api.submit(small_sweep()).status_code == 201


def test_a_full_disk_is_said_so(api: Api) -> None:
    @event.listens_for(api.store.engine, "connect")
    def small_disk(connection: Any, record: Any) -> None:
        connection.execute("PRAGMA max_page_count = 1")  # SQLite then reports the error of a full disk

    api.store.engine.dispose()
    sweep = small_sweep(rates=300)
    assert "full" in problem_of(api.submit(sweep), 503).detail
    assert api.http.get("/v1/sweeps").json()["sweeps"] == []


def test_a_failure_of_ours_shows_nothing_of_the_inside(api: Api) -> None:
    sweep = small_sweep(cap=10)
    api.submit(sweep)
    sampled_by_hand(api.store, sweep, 5)
    with api.store.engine.begin() as connection:
        connection.exec_driver_sql("UPDATE total SET accumulator = x'00'")
    problem = problem_of(api.http.get(f"/v1/sweeps/{sweep.key}/table"), 500)
    assert "struct" not in problem.detail
    assert "unpack" not in problem.model_dump_json()


def test_a_database_that_cannot_be_opened_is_the_reason_of_not_being_ready(tmp_path: Path) -> None:
    (tmp_path / "text.sqlite").write_text("this is no database, it only is a file of some length\n" * 40)
    with serving(reading_only(f"sqlite:///{tmp_path / 'text.sqlite'}")) as api:
        assert api.http.get("/healthz").json() == {"status": "ok"}
        assert "not a database" in problem_of(api.http.get("/readyz"), 503).detail
        assert "not a database" in problem_of(api.http.get("/v1/sweeps"), 503).detail


def test_a_database_of_a_later_release_is_left_alone(database: Path) -> None:
    engine = open_database(f"sqlite:///{database}")
    migrate(engine)
    with engine.begin() as connection:
        connection.exec_driver_sql("UPDATE alembic_version SET version_num = 'ffff'")
    Store(engine)
    engine.dispose()
    with serving(reading_only(f"sqlite:///{database}")) as api:
        assert "later release" in problem_of(api.http.get("/readyz"), 503).detail


def test_a_postgres_server_that_goes_away_is_said_so_and_found_again(postgres: PostgresServer) -> None:
    with postgres.database("migrated") as url, serving(reading_only(url)) as api:
        assert api.http.get("/readyz").status_code == 200
        postgres.stop()
        try:
            answer = api.http.get("/v1/sweeps")
            assert "does not answer" in problem_of(answer, 503).detail
            assert int(answer.headers["retry-after"]) > 0
            assert "database" in problem_of(api.http.get("/readyz"), 503).detail
            assert api.http.get("/healthz").status_code == 200
        finally:
            postgres.start()
        assert api.http.get("/v1/sweeps").status_code == 200
        assert api.http.get("/readyz").status_code == 200


def test_a_batch_too_large_for_a_worker_is_refused(database: Path) -> None:
    with serving(reading_only(f"sqlite:///{database}", limits={"worker_bytes": 2**26})) as api:
        every = {"average_over": {"last": 1, "every": 2}}
        circuit = {"circuit__sites": 512, "circuit__layers": 20_000, "circuit__measurement_rate": 0.1}
        cuts = [{"quantity": "entropy", "region": "every-cut", "at": every}]
        problem = problem_of(api.http.post("/v1/sweeps", json=small(**circuit, observe=cuts)), 422)
        assert [fault["path"] for fault in problem.faults] == ["observe"]
        assert "67108864" in problem.faults[0]["message"]


def test_what_no_engine_takes_is_refused_with_what_would_pass(database: Path) -> None:
    with serving(reading_only(f"sqlite:///{database}", limits={"sites": 4096})) as api:
        crowded = {"circuit__sites": 4096, "circuit__references": 8, "circuit__layers": 2}
        problem = problem_of(api.http.post("/v1/sweeps", json=small(**crowded, observe=[{"quantity": "entropy"}])), 422)
        assert problem.faults == [{"path": "circuit", "message": "sites: at most 4088 beside 8 references, got 4096"}]
