"""Fold sums over HTTP: the rows of the table, and what they add up to."""

import io
from collections.abc import Iterator
from typing import Any

import numpy as np
import pyarrow as pa
import pyarrow.parquet
import pytest

from support.api import Api, reading_only, sampled_by_hand, serving
from sweepmill.coordinates import coordinates
from sweepmill.folds import fold_ratios
from sweepmill.sweep import Sweep
from sweepmill_worker.sample import sample

ARROW = "application/vnd.apache.arrow.stream"
PARQUET = "application/vnd.apache.parquet"
PLACE = ("sites", "name", "quantity", "region", "layer", "position", "trajectories")


@pytest.fixture
def api(database_url: str) -> Iterator[Api]:
    with serving(reading_only(database_url)) as running:
        yield running


def wide_sweep() -> Sweep:
    """A ratio, an average and so many coordinates that fewer folds are kept."""
    return Sweep.parse(
        {
            "circuit": {"family": "hybrid-clifford", "sites": [12, 8], "measurement_rate": 0.2, "layers": 48},
            "observe": [
                {"name": "cuts", "quantity": "entropy", "region": "every-cut", "at": {"every": 2}},
                {"name": "half", "quantity": "entropy", "average_translations": True},
                {"quantity": "outcome-randomness", "at": "end"},
            ],
            "stop": {"trajectories": 90},
        }
    )


def folds_of(api: Api, sweep: Sweep, accept: str = "application/json", **query: str) -> Any:
    answer = api.http.get(f"/v1/sweeps/{sweep.key}/folds", headers={"Accept": accept}, params=query)
    assert answer.status_code == 200, answer.text
    assert answer.headers["content-type"].startswith(accept)
    return answer


def test_folds_have_the_rows_of_the_table_and_sum_to_its_means(api: Api) -> None:
    sweep = wide_sweep()
    api.submit(sweep)
    sampled_by_hand(api.store, sweep, 90)
    folds, table = (api.http.get(f"/v1/sweeps/{sweep.key}/{what}").json() for what in ("folds", "table"))
    for name in (*PLACE, "mean", "standard_error"):
        assert folds["columns"][name] == table["columns"][name]
    assert folds["metadata"] == table["metadata"]
    pairs = zip(folds["columns"]["numerators"], folds["columns"]["denominators"], strict=True)
    assert [sum(top) / sum(bottom) for top, bottom in pairs] == pytest.approx(table["columns"]["mean"], rel=1e-13)
    rows = zip(*(folds["columns"][name] for name in ("sites", "name", "numerators")), strict=True)
    lengths = {(sites, name): len(numerators) for sites, name, numerators in rows}
    assert [lengths[12, name] for name in ("cuts", "half", "outcome-randomness")] == [16, 64, 64]
    assert lengths[8, "cuts"] == 64  # fewer folds beyond 256 coordinates only


def test_lists_are_the_folds_of_the_sampled_trajectories(api: Api) -> None:
    sweep = wide_sweep()
    api.submit(sweep)
    sampled_by_hand(api.store, sweep, 70)
    columns = folds_of(api, sweep).json()["columns"]
    rows = iter(zip(columns["numerators"], columns["denominators"], strict=True))
    for point in sweep.points:
        items = [item.observation for item in sweep.observations]
        totals = sample(point.ensemble, items, 0, 70).accumulators
        for item in items:
            numerators, denominators = fold_ratios(totals[item.key], coordinates(point.ensemble, item))
            for place in range(numerators.shape[1]):
                assert next(rows) == (numerators[:, place].tolist(), denominators[:, place].tolist())
    assert next(rows, None) is None


def test_arrow_and_parquet_hold_the_same_and_one_observation_can_be_asked_for(api: Api) -> None:
    sweep = wide_sweep()
    api.submit(sweep)
    sampled_by_hand(api.store, sweep, 30)
    whole, half = folds_of(api, sweep).json(), folds_of(api, sweep, name="half").json()
    arrow = pa.ipc.open_stream(folds_of(api, sweep, ARROW).content).read_all()
    parquet = pyarrow.parquet.read_table(io.BytesIO(folds_of(api, sweep, PARQUET).content))
    assert arrow.to_pydict() == parquet.to_pydict() == whole["columns"]
    chosen = np.array(whole["columns"]["name"]) == "half"
    assert half["columns"] == {
        name: [v for v, c in zip(column, chosen, strict=True) if c] for name, column in whole["columns"].items()
    }
    assert [one["rows"] for one in half["metadata"]["ensembles"]] == [[0, 1], [1, 2]]


def test_what_is_not_there_is_refused_and_current_copies_are_confirmed(api: Api) -> None:
    sweep = wide_sweep()
    api.submit(sweep)
    path = f"/v1/sweeps/{sweep.key}/folds"
    assert folds_of(api, sweep).json()["columns"]["numerators"] == []
    unknown = api.http.get(path, params={"name": "quarter"})
    assert unknown.status_code == 422
    assert unknown.json()["faults"] == [
        {"path": "query.name", "message": "'quarter' is none of cuts, half, outcome-randomness"}
    ]
    assert api.http.get(path, headers={"Accept": "text/csv"}).status_code == 406
    tag = folds_of(api, sweep).headers["etag"]
    assert api.http.get(path, headers={"If-None-Match": tag}).status_code == 304
    assert api.http.get(path, params={"name": "half"}, headers={"If-None-Match": tag}).status_code == 200


def test_the_metadata_says_what_all_ensembles_have_in_common(api: Api) -> None:
    sweep = wide_sweep()
    api.submit(sweep)
    constants = folds_of(api, sweep).json()["metadata"]["constants"]
    assert (constants["family"], constants["measurement_rate"], constants["layers"]) == ("hybrid-clifford", 0.2, 48)
    assert "sites" not in constants
