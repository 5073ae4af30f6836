"""Submitting, listing, amending, withdrawing: over HTTP, on both databases."""

import json
from collections.abc import Iterator

import pytest

from support.api import Api, reading_only, sampled_by_hand, serving
from support.specs import small
from support.sweeps import small_sweep
from sweepmill.messages import Estimate, ProgressPage, Submitted, SweepList, SweepStatus
from sweepmill.sweep import Sweep

JSON = {"Content-Type": "application/json"}


@pytest.fixture
def api(database_url: str) -> Iterator[Api]:
    with serving(reading_only(database_url)) as running:
        yield running


def test_a_new_sweep_is_created_and_the_same_again_is_joined(api: Api) -> None:
    sweep = small_sweep()
    first = api.submit(sweep, **{"Sweepmill-Owner": "ada"})
    assert first.status_code == 201
    again = api.submit(sweep, **{"Sweepmill-Owner": "ben"})
    assert again.status_code == 200
    answer = Submitted.model_validate_json(again.content)
    assert (answer.key, answer.created) == (sweep.key, False)
    assert [request.owner for request in answer.status.requests] == ["ada", "ben"]


def test_the_answer_says_what_is_sampled_already(api: Api) -> None:
    sweep = small_sweep(cap=40)
    api.submit(sweep)
    sampled_by_hand(api.store, sweep, 30)
    longer = Submitted.model_validate_json(api.submit(small_sweep(cap=60)).content)
    assert (longer.sampled_ensembles, longer.sampled_trajectories) == (0, 90)
    shorter = Submitted.model_validate_json(api.submit(small_sweep(cap=20)).content)
    assert (shorter.sampled_ensembles, shorter.sampled_trajectories) == (3, 60)


def test_an_estimate_stores_nothing_and_turns_to_measured_costs(api: Api) -> None:
    sweep = small_sweep(cap=50)
    before = Estimate.model_validate_json(api.http.post("/v1/estimate", json=sweep.normalized()).content)
    assert (before.key, before.ensembles, before.trajectories_cap) == (sweep.key, 3, 150)
    assert (before.core_seconds_from, before.sampled_trajectories) == ("default", 0)
    assert before.core_seconds > 0
    assert api.http.get("/v1/sweeps").json()["sweeps"] == []
    api.submit(sweep)
    sampled_by_hand(api.store, sweep, 25)
    after = Estimate.model_validate_json(api.http.post("/v1/estimate", json=sweep.normalized()).content)
    assert (after.core_seconds_from, after.sampled_trajectories) == ("measured", 75)


def test_a_refused_specification_lists_every_fault_and_stores_nothing(api: Api) -> None:
    bad = small(circuit__sites=[9, 12], circuit__measurement_rate=1.5) | {"color": "red"}
    answer = api.http.post("/v1/sweeps", json=bad)
    assert answer.status_code == 422
    assert answer.headers["content-type"] == "application/problem+json"
    paths = {fault["path"] for fault in answer.json()["faults"]}
    assert "color" in paths
    assert "nothing is stored" in answer.json()["detail"]
    assert api.http.get("/v1/sweeps").json()["sweeps"] == []


def test_lists_are_paged_and_filtered(api: Api) -> None:
    sweeps = [small_sweep(cap=cap) for cap in (10, 20, 30)]
    for sweep, owner in zip(sweeps, ("ada", "ben", "ada"), strict=True):
        api.submit(sweep, **{"Sweepmill-Owner": owner})
    page = SweepList.model_validate_json(api.http.get("/v1/sweeps", params={"limit": 2}).content)
    assert [status.key for status in page.sweeps] == [sweeps[2].key, sweeps[1].key]
    rest = SweepList.model_validate_json(api.http.get("/v1/sweeps", params={"after": page.next}).content)
    assert [status.key for status in rest.sweeps] == [sweeps[0].key]
    assert rest.next is None
    mine = SweepList.model_validate_json(api.http.get("/v1/sweeps", params={"owner": "ada"}).content)
    assert [status.key for status in mine.sweeps] == [sweeps[2].key, sweeps[0].key]
    sampled_by_hand(api.store, sweeps[0], 10, owner="ada")
    settled = SweepList.model_validate_json(api.http.get("/v1/sweeps", params={"state": "settled"}).content)
    assert [status.key for status in settled.sweeps] == [sweeps[0].key]
    assert api.http.get("/v1/sweeps", params={"family": "hybrid"}).json()["sweeps"] == []


def test_a_sweep_is_found_by_the_beginning_of_its_key(api: Api) -> None:
    sweep = small_sweep()
    api.submit(sweep)
    status = SweepStatus.model_validate_json(api.http.get(f"/v1/sweeps/{sweep.key[:8]}").content)
    assert (status.key, status.state) == (sweep.key, "waiting")
    assert api.http.get(f"/v1/sweeps/{sweep.key[:7]}").status_code == 422
    assert api.http.get("/v1/sweeps/" + "g" * 9).status_code == 422
    other = "0" * 9 if not sweep.key.startswith("0" * 9) else "1" * 9
    assert api.http.get(f"/v1/sweeps/{other}").status_code == 404


def test_progress_is_paged_and_since_shows_changes_only(api: Api) -> None:
    sweep = small_sweep(cap=40)
    api.submit(sweep)
    path = f"/v1/sweeps/{sweep.key}/ensembles"
    page = ProgressPage.model_validate_json(api.http.get(path, params={"limit": 2}).content)
    assert [one.ordinal for one in page.ensembles] == [0, 1]
    rest = ProgressPage.model_validate_json(api.http.get(path, params={"after": page.next}).content)
    assert [one.ordinal for one in rest.ensembles] == [2]
    one = Sweep.parse(sweep.normalized() | {"circuit": {**sweep.normalized()["circuit"][0], "measurement_rate": 0.4}})
    api.submit(one)
    sampled_by_hand(api.store, one, 7)
    changed = ProgressPage.model_validate_json(api.http.get(path, params={"since": page.commit}).content)
    assert [(item.ordinal, item.trajectories) for item in changed.ensembles] == [(2, 7)]


def test_label_and_priority_of_ones_own_request_are_amended(api: Api) -> None:
    sweep = small_sweep()
    api.submit(sweep)
    path = f"/v1/sweeps/{sweep.key}"
    both = SweepStatus.model_validate_json(api.http.patch(path, json={"label": "first", "priority": 3}).content)
    assert (both.requests[0].label, both.requests[0].priority) == ("first", 3)
    gone = SweepStatus.model_validate_json(api.http.patch(path, json={"label": None}).content)
    assert (gone.requests[0].label, gone.requests[0].priority) == (None, 3)
    assert api.http.patch(path, json={"priority": 11}).status_code == 422
    assert api.http.patch(path, json={"priority": None}).status_code == 422
    assert api.http.patch(path, json={"colour": "red"}).status_code == 422
    assert api.http.patch(path, json={"priority": 1}, headers={"Sweepmill-Owner": "ben"}).status_code == 404


def test_withdrawing_keeps_what_was_sampled_and_submitting_restores(api: Api) -> None:
    sweep = small_sweep(cap=40)
    api.submit(sweep)
    sampled_by_hand(api.store, sweep, 10)
    path = f"/v1/sweeps/{sweep.key}"
    gone = SweepStatus.model_validate_json(api.http.delete(path).content)
    assert (gone.state, gone.trajectories, gone.requests) == ("withdrawn", 30, [])
    again = api.http.delete(path)
    assert (again.status_code, again.json()["detail"]) == (404, f"local does not request sweep {sweep.key}")
    assert api.submit(sweep).json()["status"]["state"] == "sampling"


def test_text_that_cannot_be_stored_is_refused(api: Api) -> None:
    """Half a character of UTF-16 nowhere; NUL, which SQLite takes and Postgres does not, where it cannot be."""
    body = small(label="\ud800")
    assert api.http.post("/v1/sweeps", content=json.dumps(body), headers=JSON).status_code == 422
    zero = api.http.post("/v1/sweeps", content=json.dumps(small(label="\0")), headers=JSON)
    assert zero.status_code in (201, 422)
    for query in ({"owner": "\0"}, {"family": "\0"}, {"after": "\0"}, {"after": "0" * 64}):
        assert api.http.get("/v1/sweeps", params=query).status_code in (404, 422)


def test_numbers_no_database_takes_are_refused(api: Api) -> None:
    sweep = small_sweep()
    api.submit(sweep)
    for query in ({"since": 2**63}, {"after": 2**63}, {"after": -1}, {"limit": 2**63}):
        assert api.http.get(f"/v1/sweeps/{sweep.key}/ensembles", params=query).status_code == 422
    assert api.http.get(f"/v1/sweeps/{sweep.key}/events", params={"after": 2**63}).status_code == 422


def test_an_owner_has_a_plain_name(api: Api) -> None:
    answer = api.submit(small_sweep(), **{"Sweepmill-Owner": "ada; drop"})
    assert answer.status_code == 422
    assert answer.json()["faults"][0]["path"] == "header.Sweepmill-Owner"
