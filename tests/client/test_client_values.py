"""Kept values and histograms by fold through the client and the command line, against a real service."""

import sys
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from sweepmill import Client, RemoteSweep, ServiceError, Sweep, SweepmillError, Table, Values
from sweepmill.cli import main
from sweepmill.coordinates import coordinates
from sweepmill.statistics import summarize

SPECIFICATION: dict[str, Any] = {
    "circuit": {
        "family": "hybrid-clifford",
        "sites": [4, 8],
        "measurement_rate": 0.2,
        "layers": 8,
        "replicate": 7001,
    },
    "observe": [
        {"quantity": "entropy", "at": "end", "histogram": True, "keep_values": True},
        {"quantity": "tripartite-information", "name": "i3", "average_translations": True, "keep_values": True},
        {"quantity": "outcome-randomness", "keep_values": True},
        {"quantity": "record-bits", "name": "bits"},
    ],
    "stop": {"trajectories": 300},
}


@pytest.fixture(scope="module")
def settled(service_url: str) -> Iterator[RemoteSweep]:
    """A sweep that has settled."""
    with Client(service_url, owner="mara") as client:
        sweep = client.submit(Sweep.parse(SPECIFICATION))
        sweep.wait(progress=False, timeout=120)
        yield sweep


def test_values_give_the_table_and_its_digests(settled: RemoteSweep) -> None:
    table, sweep = settled.table(), Sweep.parse(SPECIFICATION)
    for item in sweep.observations:
        if not item.observation.keep_values:
            continue
        values = settled.values(item.name)
        for point, entry in zip(sweep.points, values.ensembles, strict=True):
            sites = point.ensemble.sites
            total = values.total(sites=sites)
            (moments,) = summarize(total, coordinates(point.ensemble, item.observation))
            row = table.where(name=item.name, sites=sites)
            assert (moments.mean, moments.standard_error) == (row["mean"][0], row["standard_error"][0])
            assert entry["axes"] == {"sites": sites}
            if item.name != "entropy":  # whose total has a histogram, too
                assert entry["observations"][item.observation.key]["digest"] == total.digest


def test_values_are_arrow_pandas_and_numpy(settled: RemoteSweep) -> None:
    values = settled.values("i3")
    assert (len(values), values.name, values.axes) == (600, "i3", ("sites",))
    assert "Values of i3" in repr(values)
    frame = values.to_pandas()
    assert list(frame.columns) == ["sites", "layer", "position", "trajectory", "value"]
    assert frame.attrs["sweep"] == settled.key
    array = values.to_numpy(sites=8)
    assert array.shape == (300, 1)
    assert np.array_equal(array[:, 0], frame[frame.sites == 8]["value"])
    assert frame[frame.sites == 8]["trajectory"].tolist() == list(range(300))
    assert settled.values("outcome-randomness").to_numpy(sites=4).shape == (300, 1, 2)
    assert values.to_arrow().num_rows == 600


def test_one_ensemble_is_picked_by_its_axes(settled: RemoteSweep) -> None:
    values = settled.values("i3")
    with pytest.raises(ValueError, match="2 of 2 ensembles fit"):
        values.to_numpy()
    with pytest.raises(ValueError, match="rate: not an axis; the axes are sites"):
        values.total(rate=0.1)


def test_two_observations_are_of_the_same_trajectories(settled: RemoteSweep) -> None:
    columns = ["sites", "trajectory"]
    both = settled.values("entropy").to_pandas().merge(settled.values("i3").to_pandas(), on=columns, validate="1:1")
    assert len(both) == 600


def test_files_hold_the_values(settled: RemoteSweep, tmp_path: Path) -> None:
    whole = settled.values("entropy")
    for suffix in (".parquet", ".arrow"):
        read = Values.read(settled.download_values(tmp_path / f"values{suffix}", "entropy"))
        assert read.to_arrow().equals(whole.to_arrow(), check_metadata=True)
    file = settled.download_values(tmp_path / "values.csv", "entropy")
    assert len(file.read_text().splitlines()) == 601
    with pytest.raises(SweepmillError, match="metadata"):
        Values.read(file)
    with pytest.raises(ValueError, match=r"one of \.parquet, \.arrow, \.csv"):
        settled.download_values(tmp_path / "values.json", "entropy")
    with pytest.raises(ServiceError, match="bits does not keep its values"):
        settled.values("bits")


def test_histograms_by_fold_are_those_of_the_values(settled: RemoteSweep) -> None:
    plain, table = settled.histograms(), settled.histograms(folds=True)
    assert {name: plain.values(name) for name in plain.columns} == {n: table.values(n) for n in plain.columns}
    assert table.axes == ("sites",)
    values = settled.values("entropy").to_numpy(sites=8)[:, 0]
    for row in table.where(sites=8).rows():
        folds = np.bincount(np.flatnonzero(values == row["value"]) % 64, minlength=64)
        assert (row["by_fold"], row["occurrences"]) == (folds.tolist(), folds.sum())


def test_the_command_writes_values(
    settled: RemoteSweep, service_url: str, tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: Any
) -> None:
    run = command(monkeypatch, service_url)
    file = tmp_path / "i3.parquet"
    assert run("values", settled.key[:12], "--of", "i3", "-o", file) == 0
    assert capsys.readouterr().out == f"{file}\n"
    assert len(Values.read(file)) == 600
    assert run("values", settled.key[:12], "-o", file) == 1
    assert "name one of the observations that keep their values: entropy, i3" in capsys.readouterr().err
    assert run("values", settled.key[:12], "--of", "i3", "-o", tmp_path / "i3.json") == 2


def test_the_command_shows_writes_draws_and_compares_distributions(
    settled: RemoteSweep, service_url: str, tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: Any
) -> None:
    run = command(monkeypatch, service_url)
    file, figure = tmp_path / "entropy.json", tmp_path / "entropy.png"
    options = ("--of", "entropy", "--where", "sites=8", "--law", "stabilizer")
    assert run("histogram", settled.key[:12], *options, "-o", file, "--figure", figure) == 0
    out = capsys.readouterr().out
    assert "entropy (half) of sweep" in out
    assert "300 trajectories" in out
    assert "sites = 8 against random stabilizer states, 4 of 8 qubits: chi2 = " in out
    written = Table.read(file)
    assert written.columns == ("sites", "value", "occurrences", "share", "error", "law")
    assert sum(written.values("occurrences")) == 300
    assert figure.stat().st_size > 10_000
    assert run("histogram", settled.key[:12], "--of", "i3", "-o", tmp_path / "i3.csv") == 0
    assert "difference of sites = 4 and sites = 8: " in capsys.readouterr().out
    assert len((tmp_path / "i3.csv").read_text().splitlines()) > 4


@pytest.mark.parametrize(
    ("options", "code", "said"),
    [
        ((), 2, "name one observation with --of: entropy, i3, outcome-randomness"),
        (("--of", "bits"), 2, "'bits' has no distribution; those that have one: entropy, i3"),
        (("--of", "entropy", "--where", "rate=1"), 2, "'rate' tells no ensembles apart: one of sites does"),
        (("--of", "entropy", "--where", "rate"), 2, "say which, as in measurement_rate=0.16"),
        (("--of", "entropy", "--where", "sites=5"), 1, "nothing is sampled of entropy there"),
        (("--of", "i3", "--law", "stabilizer"), 1, "tripartite-information has no such law"),
        (("--of", "outcome-randomness"), 1, "is a ratio"),
        (("--of", "i3", "--figure", "a.txt"), 2, "one of .png, .pdf, .svg"),
    ],
)
def test_the_command_refuses_in_plain_words(
    settled: RemoteSweep,
    service_url: str,
    monkeypatch: pytest.MonkeyPatch,
    capsys: Any,
    options: tuple[str, ...],
    code: int,
    said: str,
) -> None:
    monkeypatch.setenv("COLUMNS", "200")
    assert command(monkeypatch, service_url)("histogram", settled.key[:12], *options) == code
    assert said in " ".join(capsys.readouterr().err.replace("│", " ").split())


def command(monkeypatch: pytest.MonkeyPatch, url: str) -> Callable[..., int]:
    """Run a command in this process; gives its exit code."""

    def call(*arguments: object) -> int:
        monkeypatch.setattr(sys, "argv", ["sweepmill", *map(str, arguments)])
        try:
            main()
        except SystemExit as stopped:
            return int(stopped.code or 0)
        return 0

    monkeypatch.setenv("SWEEPMILL_URL", url)
    return call
