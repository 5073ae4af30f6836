"""Ensembles, trajectories recomputed, and the service's own calls. On both databases where they are read."""

from collections.abc import Iterator

import pytest

from support.api import Api, reading_only, sampled_by_hand, serving
from support.sweeps import small_sweep
from sweepmill.coordinates import coordinates
from sweepmill.messages import EnsembleRecord, PoolStatus, Trajectory
from sweepmill.statistics import summarize
from sweepmill_worker.sample import sample


@pytest.fixture
def api(database_url: str) -> Iterator[Api]:
    with serving(reading_only(database_url)) as running:
        yield running


def test_an_ensemble_shows_what_is_stored_and_where_it_came_from(api: Api) -> None:
    sweep = small_sweep(cap=40)
    api.submit(sweep)
    sampled_by_hand(api.store, sweep, 30)
    ensemble = sweep.points[1].ensemble
    record = EnsembleRecord.model_validate_json(api.http.get(f"/v1/ensembles/{ensemble.key[:10]}").content)
    assert (record.key, record.parameters, record.batches) == (ensemble.key, dict(ensemble.parameters), 2)
    assert {one.trajectories for one in record.observations} == {30}
    assert {one.key for one in record.observations} == {item.observation.key for item in sweep.observations}
    assert {(one.first, one.count, one.worker) for one in record.latest} == {(0, 30, "by-hand")}


def test_a_recomputed_trajectory_is_the_one_that_was_sampled(api: Api) -> None:
    sweep = small_sweep(cap=40)
    api.submit(sweep)
    sampled_by_hand(api.store, sweep, 5)
    ensemble = sweep.points[0].ensemble
    answer = api.http.get(f"/v1/ensembles/{ensemble.key}/trajectories/3")
    trajectory = Trajectory.model_validate_json(answer.content)
    assert (trajectory.ensemble, trajectory.trajectory) == (ensemble.key, 3)
    assert {"numba", "numpy", "python", "sweepmill"} <= trajectory.versions.keys()
    for value in trajectory.observations:
        (item,) = [one.observation for one in sweep.observations if one.observation.normal_form() == value.observation]
        alone = sample(ensemble, [item], 3, 1).accumulators[item.key]
        means = [moments.mean for moments in summarize(alone, coordinates(ensemble, item))]
        assert [one["value"] for one in value.values] == means


def test_a_trajectory_that_cannot_be_recomputed_here_is_refused(database_url: str) -> None:
    with serving(reading_only(database_url, limits={"recompute_seconds": 1e-9})) as api:
        sweep = small_sweep(cap=40)
        api.submit(sweep)
        path = f"/v1/ensembles/{sweep.points[0].ensemble.key}/trajectories"
        nothing = api.http.get(f"{path}/0")
        assert (nothing.status_code, "nothing is sampled" in nothing.json()["detail"]) == (422, True)
        sampled_by_hand(api.store, sweep, 5)
        slow = api.http.get(f"{path}/0")
        assert (slow.status_code, "limits.recompute_seconds" in slow.json()["detail"]) == (422, True)
        assert api.http.get(f"{path}/-1").status_code == 422
        assert api.http.get(f"{path}/{2**63}").status_code == 422


def test_the_service_tells_where_things_are_and_how_it_is(api: Api) -> None:
    links = api.http.get("/").json()
    for link in links.values():
        assert api.http.get(link).status_code == 200
    assert api.http.get("/docs").status_code == 404
    pool = PoolStatus.model_validate_json(api.http.get("/v1/pool").content)
    assert (pool.ready, pool.reason, pool.workers) == (False, "this process does not dispatch", [])


def test_metrics_count_requests_by_route_and_not_by_path(api: Api) -> None:
    sweep = small_sweep()
    api.submit(sweep)
    api.http.get(f"/v1/sweeps/{sweep.key}")
    api.http.get("/v1/sweeps/00000000")
    api.http.get("/made/up")
    answer = api.http.get("/metrics")
    assert answer.headers["content-type"].startswith("text/plain; version=0.0.4")
    lines = answer.text.splitlines()
    assert 'sweepmill_requests_total{method="GET",route="/v1/sweeps/{key}",status="200"} 1.0' in lines
    assert 'sweepmill_requests_total{method="GET",route="/v1/sweeps/{key}",status="404"} 1.0' in lines
    assert 'sweepmill_requests_total{method="GET",route="none",status="404"} 1.0' in lines
    assert "sweepmill_pool_workers 0.0" in lines
    assert "made" not in answer.text
    assert sweep.key not in answer.text
