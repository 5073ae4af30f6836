"""The circuit of a trajectory over HTTP."""

from collections.abc import Iterator

import openqasm3
import pytest
import stim

from support.api import Api, reading_only, sampled_by_hand, serving
from support.signed import entropies
from support.sweeps import small_sweep
from sweepmill.messages import CircuitText, Trajectory
from sweepmill_worker.circuit_text.write import circuit_text

SWEEP = small_sweep(rates=1, cap=40)
ENSEMBLE = SWEEP.points[0].ensemble
PATH = f"/v1/ensembles/{ENSEMBLE.key}/trajectories/3"


@pytest.fixture
def api(database_url: str) -> Iterator[Api]:
    with serving(reading_only(database_url)) as running:
        running.submit(SWEEP)
        sampled_by_hand(running.store, SWEEP, 5)
        yield running


def test_a_trajectory_has_its_circuit_beside_its_values(api: Api) -> None:
    plain = Trajectory.model_validate_json(api.http.get(PATH).content)
    assert plain.circuit is None
    for language in ("stim", "openqasm3"):
        answer = api.http.get(PATH, params={"circuit": language})
        trajectory = Trajectory.model_validate_json(answer.content)
        text = circuit_text(ENSEMBLE, 3, language)
        assert trajectory.circuit == CircuitText(format=language, text=text)
        assert trajectory.observations == plain.observations
        alone = api.http.get(PATH, params={"circuit": language}, headers={"Accept": "text/plain"})
        assert alone.headers["content-type"] == "text/plain; charset=utf-8"
        assert alone.text == text
    openqasm3.parse(alone.text)


def test_the_circuit_that_is_answered_has_the_entropies_that_were_sampled(api: Api) -> None:
    """One layer of the last cell is the end of the circuit; cut there, the text gives the other one."""
    answer = Trajectory.model_validate_json(api.http.get(PATH, params={"circuit": "stim"}).content)
    assert answer.circuit is not None
    total = 0
    for ticks in (7, 8):
        pieces = answer.circuit.text.split("TICK")
        simulator = stim.TableauSimulator(seed=1)
        simulator.set_num_qubits(8)
        simulator.do(stim.Circuit("TICK".join(pieces[:ticks])))
        (half,) = entropies(simulator.canonical_stabilizers(), 8, [range(4)])
        total += half
    (found,) = (one for one in answer.observations if one.observation["quantity"] == "entropy")
    assert found.values[0]["value"] * 2 == total


def test_what_cannot_be_answered_says_why(api: Api, database_url: str) -> None:
    assert api.http.get(PATH, params={"circuit": "quil"}).status_code == 422
    nothing = api.http.get(PATH, headers={"Accept": "text/plain"})
    assert (nothing.status_code, "without `circuit`" in nothing.json()["detail"]) == (406, True)
    with serving(reading_only(database_url, limits={"circuit_operations": 20})) as narrow:
        long = narrow.http.get(PATH, params={"circuit": "stim"})
        assert long.status_code == 422
        for said in ("more than 20 operations", "limits.circuit_operations", "--circuit stim"):
            assert said in long.json()["detail"]
        assert narrow.http.get(PATH).status_code == 200
