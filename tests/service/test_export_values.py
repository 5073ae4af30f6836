"""Kept values over HTTP, on both databases: contents, exactness, bounds, validators."""

import csv
import io
import json
from collections.abc import Iterator
from typing import Any

import numpy as np
import pyarrow as pa
import pyarrow.parquet
import pytest

from support.api import Api, reading_only, sampled_by_hand, serving
from sweepmill.accumulate import Accumulator
from sweepmill.coordinates import coordinates
from sweepmill.statistics import summarize
from sweepmill.sweep import Sweep
from sweepmill_worker.kept import unpack
from sweepmill_worker.sample import sample, trajectory_values

ARROW = "application/vnd.apache.arrow.stream"
PARQUET = "application/vnd.apache.parquet"


@pytest.fixture
def api(database_url: str) -> Iterator[Api]:
    with serving(reading_only(database_url)) as running:
        yield running


def keeping(cap: int = 40, **stop: Any) -> Sweep:
    """Two sizes; several coordinates, scales and components."""
    return Sweep.parse(
        {
            "circuit": {"family": "hybrid-clifford", "sites": [12, 8], "measurement_rate": 0.2, "layers": 12},
            "observe": [
                {"quantity": "entropy", "keep_values": True, "region": "every-interval", "at": [4, 12]},
                {"name": "half", "quantity": "entropy", "average_translations": True, "keep_values": True},
                {"quantity": "outcome-randomness", "at": "end", "keep_values": True},
                {"name": "bits", "quantity": "record-bits"},
            ],
            "stop": {"trajectories": cap, **stop},
        }
    )


def values_of(api: Api, sweep: Sweep, name: str, accept: str = ARROW) -> Any:
    answer = api.http.get(f"/v1/sweeps/{sweep.key}/values", params={"name": name}, headers={"Accept": accept})
    assert answer.status_code == 200, answer.text
    assert answer.headers["content-type"].startswith(accept)
    return answer


def arrow_of(api: Api, sweep: Sweep, name: str) -> pa.Table:
    return pa.ipc.open_stream(values_of(api, sweep, name).content).read_all()


def integers(table: pa.Table, metadata: dict[str, Any], index: int) -> Any:
    """Integers [n, C, K] of one ensemble as they were accumulated, from what is served."""
    entry = metadata["ensembles"][index]
    part = table.slice(entry["rows"][0], entry["rows"][1] - entry["rows"][0])
    scale = np.array(metadata["scales"][entry["scales"]])
    if "value" in part.column_names:
        return np.rint(part["value"].to_numpy().reshape(-1, len(scale)) * scale).astype(np.int64)[:, :, None]
    pair = [part[name].to_numpy().reshape(-1, len(scale)) for name in ("numerator", "denominator")]
    return np.stack(pair, axis=-1)


def test_the_values_give_the_moments_of_the_table_bit_for_bit_and_the_digests_of_its_totals(api: Api) -> None:
    sweep = keeping()
    api.submit(sweep)
    sampled_by_hand(api.store, sweep, 15)
    sampled_by_hand(api.store, sweep, 40, first=15)
    rows = api.http.get(f"/v1/sweeps/{sweep.key}/table").json()
    moments = list(zip(*(rows["columns"][n] for n in ("name", "mean", "standard_error", "variance")), strict=True))
    for item in sweep.observations:
        if not item.observation.keep_values:
            continue
        table = arrow_of(api, sweep, item.name)
        metadata = json.loads(table.schema.metadata[b"sweepmill"])
        found = []
        for index, point in enumerate(sweep.points):
            total = Accumulator.from_values(integers(table, metadata, index), 0)
            (entry,) = metadata["ensembles"][index]["observations"].values()
            assert (entry["digest"], entry["trajectories"]) == (total.digest, [0, 40])
            found += summarize(total, coordinates(point.ensemble, item.observation))
        assert [(item.name, m.mean, m.standard_error, m.variance) for m in found] == [
            row for row in moments if row[0] == item.name
        ]


def test_rows_are_trajectories_in_order_each_with_all_its_coordinates(api: Api) -> None:
    sweep = keeping()
    api.submit(sweep)
    sampled_by_hand(api.store, sweep, 9)
    table = arrow_of(api, sweep, "entropy")
    assert table.column_names == ["sites", "layer", "position", "trajectory", "value"]
    item = next(item.observation for item in sweep.observations if item.name == "entropy")
    expected = [
        (point.ensemble.sites, one["layer"], one["position"], k, one["value"])
        for point in sweep.points
        for k in range(9)
        for one in trajectory_values(point.ensemble, [item], k)[0]["values"]
    ]
    assert list(zip(*table.to_pydict().values(), strict=True)) == expected


def test_all_formats_hold_the_same_values(api: Api) -> None:
    sweep = keeping()
    api.submit(sweep)
    sampled_by_hand(api.store, sweep, 30)
    for name in ("half", "outcome-randomness"):
        arrow = arrow_of(api, sweep, name)
        parquet = pyarrow.parquet.read_table(io.BytesIO(values_of(api, sweep, name, PARQUET).content))
        assert parquet.to_pydict() == arrow.to_pydict()
        assert parquet.schema.metadata[b"sweepmill"] == arrow.schema.metadata[b"sweepmill"]
        lines = list(csv.DictReader(io.StringIO(values_of(api, sweep, name, "text/csv").text)))
        assert list(lines[0]) == arrow.column_names
        for column in arrow.column_names[3:]:
            assert [float(line[column]) for line in lines] == arrow[column].to_pylist()


def test_an_answer_does_not_depend_on_how_trajectories_were_cut_into_batches(
    api: Api, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr("sweepmill_service.export.values.ROWS", 50)
    ones, others = keeping(60), keeping(61)
    for sweep in (ones, others):
        api.submit(sweep)
    for first, upto in ((0, 7), (7, 8), (8, 41), (41, 60)):
        sampled_by_hand(api.store, ones, upto, first)
    cut = values_of(api, ones, "half").content
    batches = pa.ipc.open_stream(cut).read_all().to_batches()
    assert [batch.num_rows for batch in batches] == [50, 60, 10]
    with_half = [item.observation for item in ones.observations if item.name == "half"]
    whole = sample(ones.points[1].ensemble, with_half, 0, 60).values[with_half[0].key]
    values = unpack(whole.data)[:, 0, 0] / 16
    assert pa.ipc.open_stream(cut).read_all()["value"].to_numpy()[60:].tolist() == values.tolist()


def test_a_settled_sweep_keeps_its_values_whatever_is_sampled_later(api: Api) -> None:
    sweep = keeping(20)
    api.submit(sweep)
    sampled_by_hand(api.store, sweep, 20)
    before = values_of(api, sweep, "half")
    longer = keeping(50)
    api.submit(longer)
    sampled_by_hand(api.store, longer, 50, first=20)
    after = values_of(api, sweep, "half")
    assert (after.content, after.headers["etag"]) == (before.content, before.headers["etag"])
    shared = arrow_of(api, longer, "half")
    assert shared.num_rows == 100  # the first 20 of each were sampled for the other sweep
    assert shared["value"].to_pylist()[:20] == arrow_of(api, sweep, "half")["value"].to_pylist()[:20]


def test_a_current_copy_is_confirmed_and_an_old_one_replaced(api: Api) -> None:
    sweep = keeping()
    api.submit(sweep)
    sampled_by_hand(api.store, sweep, 10)
    path, tag = f"/v1/sweeps/{sweep.key}/values", values_of(api, sweep, "half").headers["etag"]
    ask: dict[str, Any] = {"params": {"name": "half"}, "headers": {"If-None-Match": tag}}
    assert api.http.get(path, **ask).status_code == 304
    sampled_by_hand(api.store, sweep, 12, first=10)
    assert api.http.get(path, **ask).headers["etag"] != tag


def test_before_anything_is_sampled_there_are_no_rows(api: Api) -> None:
    sweep = keeping()
    api.submit(sweep)
    assert arrow_of(api, sweep, "half").num_rows == 0
    assert pyarrow.parquet.read_table(io.BytesIO(values_of(api, sweep, "half", PARQUET).content)).num_rows == 0


@pytest.mark.parametrize(
    ("name", "said"),
    [
        ("bits", "bits does not keep its values (keep_values = true does); those that do: entropy, half, outcome"),
        ("nothing", "no observation is called nothing; those that keep their values: entropy"),
        (None, "name one of the observations that keep their values: entropy, half, outcome-randomness"),
    ],
)
def test_other_observations_are_refused_in_plain_words(api: Api, name: str | None, said: str) -> None:
    sweep = keeping()
    api.submit(sweep)
    answer = api.http.get(f"/v1/sweeps/{sweep.key}/values", params={} if name is None else {"name": name})
    assert answer.status_code == 422
    assert said in answer.json()["detail"]
    assert answer.json()["faults"][0]["path"] == "query.name"


def test_json_is_refused_with_what_values_come_as(api: Api) -> None:
    sweep = keeping()
    api.submit(sweep)
    answer = api.http.get(f"/v1/sweeps/{sweep.key}/values?name=half", headers={"Accept": "application/json"})
    assert answer.status_code == 406
    assert answer.json()["detail"] == f"values come as {ARROW}, {PARQUET}, text/csv"


def test_a_server_says_how_much_it_keeps(database_url: str) -> None:
    with serving(reading_only(database_url, limits={"kept_values": 1000})) as api:
        answer = api.submit(keeping())
        assert answer.status_code == 422
        (fault,) = answer.json()["faults"]
        assert fault["path"].startswith("observe[")
        assert "this server keeps at most 1000 of a sweep (limits.kept_values)" in fault["message"]
        assert api.http.get("/v1/sweeps").json()["sweeps"] == []


def test_an_estimate_says_how_much_would_be_kept(api: Api) -> None:
    body = api.http.post("/v1/estimate", json=keeping(100).normalized()).json()
    # a byte for each length at two layers; sums of 24 entropies up to 12 in two bytes, of 16 up to 8 in one; a ratio
    assert body["kept_bytes"] == 100 * (2 * 12 + 2 + 2 + 2 * 8 + 1 + 2)
    assert api.http.get("/v1/sweeps").json()["sweeps"] == []
