"""Circuits written as data in the service: counted, limited, stored, found again, exported."""

from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest

from support.api import Api, reading_only, serving
from support.circuits import GATES, Z, layered, specification
from sweepmill.ensemble import Ensemble
from sweepmill.messages import EnsembleRecord, ProgressPage
from sweepmill.presets import layered_form
from sweepmill.sweep import Sweep
from sweepmill_service.counting import too_many
from sweepmill_service.export.layout import layout_of
from sweepmill_service.magnitudes import too_large
from sweepmill_service.plan.costs import default_seconds_per_trajectory
from sweepmill_service.programs import too_long
from sweepmill_service.settings import ServerLimits
from sweepmill_service.store import Store
from sweepmill_service.stored import expand

P: dict[str, Any] = {"parameter": "p"}
SPEC = layered(
    [GATES, Z | {"rate": P}],
    [{"apply": "uniform-clifford", "on": "bonds-from-1"}, Z | {"rate": {**P, "complement": True}}],
    sites=[8, 16],
    before=[[{"swap_in": "reference", "on": {"places": [[0]]}}]],
    parameters={"p": {"from": 0.1, "to": 0.3, "points": 3}},
)


@pytest.fixture
def api(tmp_path: Path) -> Iterator[Api]:
    with serving(reading_only(f"sqlite:///{tmp_path / 'a.sqlite'}")) as running:
        yield running


def test_parameters_are_counted_as_axes_and_layers_are_not() -> None:
    count = len(Sweep.parse(SPEC).points)
    assert count == 6
    assert too_many(SPEC, count) is None
    fault = too_many(SPEC, count - 1)
    assert fault is not None
    assert "multiply to 6" in fault.message


def test_a_stored_specification_expands_to_what_was_submitted() -> None:
    sweep = Sweep.parse(SPEC)
    stored = expand(sweep.canonical())
    assert stored.ensembles == tuple(point.ensemble for point in sweep.points)
    assert [one.labels for one in stored.ensembles] == [point.ensemble.labels for point in sweep.points]


def test_parameters_are_columns_of_a_table() -> None:
    sweep = Sweep.parse(SPEC)
    layout = layout_of(sweep.canonical(), sweep.axes)
    assert [str(field.type) for field in layout.fields] == ["int64", "double"]
    assert [layout.axis_values(ordinal) for ordinal in range(6)] == [[n, p] for n in (8, 16) for p in (0.1, 0.2, 0.3)]


def test_progress_names_ensembles_by_their_parameters(store: Store) -> None:
    sweep = Sweep.parse(SPEC)
    store.submit(sweep, "ada")
    shown = [one.parameters for one in store.progress(sweep.key).ensembles]
    assert [(one["sites"], one["p"]) for one in shown] == [(n, p) for n in (8, 16) for p in (0.1, 0.2, 0.3)]
    assert not any("repeat" in one for one in shown)


def test_over_http_a_circuit_comes_back_as_it_was_sent(api: Api) -> None:
    sweep = Sweep.parse(SPEC)
    answer = api.http.post("/v1/sweeps", json=SPEC)
    assert (answer.status_code, answer.json()["key"]) == (201, sweep.key)
    assert answer.json()["status"]["axes"] == ["sites", "p"]
    page = ProgressPage.model_validate(api.http.get(f"/v1/sweeps/{sweep.key}/ensembles").json())
    assert [one.ensemble for one in page.ensembles] == [point.ensemble.key for point in sweep.points]
    key = sweep.points[1].ensemble.key
    record = EnsembleRecord.model_validate(api.http.get(f"/v1/ensembles/{key}").json())
    assert Ensemble.of(record.family, **record.parameters).key == key


def test_over_http_every_fault_of_a_circuit_has_its_path(api: Api) -> None:
    spec = layered([{"apply": "cnot", "on": "sites"}, Z | {"rate": {"parameter": "q"}}])
    answer = api.http.post("/v1/estimate", json=spec)
    assert answer.status_code == 422
    assert [fault["path"] for fault in answer.json()["faults"]] == [
        "circuit.repeat[0][1].rate.parameter",
        "circuit.repeat[0][0].apply",
    ]


def test_limits_of_sites_depend_on_the_engine(api: Api) -> None:
    rest: dict[str, Any] = {"layers": 4}
    blocks = [
        ({"family": "projective-ising", "sites": 100_000, "bond_rate": 0.5}, None),
        ({"family": "projective-ising", "sites": 2_000_000, "bond_rate": 0.5}, "numbers up to 1000000"),
        ({"family": "projective-ising", "sites": 128, "bond_rate": 0.5, "engine": "reference"}, "at most 64 sites"),
        ({"family": "edge-bath", "sites": 2048}, "numbers up to 1024"),
        ({"family": "hybrid-clifford-square", "width": 64, "measurement_rate": 0.1}, "at most 1024 sites"),
        ({"family": "hybrid-clifford-square", "width": 10**6, "measurement_rate": 0.1}, "numbers up to 1024"),
        ({"family": "hybrid-clifford", "sites": 64, "measurement_rate": 0.1, "engine": "reference"}, None),
    ]
    for block, words in blocks:
        answer = api.http.post("/v1/estimate", json=specification(**block, **rest))
        assert answer.status_code == (200 if words is None else 422), answer.text
        assert words is None or words in answer.json()["faults"][0]["message"]


def test_long_circuits_are_refused_before_they_are_expanded() -> None:
    limits = ServerLimits(program_values=100, program_values_total=1000)
    places = [[site] for site in range(60)]
    one = layered([{"measure": "Z", "on": {"places": places}}], sites=64)
    (fault,) = too_long(one, limits)
    assert (fault.path, "at most 100 values" in fault.message) == ("circuit", True)
    many = layered([GATES, Z | {"rate": P}], parameters={"p": {"from": 0, "to": 1, "points": 101}})
    (fault,) = too_long(many, limits)
    assert "of all ensembles of a sweep" in fault.message
    assert not list(too_long(many, ServerLimits()))


@pytest.mark.parametrize("part", [{"repeat": 3}, {"repeat": None}, {"repeat": {"a": {"b": []}}}, {"parameters": [1]}])
def test_counting_takes_whatever_comes(part: dict[str, Any]) -> None:
    spec: dict[str, Any] = {"circuit": [{"family": "layered", **part}, 7]}
    assert not list(too_long(spec, ServerLimits()))
    assert not too_large(spec, ServerLimits())
    assert too_many(spec, 10) is None


def test_numbers_of_a_circuit_are_bounded_where_they_stand() -> None:
    spec = layered([Z | {"on": {"random_sequential": {"count": {"per_site": 10**9}, "of": "sites"}}}])
    assert [fault.path for fault in too_large(spec, ServerLimits())] == [
        "circuit.repeat[0][0].on.random_sequential.count.per_site"
    ]


@pytest.mark.parametrize(
    "preset",
    [
        Ensemble.of("hybrid-clifford", sites=64, measurement_rate=0.2, layers=256),
        Ensemble.of("hybrid-clifford-square", width=8, height=8, measurement_rate=0.2, layers=256),
        Ensemble.of("hybrid-clifford-long-range", sites=64, exponent=2, measurement_rate=0.2, layers=256),
    ],
    ids=lambda preset: preset.family,
)
def test_a_preset_and_its_layered_form_are_predicted_to_cost_the_same(preset: Ensemble) -> None:
    form = Ensemble.from_normal_form(layered_form(preset))
    ratio = default_seconds_per_trajectory(form) / default_seconds_per_trajectory(preset)
    assert ratio == pytest.approx(1, rel=0.02)
