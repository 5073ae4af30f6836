"""Comparisons of records over HTTP: with signs and without, in one sweep."""

from collections.abc import Iterator
from pathlib import Path

import pytest

from support.api import Api, reading_only, sampled_by_hand, serving
from support.specs import small
from sweepmill.messages import Trajectory
from sweepmill.sweep import Sweep
from sweepmill_worker.sample import trajectory_values

PARITY = {"quantity": "pauli-expectation", "pauli": "ZZ", "sites": [0, 1], "at": "end"}
CROSSED = {"quantity": "cross-entropy", "against": "plus", "at": [4, 8], "name": "chi"}
CIRCUIT = {"family": "hybrid-clifford", "sites": 4, "layers": 8, "measurement_rate": 0.4, "scrambling_layers": 2}
SWEEP = Sweep.parse(small(circuit=CIRCUIT | {"engine": ["reference", "auto"]}, observe=[CROSSED]))


@pytest.fixture
def api(tmp_path: Path) -> Iterator[Api]:
    with serving(reading_only(f"sqlite:///{tmp_path / 'a.sqlite'}")) as running:
        yield running


def test_values_of_both_engines_are_served_as_they_were_sampled(api: Api) -> None:
    assert api.submit(SWEEP).status_code == 201
    sampled_by_hand(api.store, SWEEP, 40)
    columns = api.http.get(f"/v1/sweeps/{SWEEP.key}/table").json()["columns"]
    rows = [dict(zip(columns, row, strict=True)) for row in zip(*columns.values(), strict=True)]
    assert [(row["engine"], row["layer"]) for row in rows] == [(e, n) for e in ("reference", "auto") for n in (4, 8)]
    assert {(row["name"], row["quantity"], row["region"]) for row in rows} == {("chi", "cross-entropy", "against plus")}
    for row in rows:
        assert row["maximum"] == 1
        assert row["minimum"] in ((0,) if row["engine"] == "reference" else (0.5, 0.25, 0.125, 0.0625))
    assert rows[1]["mean"] <= rows[0]["mean"]  # a longer record tells more
    observations = [item.observation for item in SWEEP.observations]
    for point in SWEEP.points:
        answer = api.http.get(f"/v1/ensembles/{point.ensemble.key}/trajectories/3")
        (served,) = Trajectory.model_validate_json(answer.content).observations
        (recomputed,) = trajectory_values(point.ensemble, observations, 3)
        assert served.values == recomputed["values"]


def test_what_cannot_be_compared_is_refused_with_its_place(api: Api) -> None:
    equal = CROSSED | {"against": "zeros"}
    body = small(circuit=CIRCUIT, observe=[equal, PARITY, CROSSED | {"name": "ones", "against": "ones"}])
    answer = api.http.post("/v1/sweeps", json=body)
    assert answer.status_code == 422
    assert [fault["path"] for fault in answer.json()["faults"]] == ["observe[2].against"]
    answer = api.http.post("/v1/sweeps", json=small(circuit=CIRCUIT, observe=[equal, PARITY]))
    faults = {fault["path"]: fault["message"] for fault in answer.json()["faults"]}
    assert set(faults) == {"observe[0].against", "observe[1].quantity"}
    assert faults["observe[0].against"].endswith("are compared (circuit.initial_state)")
