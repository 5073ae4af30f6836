"""Where the client looks for its service, and as whom it asks."""

import re

import pytest

from sweepmill import BadSettings
from sweepmill.connection import DEFAULT_URL, connection, login_name


@pytest.fixture(autouse=True)
def _no_environment(monkeypatch: pytest.MonkeyPatch) -> None:
    for name in ("SWEEPMILL_URL", "SWEEPMILL_TOKEN", "SWEEPMILL_OWNER"):
        monkeypatch.delenv(name, raising=False)


def test_defaults_serve_one_person_on_one_machine() -> None:
    found = connection()
    assert (found.url, found.token, found.owner) == (DEFAULT_URL, None, login_name())


def test_the_environment_comes_before_defaults_and_arguments_before_it(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("SWEEPMILL_URL", "https://mill.example/under/")
    monkeypatch.setenv("SWEEPMILL_TOKEN", "abc")
    monkeypatch.setenv("SWEEPMILL_OWNER", "mara")
    assert connection().url == "https://mill.example/under"
    assert connection().headers == {"Sweepmill-Owner": "mara", "Authorization": "Bearer abc"}
    assert connection("http://other.example", "def", "jon").headers["Sweepmill-Owner"] == "jon"


@pytest.mark.parametrize("name", ["Jörg Ö", "a b/c", "", "---", "x" * 80])
def test_a_login_name_becomes_an_owner(monkeypatch: pytest.MonkeyPatch, name: str) -> None:
    monkeypatch.setattr("getpass.getuser", lambda: name)
    assert re.fullmatch(r"[A-Za-z0-9._-]{1,64}", login_name())


def test_a_login_without_a_name_is_local(monkeypatch: pytest.MonkeyPatch) -> None:
    def nameless() -> str:
        raise OSError

    monkeypatch.setattr("getpass.getuser", nameless)
    assert login_name() == "local"


@pytest.mark.parametrize("url", ["127.0.0.1:8765", "ftp://a.example", "http://", "http://[::1", "http://a:port"])
def test_an_address_that_cannot_be_used_is_refused(url: str) -> None:
    with pytest.raises(BadSettings):
        connection(url)


def test_an_owner_or_token_that_cannot_be_used_is_refused() -> None:
    with pytest.raises(BadSettings, match="owner"):
        connection(owner="a b")
    with pytest.raises(BadSettings, match="token") as caught:
        connection(token="täken")
    assert "täken" not in str(caught.value)


def test_proxies_of_the_environment_are_kept_off_loopback() -> None:
    assert connection("http://localhost:1").loopback
    assert connection("http://[::1]:1").loopback
    assert not connection("https://mill.example").loopback
