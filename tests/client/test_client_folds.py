"""Folds and specifications through the client, from a real service."""

from pathlib import Path
from typing import Any

import pytest

from sweepmill import Client, ServiceError, Sweep, SweepmillError
from sweepmill.folds import Folds
from sweepmill.remote import RemoteSweep

WAIT = 120.0


@pytest.fixture(scope="module")
def settled(service_url: str) -> Any:
    """A sweep that has settled."""
    circuit = {"family": "hybrid-clifford", "sites": [4, 8], "measurement_rate": 0.1, "layers": 8, "replicate": 4711}
    body = {
        "circuit": circuit,
        "observe": [
            {"quantity": "entropy", "name": "series", "at": [2, 4, 8]},
            {"quantity": "outcome-randomness"},
        ],
        "stop": {"trajectories": 70},
        "label": "kept by the request",
    }
    with Client(service_url, owner="mara") as client:
        sweep = client.submit(Sweep.parse(body))
        sweep.wait(progress=False, timeout=WAIT)
        yield sweep


@pytest.mark.parametrize("suffix", ["json", "arrow", "parquet"])
def test_folds_are_the_same_in_memory_and_in_a_file(settled: RemoteSweep, tmp_path: Path, suffix: str) -> None:
    folds = settled.folds()
    read = Folds.read(settled.download_folds(tmp_path / f"folds.{suffix}"))
    assert list(read.rows()) == list(folds.rows())
    assert read.metadata == folds.metadata
    assert folds.axes == ("sites",)
    assert folds.constants["replicate"] == 4711
    table = settled.table()
    assert folds["mean"].tolist() == table["mean"].tolist()
    top, bottom = folds.sums()
    assert (top.sum(axis=0) / bottom.sum(axis=0)).tolist() == pytest.approx(table["mean"].tolist(), rel=1e-13)


def test_one_observation_can_be_asked_for(settled: RemoteSweep, tmp_path: Path) -> None:
    assert set(settled.folds("series").values("name")) == {"series"}
    path = settled.download_folds(tmp_path / "one.json", "series")
    assert list(Folds.read(path).rows()) == list(settled.folds("series").rows())
    with pytest.raises(ServiceError, match="no observation is named 'entropy'"):
        settled.folds("entropy")


def test_a_table_is_not_taken_for_folds_and_csv_has_no_place_for_them(settled: RemoteSweep, tmp_path: Path) -> None:
    with pytest.raises(SweepmillError, match="has no folds: it is a table of means"):
        Folds.read(settled.download(tmp_path / "table.json"))
    with pytest.raises(ValueError, match=r"one of \.json, \.arrow, \.parquet"):
        settled.download_folds(tmp_path / "folds.csv")


def test_the_specification_comes_back_in_its_normal_form(settled: RemoteSweep) -> None:
    again = settled.specification()
    assert again.key == settled.key
    assert again.label is None
