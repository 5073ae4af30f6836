"""What a web page, or anybody who reaches the port, can not do."""

import socket
from collections.abc import Iterator

import pytest

from support.api import Api, reading_only, serving
from support.specs import small
from sweepmill_service.guard import check_depth
from sweepmill_service.problems import Refusal

LIMIT = 2000


@pytest.fixture(scope="module")
def api(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Api]:
    file = tmp_path_factory.mktemp("guard") / "a.sqlite"
    settings = reading_only(f"sqlite:///{file}", limits={"body_bytes": LIMIT, "json_depth": 8})
    with serving(settings) as running:
        yield running


@pytest.mark.parametrize("host", ["localhost", "127.0.0.1:8765", "LOCALHOST:1", "[::1]", "[::1]:9"])
def test_the_names_of_this_machine_are_answered(api: Api, host: str) -> None:
    assert api.http.get("/healthz", headers={"Host": host}).status_code == 200


@pytest.mark.parametrize(
    "host", ["attacker.example", "127.0.0.1.attacker.example", "localhost.example:80", "[::2]", ""]
)
def test_other_names_are_refused_even_if_they_resolve_to_this_machine(api: Api, host: str) -> None:
    answer = api.http.get("/healthz", headers={"Host": host})
    assert answer.status_code == 421
    assert answer.headers["content-type"] == "application/problem+json"


@pytest.mark.parametrize("origin", ["http://attacker.example", "null", "http://localhost:1", "http://127.0.0.1"])
def test_pages_of_other_origins_are_refused(api: Api, origin: str) -> None:
    assert api.http.get("/v1/sweeps", headers={"Origin": origin}).status_code == 403
    assert api.http.post("/v1/sweeps", json=small(), headers={"Origin": origin}).status_code == 403
    assert len(api.http.get("/v1/sweeps").json()["sweeps"]) == 0


def test_the_services_own_pages_are_answered(api: Api) -> None:
    own = f"http://{api.http.base_url.host}:{api.http.base_url.port}"
    assert api.http.get("/v1/sweeps", headers={"Origin": own}).status_code == 200


def test_a_preflight_of_another_origin_gets_no_permission(api: Api) -> None:
    asked = {"Origin": "http://attacker.example", "Access-Control-Request-Method": "POST"}
    answer = api.http.options("/v1/sweeps", headers=asked)
    assert answer.status_code == 403
    assert not [name for name in answer.headers if name.startswith("access-control")]


def test_a_body_must_be_json(api: Api) -> None:
    for kind in ("text/plain", "application/x-www-form-urlencoded", "multipart/form-data; boundary=x", "text/json"):
        answer = api.http.post("/v1/sweeps", content=b"{}", headers={"Content-Type": kind})
        assert answer.status_code == 415
    declared = {"Content-Type": "Application/JSON; charset=utf-8"}
    assert api.http.post("/v1/sweeps", content=b"{}", headers=declared).status_code == 422


def test_a_large_body_is_refused_whether_announced_or_in_chunks(api: Api) -> None:
    large = b'{"label": "' + b"x" * LIMIT + b'"}'
    json = {"Content-Type": "application/json"}
    assert api.http.post("/v1/sweeps", content=large, headers=json).status_code == 413
    chunks = (large[i : i + 100] for i in range(0, len(large), 100))
    answer = api.http.post("/v1/sweeps", content=chunks, headers=json)
    assert (answer.status_code, answer.headers["content-type"]) == (413, "application/problem+json")
    assert str(LIMIT) in answer.json()["detail"]
    assert api.http.post("/v1/sweeps", json=small()).status_code == 201


def test_an_announced_body_is_refused_before_it_is_sent(api: Api) -> None:
    with socket.create_connection((api.http.base_url.host, api.http.base_url.port), timeout=10) as connection:
        head = "POST /v1/sweeps HTTP/1.1\r\nHost: localhost\r\nContent-Type: application/json\r\n"
        connection.sendall(f"{head}Content-Length: 999999999999\r\n\r\n".encode())
        assert connection.recv(100).startswith(b"HTTP/1.1 413")


def test_deeply_nested_json_is_refused(api: Api) -> None:
    deep = b'{"circuit": ' + b"[" * 900 + b"]" * 900 + b"}"
    answer = api.http.post("/v1/sweeps", content=deep, headers={"Content-Type": "application/json"})
    assert answer.status_code == 400
    assert "limits.json_depth" in answer.json()["detail"]


def test_brackets_in_strings_do_not_nest() -> None:
    check_depth(rb'{"a": "[[[[{{{{", "b": ["\"[[["], "c": "\\"}', 2)
    with pytest.raises(Refusal):
        check_depth(b'{"a": [[1]]}', 2)
    check_depth(b"", 1)


@pytest.mark.parametrize("path", ["/", "/v1/sweeps", "/healthz", "/nothing", "/metrics"])
def test_every_answer_tells_browsers_to_keep_out(api: Api, path: str) -> None:
    headers = api.http.get(path).headers
    assert headers["x-content-type-options"] == "nosniff"
    assert headers["content-security-policy"].startswith("default-src 'none'")
    assert headers["cache-control"] == "no-store"
    assert "server" not in headers
