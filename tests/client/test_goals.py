"""Goals in a specification: what they place, what is refused, and what their keys are made of."""

from copy import deepcopy
from typing import Any

import pytest

from sweepmill.errors import SpecificationError
from sweepmill.goals import LAWS, CriticalPointGoal, groups
from sweepmill.sweep import Sweep
from sweepmill_service.stored import expand, stored_goal

POINT: dict[str, Any] = {
    "circuit": {
        "family": "hybrid-clifford",
        "sites": [16, 32],
        "measurement_rate": [0.14, 0.155, 0.18],
        "layers": {"per_site": 4},
    },
    "observe": [{"name": "i3", "quantity": "tripartite-information"}],
    "stop": {
        "trajectories": 4000,
        "critical_point": {"of": "i3", "below": 0.002, "within": [0.13, 0.19], "step": 0.01},
    },
}
LAW: dict[str, Any] = {
    "circuit": {"family": "projective-ising", "sites": [8, 16, 32], "bond_rate": [0.5, 0.4]},
    "observe": [
        {"name": "half", "quantity": "entropy"},
        {"name": "cuts", "quantity": "entropy", "region": "every-cut"},
    ],
    "stop": {
        "trajectories": 4000,
        "law": {"of": "half", "law": "logarithm", "coefficient": "a", "below": 0.02},
    },
}


def changed(base: dict[str, Any], **fields: Any) -> dict[str, Any]:
    """A copy with nested fields changed: `circuit__sites=...`."""
    copy = deepcopy(base)
    for path, value in fields.items():
        *parents, last = path.split("__")
        table = copy
        for name in parents:
            table = table[name]
        table[last] = value
    return copy


def faults(specification: dict[str, Any]) -> list[str]:
    with pytest.raises(SpecificationError) as refused:
        Sweep.parse(specification)
    return str(refused.value).splitlines()


def test_a_search_may_place_the_grid_and_starts_with_the_values_that_are_written() -> None:
    sweep = Sweep.parse(POINT)
    rates = [point.ensemble.columns["measurement_rate"] for point in sweep.points if point.ensemble.sites == 16]
    assert rates == [0.13, 0.14, 0.15, 0.155, 0.16, 0.17, 0.18, 0.19]
    starting = [p.ensemble.columns["measurement_rate"] for p in sweep.points if p.ensemble.key in sweep.starting]
    assert starting == [0.14, 0.155, 0.18] * 2
    assert isinstance(sweep.goal, CriticalPointGoal)
    assert sweep.goal.axis == "measurement_rate"


def test_bounds_step_and_rule_are_part_of_the_key_and_the_name_of_the_axis_may_be_left_out() -> None:
    key = Sweep.parse(POINT).key
    assert Sweep.parse(changed(POINT, stop__critical_point__axis="measurement_rate")).key == key
    others: list[dict[str, Any]] = [{"within": [0.13, 0.2]}, {"step": 0.005}, {"below": 0.001}]
    keys = {
        Sweep.parse(changed(POINT, **{f"stop__critical_point__{name}": value for name, value in one.items()})).key
        for one in others
    }
    assert len(keys | {key}) == 4
    plain = deepcopy(POINT)
    del plain["stop"]["critical_point"]
    assert Sweep.parse(plain).key != key


@pytest.mark.parametrize("specification", [POINT, LAW])
def test_a_stored_specification_expands_to_the_same_ensembles_in_the_same_order(specification: dict[str, Any]) -> None:
    sweep = Sweep.parse(specification)
    stored = expand(sweep.canonical())
    assert [one.key for one in stored.ensembles] == [point.ensemble.key for point in sweep.points]
    assert stored_goal(sweep.canonical()) == sweep.goal


def test_a_parameter_of_a_circuit_written_as_data_can_be_the_axis() -> None:
    layer = [{"measure": "Z", "on": "sites", "rate": {"parameter": "p"}}]
    gates = [{"apply": "uniform-clifford", "on": on} for on in ("bonds-from-0", "bonds-from-1")]
    circuit: dict[str, Any] = {
        "family": "layered",
        "sites": [8, 16],
        "repeat": [[gate, *layer] for gate in gates],
        "parameters": {"p": [0.14, 0.18]},
    }
    sweep = Sweep.parse(changed(POINT, circuit=circuit))
    assert [p.ensemble.columns["p"] for p in sweep.points[:7]] == [0.13, 0.14, 0.15, 0.16, 0.17, 0.18, 0.19]


def test_a_law_has_one_group_of_sizes_for_every_other_value() -> None:
    sweep = Sweep.parse(LAW)
    assert sweep.goal is not None
    found = groups(sweep.goal, [point.ensemble for point in sweep.points])
    assert [one.where for one in found] == [{"bond_rate": 0.5}, {"bond_rate": 0.4}]
    assert [one.sizes for one in found] == [(8.0, 16.0, 32.0)] * 2
    by_cut = Sweep.parse(changed(LAW, stop__law__of="cuts", stop__law__over="position"))
    assert by_cut.goal is not None
    assert len(groups(by_cut.goal, [point.ensemble for point in by_cut.points])) == 6


def test_the_size_of_a_lattice_is_its_width() -> None:
    circuit = {"family": "hybrid-clifford-square", "width": [4, 6], "measurement_rate": [0.14, 0.18]}
    sweep = Sweep.parse(changed(POINT, circuit=circuit, observe=[{"name": "i3", "quantity": "global-entropy"}]))
    assert sweep.goal is not None
    (found,) = groups(sweep.goal, [point.ensemble for point in sweep.points])
    assert set(found.sizes) == {4.0, 6.0}


def test_the_coefficients_are_those_of_the_analysis() -> None:
    laws = pytest.importorskip("sweepmill.analysis").ENTANGLEMENT
    names = {law.name: (*law.coefficients, *([law.exponent.name] if law.exponent else [])) for law in laws}
    assert names == LAWS


@pytest.mark.parametrize(
    ("specification", "fault"),
    [
        (
            changed(POINT, stop__critical_point__step=0.007),
            "stop.critical_point.step: step 0.007 does not lead from 0.13 to 0.19: it stops at 0.186",
        ),
        (
            changed(POINT, stop__critical_point__within=[0.19, 0.13]),
            "stop.critical_point.within: must be two numbers, the smaller first, got 0.19 and 0.13",
        ),
        (
            changed(POINT, stop__critical_point__within=[0.15, 0.19]),
            "stop.critical_point.within: the value 0.14 of measurement_rate lies outside of 0.15 to 0.19",
        ),
        (
            changed(POINT, stop__critical_point__within=[0.1, 1.1]),
            "stop.critical_point.within: a rate is a probability between 0 and 1, got 1.1",
        ),
        (
            changed(POINT, stop__critical_point__step=1e-6),
            "stop.critical_point.step: at most 2000 steps fit between the bounds: take a larger step",
        ),
        (
            changed(POINT, stop__critical_point__axis="sites"),
            "stop.critical_point.axis: 'sites' is not a field with real values of every circuit: "
            "one of measurement_rate",
        ),
        (changed(POINT, circuit__sites=16), "stop.critical_point: needs at least 2 sizes, got 1"),
        (
            changed(POINT, circuit__boundary=["periodic", "open"]),
            "stop.critical_point: one critical point for all circuits of a sweep, and they differ in boundary: "
            "submit one sweep each",
        ),
        (
            changed(POINT, circuit__layers=[32, 64]),
            "stop.critical_point: two ensembles of one size differ only in their layers: "
            "give each size one number of layers",
        ),
        (
            changed(POINT, observe=[{"name": "i3", "quantity": "tripartite-information", "at": {"every": 8}}]),
            "stop.critical_point.of: needs one number per ensemble, and this observation has 8: read it at one time",
        ),
        (
            changed(POINT, stop__critical_point__of="x"),
            "stop.critical_point.of: no observation is named 'x': one of i3",
        ),
        (
            changed(POINT, stop__standard_error={"of": "i3", "below": 0.1}),
            "stop: standard_error and critical_point cannot decide together: keep one of them",
        ),
        (
            changed(POINT, stop__at_least=100),
            "stop.at_least: a goal is judged from at least 128 trajectories per ensemble, got 100",
        ),
        (changed(LAW, stop__law__coefficient="g"), "stop.law.coefficient: 'g' is not a coefficient of this law: a, b"),
        (
            changed(LAW, circuit__sites=[8, 16]),
            "stop.law: needs at least 3 sizes, got 2 where bond_rate = 0.5",
        ),
        (
            changed(LAW, stop__law__over="position"),
            'stop.law.of: a law in the position needs a quantity of every position at one time, such as "every-cut"',
        ),
        (
            changed(LAW, stop__law__of="cuts", stop__law__over="position", circuit__sites=[16, 6]),
            "stop.law.of: 3 positions up to half the chain are too few for this law",
        ),
    ],
)
def test_a_goal_that_does_not_fit_is_refused_with_what_would_pass(specification: dict[str, Any], fault: str) -> None:
    assert fault in faults(specification)
