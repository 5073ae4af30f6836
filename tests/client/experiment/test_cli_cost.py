"""`sweepmill cost` against a real service."""

import json
import sys
from collections.abc import Callable
from pathlib import Path
from typing import Any, NamedTuple

import pytest

from sweepmill import Client, Sweep
from sweepmill.cli import main

REPLICATE = 7300  # ensembles that no other test has


class Done(NamedTuple):
    code: int
    out: str
    err: str


Run = Callable[..., Done]


@pytest.fixture
def run(service_url: str, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]) -> Run:
    """Run a command in this process."""

    def call(*arguments: object) -> Done:
        monkeypatch.setattr(sys, "argv", ["sweepmill", *map(str, arguments)])
        code = 0
        try:
            main()
        except SystemExit as stopped:
            code = int(stopped.code or 0)
        return Done(code, *capsys.readouterr())

    monkeypatch.setenv("SWEEPMILL_URL", service_url)
    return call


def sampled(service_url: str, sweep: Sweep) -> str:
    with Client(service_url) as client:
        remote = client.submit(sweep)
        remote.wait(progress=False, timeout=120)
        return remote.key


def small(replicate: int, *observe: dict[str, Any]) -> Sweep:
    circuit = {"family": "hybrid-clifford", "sites": [4, 8], "measurement_rate": 0.2, "layers": 8}
    circuit["replicate"] = replicate
    return Sweep.parse({"circuit": circuit, "observe": list(observe), "stop": {"trajectories": 60}})


def test_a_sweep_without_records_is_answered_with_its_companion(run: Run, service_url: str, tmp_path: Path) -> None:
    plain = small(REPLICATE, {"quantity": "entropy"})
    key = sampled(service_url, plain)
    refused = run("cost", key[:12])
    assert (refused.code, refused.out) == (1, "")
    assert refused.err.startswith("sweepmill: no observation of record-bits here, only entropy\n")
    path = tmp_path / "companion.toml"
    assert run("cost", key, "--companion", path) == (0, f"{path}\n", "")
    assert path.read_text() in refused.err
    assert [one.ensemble.key for one in Sweep.read(path).points] == [one.ensemble.key for one in plain.points]


def test_a_sweep_with_records_is_reported_in_every_format(run: Run, service_url: str, tmp_path: Path) -> None:
    at = {"every": 2, "single_layers": True}
    observed = small(REPLICATE + 1, {"quantity": "record-bits", "at": at, "histogram": True}, {"quantity": "entropy"})
    key = sampled(service_url, observed)
    printed = run("cost", key[:12])
    assert (printed.code, printed.err) == (0, "")
    assert printed.out.startswith("# What an experiment would pay\n")
    specification = tmp_path / "sweep.json"
    specification.write_text(json.dumps(observed.normalized()))
    assert run("cost", specification).out == printed.out
    for suffix, begins in ((".html", "<!doctype html>"), (".md", "# What"), (".json", "{")):
        path = tmp_path / f"report{suffix}"
        assert run("cost", key, "-o", path, "--select", 3, "--shot-time", 0.001) == (0, f"{path}\n", "")
        assert path.read_text(encoding="utf-8").startswith(begins)
    laboratory = tmp_path / "laboratory.toml"
    assert run("cost", key, "--laboratory", laboratory).out == printed.out
    (written,) = Sweep.read(laboratory).points
    assert (written.ensemble.sites, written.ensemble.layers) == (3 + 4, 3)  # four slices of the edge of three qubits
    values = json.loads((tmp_path / "report.json").read_text())
    assert values["shot_time"] == 0.001
    assert {one["quantiles_from"] for one in values["records"]} == {"histogram"}
    assert [one["layer"] for one in values["records"]] == [2, 4, 6, 8] * 2


@pytest.mark.parametrize(
    ("options", "said"),
    [
        (("--shot-time", "0"), "positive time"),
        (("--precision", "2"), "between 0 and 1"),
        (("--select", "0"), "--select"),
        (("-o", "report.pdf"), "one of .html, .md, .json"),
    ],
)
def test_misuse_is_exit_code_2(run: Run, options: tuple[str, ...], said: str) -> None:
    done = run("cost", "0123456789ab", *options)
    assert done.code == 2
    assert said in done.err


def test_what_is_no_source_is_one_line_on_standard_error(run: Run, tmp_path: Path) -> None:
    done = run("cost", tmp_path / "nowhere.json")
    assert (done.code, done.out, done.err.count("\n")) == (1, "", 1)
    assert "neither a file nor a key" in done.err


def test_a_sweep_that_was_never_submitted_is_one_line_on_standard_error(run: Run, tmp_path: Path) -> None:
    path = tmp_path / "sweep.json"
    path.write_text(json.dumps(small(REPLICATE + 2, {"quantity": "record-bits"}).normalized()))
    done = run("cost", path)
    assert (done.code, done.out, done.err.count("\n")) == (1, "", 1)
    assert "submit its specification first" in done.err
