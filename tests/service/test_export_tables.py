"""Tables in four formats, on both databases: contents, order, validators."""

import csv
import io
import json
import math
from collections.abc import Iterator
from typing import Any

import numpy as np
import pyarrow as pa
import pyarrow.parquet
import pytest

from support.api import Api, reading_only, sampled_by_hand, serving
from support.sweeps import small_sweep
from sweepmill.coordinates import coordinates
from sweepmill.statistics import summarize
from sweepmill.sweep import Sweep
from sweepmill_worker.sample import sample

ARROW = "application/vnd.apache.arrow.stream"
PARQUET = "application/vnd.apache.parquet"


@pytest.fixture
def api(database_url: str) -> Iterator[Api]:
    with serving(reading_only(database_url)) as running:
        yield running


def rich_sweep(cap: int = 40) -> Sweep:
    """Two axes, several coordinates, a ratio, a histogram, one observation under two names."""
    return Sweep.parse(
        {
            "circuit": {"family": "hybrid-clifford", "sites": [12, 8], "measurement_rate": [0.2, 0], "layers": 12},
            "observe": [
                {"quantity": "entropy", "region": "every-cut", "at": [4, 12]},
                {"name": "half", "quantity": "entropy", "average_translations": True, "histogram": True},
                {"name": "again", "quantity": "entropy", "average_translations": True, "histogram": True},
                {"quantity": "outcome-randomness", "at": "end"},
            ],
            "stop": {"trajectories": cap},
        }
    )


def table_of(api: Api, sweep: Sweep, accept: str = "application/json", what: str = "table") -> Any:
    answer = api.http.get(f"/v1/sweeps/{sweep.key}/{what}", headers={"Accept": accept})
    assert answer.status_code == 200, answer.text
    assert answer.headers["content-type"].startswith(accept)
    return answer


def test_rows_come_in_the_order_of_ensembles_names_coordinates(api: Api) -> None:
    sweep = rich_sweep()
    api.submit(sweep)
    sampled_by_hand(api.store, sweep, 40)
    columns = table_of(api, sweep).json()["columns"]
    expected = [
        (point.ensemble.parameters["sites"], point.ensemble.parameters["measurement_rate"], item.name, *place[:2])
        for point in sweep.points
        for item in sweep.observations
        for place in coordinates(point.ensemble, item.observation)
    ]
    names = ("sites", "measurement_rate", "name", "layer", "position")
    assert list(zip(*(columns[name] for name in names), strict=True)) == expected
    assert list(columns)[:2] == ["sites", "measurement_rate"]
    assert set(columns["met_by"]) == {"cap"}


def test_numbers_are_those_of_the_sampled_trajectories(api: Api) -> None:
    sweep = rich_sweep()
    api.submit(sweep)
    sampled_by_hand(api.store, sweep, 25)
    rows = iter(zip(*table_of(api, sweep).json()["columns"].values(), strict=True))
    for point in sweep.points:
        items = [item.observation for item in sweep.observations]
        batch = sample(point.ensemble, items, 0, 25)
        for item in items:
            places = coordinates(point.ensemble, item)
            for moments in summarize(batch.accumulators[item.key], places):
                trajectories, *numbers, met_by = next(rows)[-7:]
                expected = (moments.mean, moments.standard_error, moments.variance, moments.minimum, moments.maximum)
                assert numbers == [None if math.isnan(number) else number for number in expected]
                assert (trajectories, met_by) == (25, None)


def test_all_formats_hold_the_same_table(api: Api) -> None:
    sweep = rich_sweep()
    api.submit(sweep)
    sampled_by_hand(api.store, sweep, 30)
    body = table_of(api, sweep).json()
    arrow = pa.ipc.open_stream(table_of(api, sweep, ARROW).content).read_all()
    parquet = pyarrow.parquet.read_table(io.BytesIO(table_of(api, sweep, PARQUET).content))
    assert arrow.to_pydict() == parquet.to_pydict() == body["columns"]
    assert json.loads(arrow.schema.metadata[b"sweepmill"]) == body["metadata"]
    assert json.loads(parquet.schema.metadata[b"sweepmill"]) == body["metadata"]
    lines = list(csv.DictReader(io.StringIO(table_of(api, sweep, "text/csv").text)))
    assert list(lines[0]) == list(body["columns"])
    for name in ("mean", "standard_error", "variance"):
        written = [float(line[name]) if line[name] else None for line in lines]
        assert written == body["columns"][name]


def test_the_metadata_names_keys_ranges_and_digests(api: Api) -> None:
    sweep = rich_sweep()
    api.submit(sweep)
    sampled_by_hand(api.store, sweep, 40)
    metadata = table_of(api, sweep).json()["metadata"]
    assert (metadata["sweep"], metadata["axes"]) == (sweep.key, ["sites", "measurement_rate"])
    assert metadata["observations"]["half"] == metadata["observations"]["again"]
    begin = 0
    for ordinal, (point, entry) in enumerate(zip(sweep.points, metadata["ensembles"], strict=True)):
        batch = sample(point.ensemble, [item.observation for item in sweep.observations], 0, 40)
        assert (entry["key"], entry["ordinal"], entry["frozen"]) == (point.ensemble.key, ordinal, True)
        assert entry["digest"]
        assert entry["observations"] == {
            key: {"trajectories": [0, 40], "digest": total.digest} for key, total in batch.accumulators.items()
        }
        assert entry["rows"][0] == begin
        begin = entry["rows"][1]
    assert begin == len(table_of(api, sweep).json()["columns"]["mean"])


def test_an_ensemble_without_trajectories_has_no_rows(api: Api) -> None:
    sweep = small_sweep()
    api.submit(sweep)
    columns = table_of(api, sweep).json()["columns"]
    assert set(map(len, columns.values())) == {0}
    assert next(iter(columns)) == "measurement_rate"
    for accept in ("text/csv", ARROW, PARQUET):
        assert table_of(api, sweep, accept).content
    assert pa.ipc.open_stream(table_of(api, sweep, ARROW).content).read_all().num_rows == 0


def test_a_settled_table_never_changes(api: Api) -> None:
    sweep = small_sweep(cap=20)
    api.submit(sweep)
    sampled_by_hand(api.store, sweep, 20)
    settled = table_of(api, sweep)
    longer = small_sweep(cap=50)
    api.submit(longer)
    sampled_by_hand(api.store, longer, 50, first=20)
    later = table_of(api, sweep)
    assert later.content == settled.content
    assert later.headers["etag"] == settled.headers["etag"]
    assert set(table_of(api, longer).json()["columns"]["trajectories"]) == {50}


def test_a_current_copy_is_confirmed_and_an_old_one_replaced(api: Api) -> None:
    sweep = small_sweep(cap=50)
    api.submit(sweep)
    sampled_by_hand(api.store, sweep, 10)
    path = f"/v1/sweeps/{sweep.key}/table"
    tag = table_of(api, sweep).headers["etag"]
    current = api.http.get(path, headers={"If-None-Match": f'"other", W/{tag}'})
    assert (current.status_code, current.content, current.headers["etag"]) == (304, b"", tag)
    as_csv = api.http.get(path, headers={"If-None-Match": tag, "Accept": "text/csv"})
    assert as_csv.status_code == 200
    assert as_csv.headers["etag"] != tag
    sampled_by_hand(api.store, sweep, 15, first=10)
    newer = api.http.get(path, headers={"If-None-Match": tag})
    assert newer.status_code == 200
    assert newer.headers["etag"] != tag
    assert newer.headers["vary"] == "Accept"


def test_histograms_count_every_reading_once(api: Api) -> None:
    sweep = rich_sweep()
    api.submit(sweep)
    sampled_by_hand(api.store, sweep, 30)
    columns = table_of(api, sweep, what="histograms").json()["columns"]
    assert set(columns["name"]) == {"half", "again"}
    counted = np.array(columns["occurrences"])
    for sites, rate in ((8, 0.2), (12, 0)):
        chosen = [
            i
            for i, row in enumerate(zip(columns["sites"], columns["measurement_rate"], columns["name"], strict=True))
            if row == (sites, rate, "half")
        ]
        # the last cell is two layers, each read at every translation
        assert counted[chosen].sum() == 30 * 2 * sites
        values = np.array(columns["value"])[chosen]
        table = table_of(api, sweep).json()["columns"]
        means = [
            mean
            for mean, *row in zip(table["mean"], table["sites"], table["measurement_rate"], table["name"], strict=True)
            if row == [sites, rate, "half"]
        ]
        assert means == [pytest.approx((values * counted[chosen]).sum() / counted[chosen].sum(), rel=1e-14)]
    arrow = pa.ipc.open_stream(table_of(api, sweep, ARROW, "histograms").content).read_all()
    assert arrow.to_pydict() == columns
