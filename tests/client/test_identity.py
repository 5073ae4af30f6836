import json
from pathlib import Path
from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from support.specs import small, transition
from sweepmill.ensemble import Ensemble
from sweepmill.identity import canonical, key_of
from sweepmill.observation import observation_from_normal_form
from sweepmill.sweep import Sweep

GOLDEN = Path(__file__).parents[1] / "golden" / "keys.json"


def test_canonical_json_agrees_with_the_examples_of_rfc_8785() -> None:
    # RFC 8785, section 3.2.2 and appendix B: numbers as ECMAScript writes them, members sorted
    assert canonical({"b": 1.0, "a": [1e30, 4.50, 2e-3, 0.000000001]}) == '{"a":[1e+30,4.5,0.002,1e-9],"b":1}'


@pytest.mark.parametrize("case", json.loads(GOLDEN.read_text()), ids=lambda case: case["title"])
def test_keys_are_those_of_the_golden_file(case: dict[str, Any]) -> None:
    sweep = Sweep.parse(case["specification"])
    assert sweep.canonical() == case["canonical"]
    assert sweep.key == case["key"]
    assert [point.ensemble.key for point in sweep.points][:20] == case["ensembles"]
    assert {item.name: item.observation.key for item in sweep.observations} == case["observations"]


def shuffled(draw: st.DrawFn, value: Any) -> Any:
    """The same data with the members of every table in another order."""
    if isinstance(value, dict):
        items = draw(st.permutations(list(value.items())))
        return {name: shuffled(draw, item) for name, item in items}
    return [shuffled(draw, item) for item in value] if isinstance(value, list) else value


RATES = st.lists(st.integers(0, 1000), min_size=1, max_size=4, unique=True)


@st.composite
def specifications(draw: st.DrawFn) -> dict[str, Any]:
    observe: list[dict[str, Any]] = [{"quantity": "entropy"}]
    observe[0]["at"] = draw(st.sampled_from(["last-cell", "end", [1, 4], {"every": 4}]))
    if draw(st.booleans()):
        observe.append({"name": "i3", "quantity": "tripartite-information"})
    return small(
        circuit__sites=draw(st.lists(st.sampled_from([4, 8, 12, 16]), min_size=1, max_size=3, unique=True)),
        circuit__measurement_rate=[n / 1000 for n in draw(RATES)],
        circuit__replicate=draw(st.sampled_from([0, 1])),
        circuit__layers=draw(st.sampled_from([{"per_site": 2}, 8, [8, 10]])),
        observe=observe,
        stop__trajectories=draw(st.sampled_from([300, 400])),
    )


@settings(max_examples=60, deadline=None)
@given(st.data(), specifications())
def test_the_key_does_not_depend_on_field_order(data: st.DataObject, spec: dict[str, Any]) -> None:
    other = data.draw(st.composite(lambda draw: shuffled(draw, spec))())
    assert Sweep.parse(other).key == Sweep.parse(spec).key


@settings(max_examples=40, deadline=None)
@given(specifications(), st.text(max_size=20).filter(str.isprintable), st.integers(-10, 10))
def test_the_key_does_not_depend_on_label_and_priority(spec: dict[str, Any], label: str, priority: int) -> None:
    assert Sweep.parse({**spec, "label": label, "priority": priority}).key == Sweep.parse(spec).key


@settings(max_examples=40, deadline=None)
@given(specifications())
def test_the_normal_form_is_a_specification_of_the_same_sweep(spec: dict[str, Any]) -> None:
    sweep = Sweep.parse(spec)
    again = Sweep.parse(json.loads(sweep.canonical()))
    assert again.canonical() == sweep.canonical()
    assert [p.ensemble.key for p in again.points] == [p.ensemble.key for p in sweep.points]


@settings(max_examples=150, deadline=None)
@given(specifications(), specifications())
def test_unequal_normal_forms_have_unequal_keys(one: dict[str, Any], two: dict[str, Any]) -> None:
    a, b = Sweep.parse(one), Sweep.parse(two)
    assert (a.normalized() == b.normalized()) == (a.key == b.key)


@pytest.mark.parametrize("spelling", ["0.10", "0.1", "1e-1", "0.10000000000000001", "100.0e-3"])
def test_the_key_does_not_depend_on_the_spelling_of_a_number(spelling: str) -> None:
    spec = json.loads(json.dumps(small(circuit__measurement_rate="RATE")).replace('"RATE"', spelling))
    assert Sweep.parse(spec).key == Sweep.parse(small(circuit__measurement_rate=0.1)).key


def test_a_range_is_the_list_of_its_values() -> None:
    listed = transition(circuit__measurement_rate=[0.13, 0.14, 0.15, 0.16, 0.17, 0.18, 0.19])
    stepped = transition(circuit__measurement_rate={"from": 0.13, "to": 0.19, "step": 0.01})
    assert Sweep.parse(listed).key == Sweep.parse(stepped).key == Sweep.parse(transition()).key


def test_layers_per_site_and_the_integer_are_the_same_for_one_size() -> None:
    per_site, integer = small(circuit__sites=32, circuit__layers={"per_site": 4}), small(circuit__sites=32)
    integer["circuit"]["layers"] = 128
    assert Sweep.parse(per_site).key == Sweep.parse(integer).key


def test_spelled_out_defaults_do_not_change_the_key() -> None:
    spelled = small(stop__at_least=200, stop__standard_error=[])
    spelled["circuit"] |= {"boundary": "periodic", "initial_state": ["zeros"], "replicate": 0}
    spelled["observe"][0] |= {"name": "entropy", "region": "half", "at": "last-cell", "histogram": False}
    assert Sweep.parse(spelled).key == Sweep.parse(small()).key
    spelled["circuit"]["trajectories"] = 300  # the block's own cap, equal to the common one
    assert Sweep.parse(spelled).key == Sweep.parse(small()).key


def test_the_order_of_observations_rules_and_regions_does_not_change_the_key() -> None:
    rules = [{"of": "i3", "below": 0.1}, {"of": "entropy", "below": 0.2}]
    one = small(stop__standard_error=rules)
    two = small(stop__standard_error=rules[::-1], observe=small()["observe"][::-1])
    assert Sweep.parse(one).key == Sweep.parse(two).key
    regions = [[3, 1], [6, 7]]
    keys = {
        Sweep.parse(small(observe=[{"quantity": "mutual-information", "regions": order}])).key
        for order in (regions, regions[::-1])
    }
    assert len(keys) == 1


def test_an_observation_keeps_its_key_under_any_name() -> None:
    plain, named = Sweep.parse(small()), Sweep.parse(small(observe=[{"quantity": "entropy", "name": "s"}]))
    assert plain.observations[0].observation.key == named.observations[0].observation.key
    assert plain.key != named.key


def test_ensembles_and_observations_are_restored_from_their_normal_forms() -> None:
    sweep = Sweep.parse(
        transition(circuit__boundary=["open", "periodic"], observe=[{"quantity": "entropy"}], stop__standard_error=[])
    )
    for point in sweep.points:
        form = json.loads(canonical(point.ensemble.normal_form()))
        assert Ensemble.from_normal_form(form).key == point.ensemble.key == key_of(form)
    for item in Sweep.parse(transition()).observations:
        form = json.loads(canonical(item.observation.normal_form()))
        assert observation_from_normal_form(form).key == item.observation.key
