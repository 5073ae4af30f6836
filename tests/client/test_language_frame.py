"""Outcomes may be forced where a random gate acted last: the others could have probability 0."""

from typing import Any

import pytest

from support.circuits import GATES, Z, ensembles, faults, layered, specification
from sweepmill.ensemble import Ensemble
from sweepmill.presets import layered_form

U: dict[str, Any] = {"apply": "uniform-clifford", "on": "sites"}
FORCED = Z | {"forced": True}
PAIR: dict[str, Any] = {"places": [[0, 1]]}


def at(*sites: int) -> dict[str, Any]:
    """Single sites, in this order."""
    return {"on": {"places": [[site] for site in sites]}}


def chosen(*branches: list[Any], on: Any = "sites") -> dict[str, Any]:
    return {"choose": [{"weight": 1, "steps": steps} for steps in branches], "on": on}


ALLOWED = [
    layered([GATES, FORCED]),
    layered([GATES | {"rotated": True}], [FORCED]),
    layered([GATES | {"apply": "cnot-class"}, FORCED]),
    layered([GATES | {"fixed": "trajectory"}, FORCED], layers=1),
    layered([GATES, FORCED | at(1) | {"rate": 0.5}, GATES | {"rate": 0.5}, FORCED | at(3)]),
    layered([GATES, Z | at(0), {"measure": "ZZ", "on": PAIR, "forced": True}]),
    layered([GATES, {"measure": "ZZ", "on": {"places": [[0, 1], [1, 2], [2, 3]]}, "forced": True}]),
    layered([Z], before=[[U]], after=[[U, FORCED]]),
    layered([{"apply": "h", "on": "sites"}, {"apply": "cz", "on": "bonds"}], before=[[U]], after=[[FORCED]]),
    layered([U], [U, Z], after=[[FORCED | at(2)]], layers=5),
    layered([FORCED | {"rate": 0}]),
    layered([U, Z | {"rate": 0}, chosen([{"apply": "h"}], [{"apply": "s"}]), FORCED]),
    layered([U, chosen([{"measure": "Z", "forced": True}], [{"reset": True}])]),
    layered([Z, chosen([{"apply": "uniform-clifford"}, {"measure": "Z", "forced": True}], [])]),
    layered([{"apply": "uniform-clifford", "on": {"random_pairs": {}}}, FORCED]),
    layered([U, {"measure": "Z", "on": {"random_sequential": {"count": 1, "of": "sites"}}, "forced": True}]),
    layered([U, {"measure": "XY", "on": {"random_pairs": {}}, "forced": True}]),
]
SEQUENTIAL: dict[str, Any] = {"random_sequential": {"count": 8, "of": "bonds"}}
REFUSED = [
    (layered([FORCED, U]), "repeat[0][0]", "since the start"),
    (layered([GATES | {"on": PAIR}, FORCED]), "repeat[0][1]", "on site 2 since the start"),
    (layered([U, FORCED | at(3), FORCED]), "repeat[0][2]", "on site 3 since repeat[0][1]"),
    (layered([U, FORCED | at(3, 3)]), "repeat[0][1]", "on site 3 since repeat[0][1]"),
    (layered([FORCED], before=[[U]]), "repeat[0][0]", "on site 0 since repeat[0][0]"),
    (layered([U, FORCED], [FORCED | at(5)]), "repeat[1][0]", "on site 5 since repeat[0][1]"),
    (layered([U, Z], after=[[FORCED]]), "after[0][0]", "since repeat[0][1]"),
    (layered([U], [U, Z], after=[[FORCED | at(2)]], layers=6), "after[0][0]", "since repeat[1][1]"),
    (layered([U, {"reset": True, **at(1), "rate": 0.1}, FORCED]), "repeat[0][2]", "site 1 since repeat[0][1]"),
    (layered([U, Z | at(1) | {"recorded": False}, FORCED]), "repeat[0][2]", "site 1 since repeat[0][1]"),
    (layered([U | {"rate": 0.99}, FORCED]), "repeat[0][1]", "site 0 since the start"),
    (layered([U | {"fixed": "ensemble"}, FORCED]), "repeat[0][1]", "site 0 since the start"),
    (layered([chosen([{"apply": "uniform-clifford"}], []), FORCED]), "repeat[0][1]", "site 0 since the start"),
    (layered([U, chosen([{"measure": "Z"}], []), FORCED]), "repeat[0][2]", "repeat[0][1].choose[0].steps[0]"),
    (
        layered([U, FORCED, chosen([], [{"measure": "X", "forced": True}])]),
        "repeat[0][2].choose[1].steps[0]",
        "site 0 since repeat[0][1]",
    ),
    (
        layered([{"apply": "uniform-clifford", "on": {"random_pairs": {"count": 3}}}, FORCED]),
        "repeat[0][1]",
        "site 0 since the start",
    ),
    (layered([U, {"measure": "ZZ", "on": SEQUENTIAL, "forced": True}]), "repeat[0][1]", "sites 0, 1, 2, 3, 4, 5, 6, 7"),
    (layered([U, {"measure": "ZZ", "on": SEQUENTIAL}, FORCED]), "repeat[0][2]", "since repeat[0][1]"),
]


@pytest.mark.parametrize("spec", ALLOWED)
def test_outcomes_may_be_forced_after_a_random_gate(spec: dict[str, Any]) -> None:
    assert faults(spec) == {}


@pytest.mark.parametrize(("spec", "step", "words"), REFUSED)
def test_outcomes_without_a_random_gate_before_them_are_not_forced(spec: dict[str, Any], step: str, words: str) -> None:
    found = faults(spec)
    assert set(found) == {f"circuit.{step}.forced"}
    assert words in found[f"circuit.{step}.forced"]


def test_a_definite_gate_carries_the_frame_away_from_a_place_that_is_random_in_part() -> None:
    """A swap brings |0> to site 0, or |1>, whichever the measurement gave: it cannot be forced to be the other."""
    swapped = layered([Z, U | at(0), {"apply": "swap", "on": PAIR}, FORCED | at(0)])
    assert "site 0 since repeat[0][2]" in faults(swapped)["circuit.repeat[0][3].forced"]
    assert faults(layered([Z, U | at(0, 1), {"apply": "swap", "on": PAIR}, FORCED | at(0)])) == {}


def test_a_frame_that_spreads_and_thins_out_is_followed_to_its_end() -> None:
    """Each pass carries what site 0 lost one site further, so that site 3 may be forced in the first three only."""
    steps = [FORCED | at(3), U | at(3), Z | at(0), {"apply": "cx", "on": {"places": [[2, 3], [1, 2], [0, 1]]}}]
    assert faults(layered(steps, before=[[U]], layers=3)) == {}
    assert "since repeat[0][3]" in faults(layered(steps, before=[[U]], layers=9))["circuit.repeat[0][0].forced"]


def test_a_gate_fixed_for_a_trajectory_is_random_only_once() -> None:
    """Where it commutes with Z up to the sign, the first outcome tells the sign that the second one then has."""
    steps = [U | {"fixed": "trajectory"}, FORCED, {"apply": "x", "on": "sites"}]
    assert faults(layered(steps, layers=1)) == {}
    assert "since repeat[0][1]" in faults(layered(steps, layers=2))["circuit.repeat[0][1].forced"]


def test_rates_are_looked_at_with_their_parameters_in_place() -> None:
    certain = {"parameter": "p"}
    spec = layered([U | {"rate": certain}, FORCED | {"rate": 0.5}], parameters={"p": [1, 0.5]})
    assert "circuit.repeat[0][1].forced" in faults(spec)
    spec["circuit"]["parameters"] = {"p": 1}
    assert faults(spec) == {}


@pytest.mark.parametrize("layers", [1, 2, 5, 6])
@pytest.mark.parametrize("sites", [2, 8])
def test_rotated_circuits_with_product_ends_are_written_as_data(sites: int, layers: int) -> None:
    preset = Ensemble.of("rotated-clifford", sites=sites, layers=layers, ends="product")
    form = layered_form(preset)
    (again,) = ensembles(specification(**{name: value for name, value in form.items() if name != "revision"}))
    assert again.normal_form() == form
