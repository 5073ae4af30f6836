"""Circuits written as data: parameters as axes, normal forms, one key for several spellings."""

import json
from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from support.circuits import GATES, Z, ensembles, faults, layered, only, specification, step
from sweepmill.ensemble import Ensemble
from sweepmill.frozen import FrozenTable
from sweepmill.identity import canonical, key_of
from sweepmill.sweep import Sweep

P: dict[str, Any] = {"parameter": "p"}
MIXTURE = [
    {"weight": P, "steps": [{"measure": "ZZ"}]},
    {"weight": {**P, "complement": True}, "steps": [{"apply": "cnot"}, {"measure": "xx", "rate": 0.5}]},
]


def test_parameters_are_axes_before_the_layers_and_no_part_of_the_identity() -> None:
    spec = layered([GATES, Z | {"rate": P}], sites=[4, 8], replicate=[0, 1], parameters={"p": [0.2, 0.1]})
    sweep = Sweep.parse(spec)
    assert sweep.axes == ("sites", "p", "replicate")
    assert [(e.sites, e.labels["p"], e.parameters["replicate"]) for e in ensembles(spec)][:5] == [
        *((4, 0.2, 0), (4, 0.2, 1), (4, 0.1, 0), (4, 0.1, 1), (8, 0.2, 0))
    ]
    literal = ensembles(layered([GATES, Z | {"rate": 0.2}], sites=4))[0]
    assert (literal, literal.key) == (ensembles(spec)[0], ensembles(spec)[0].key)


def test_a_parameter_may_differ_between_blocks_and_be_an_axis_there() -> None:
    blocks = [layered([GATES, Z | {"rate": P}], parameters={"p": p})["circuit"] for p in (0.1, 0.2)]
    sweep = Sweep.parse({**layered([GATES]), "circuit": blocks})
    assert sweep.axes == ("p",)


def test_circuits_of_several_blocks_are_told_apart_by_name_or_by_parameters_of_their_own() -> None:
    one, other = layered([GATES], name="gates")["circuit"], layered([Z], name="nothing but Z")["circuit"]
    sweep = Sweep.parse({**layered([GATES]), "circuit": [one, other]})
    assert sweep.axes == ("circuit",)
    assert [point.ensemble.labels["circuit"] for point in sweep.points] == ["gates", "nothing but Z"]
    assert sweep.points[0].ensemble.key == ensembles(layered([GATES]))[0].key
    plain, with_p = layered([GATES])["circuit"], layered([GATES, Z | {"rate": P}], parameters={"p": 0.1})["circuit"]
    assert Sweep.parse({**layered([GATES]), "circuit": [plain, with_p]}).axes == ("p",)


def test_fields_that_other_families_do_not_have_are_no_axes() -> None:
    hybrid = {"family": "hybrid-clifford", "sites": 8, "measurement_rate": 0.1, "layers": 4}
    sweep = Sweep.parse({**layered([GATES]), "circuit": [hybrid, layered([GATES])["circuit"]]})
    assert sweep.axes == ("family",)


def test_a_complement_is_taken_in_decimal_arithmetic() -> None:
    form = only(layered([Z | {"rate": {**P, "complement": True}}], parameters={"p": 0.9}))
    assert form["repeat"][0][0]["rate"] == 0.1


def test_parameters_stand_anywhere_a_number_of_a_rate_or_weight_stands() -> None:
    rate = {"profile": "quasi-periodic", "by": "site", "mean": P, "amplitude": 0.1, "wavelength": 1.618033988749895}
    spec = layered([Z | {"rate": rate}, {"choose": MIXTURE, "on": "bonds"}], parameters={"p": [0.25, 0.5]})
    measured, chosen = ensembles(spec)[0].normal_form()["repeat"][0]
    assert measured["rate"] == {
        "profile": "quasi-periodic",
        "by": "site",
        "mean": 0.25,
        "amplitude": 0.1,
        "wavelength": 1.61803398875,
        "phase": 0,
    }
    assert chosen["choose"] == [
        {"weight": 0.25, "steps": [{"measure": "ZZ"}]},
        {"weight": 0.75, "steps": [{"apply": "cx"}, {"measure": "XX", "rate": 0.5}]},
    ]


@pytest.mark.parametrize(
    ("one", "other"),
    [
        ({"apply": "CNOT", "on": "bonds"}, {"apply": "cx", "on": {"blocks": {"width": 2}}}),
        ({"apply": "S_DAG", "on": "sites"}, {"apply": "sdg", "on": {"sublattice": {"every": 1}}}),
        ({"apply": "Uniform_Clifford", "on": "bonds_from_0"}, GATES),
        (
            {"apply": "h", "on": {"blocks": {"width": 1, "every": 2, "from": 1}}},
            {"apply": "h", "on": {"sublattice": {"from": 1, "every": 2}}},
        ),
        (
            {"measure": "zz", "on": {"blocks": {"width": 2, "from": 1, "every": 2}}},
            {"measure": "ZZ", "on": "bonds-from-1"},
        ),
        (Z | {"rate": 1.0, "recorded": True, "forced": False}, Z),
        (Z | {"rate": {"profile": "list", "by": "site", "values": [0.3, 0.3]}}, Z | {"rate": 0.3}),
        (
            Z | {"rate": {"profile": "list", "by": "layer", "values": [0, 1, 0, 1]}},
            Z | {"rate": {"profile": "list", "by": "layer", "values": [0, 1]}},
        ),
        ({"depolarize": True, "on": "sites", "rate": 0.1}, {"depolarise": True, "on": "sites", "rate": 0.1}),
        (
            {"apply": "cz", "on": {"random-pairs": {"count": 4, "exponent": 0}}},
            {"apply": "cz", "on": {"random_pairs": {}}},
        ),
        (
            {"apply": "cz", "on": {"random_sequential": {"count": {"per_site": 2}, "of": "bonds"}}},
            {"apply": "cz", "on": {"random_sequential": {"count": 16, "of": "bonds"}}},
        ),
    ],
)
def test_two_spellings_are_one_circuit(one: dict[str, Any], other: dict[str, Any]) -> None:
    assert step(**one) == step(**other)
    assert len({ensembles(layered([item]))[0].key for item in (one, other)}) == 1


@pytest.mark.parametrize("boundary", ["periodic", "open"])
@pytest.mark.parametrize("width", [1, 2, 3, 4])
def test_blocks_stay_blocks_where_no_word_means_the_same(boundary: str, width: int) -> None:
    on = step(depolarise=True, on={"blocks": {"width": width, "from": 1, "every": 3}}, rate=0.5)["on"]
    kind = "sublattice" if width == 1 else "blocks"
    assert on == {kind: {**({"width": width} if width > 1 else {}), "from": 1, "every": 3}}


def test_listed_places_stay_as_they_are_in_their_order() -> None:
    places = [[3, 1], [0, 7], [1, 3]]
    assert step(apply="cx", on={"places": places}) == {"apply": "cx", "on": {"places": places}}


def test_layers_before_are_not_counted_and_layers_after_are() -> None:
    swap = {"swap_in": "reference", "on": {"sublattice": {"every": 3}}}
    (ensemble,) = ensembles(layered([GATES], [Z], before=[[swap], [GATES]], after=[[Z]], layers=6))
    assert (ensemble.layers, ensemble.cell, ensemble.references) == (7, 2, 3)


def test_the_last_cell_is_not_read_where_layers_follow_the_circuit() -> None:
    spec = layered([GATES, Z], after=[[Z]]) | {"observe": [{"quantity": "record-bits"}]}
    assert 'use at = "end" or a list of layers' in faults(spec)["observe[0].at"]
    assert faults(spec | {"observe": [{"quantity": "record-bits", "at": [4, 5]}]}) == {}
    assert faults(layered([GATES, Z]) | {"observe": [{"quantity": "record-bits"}]}) == {}


def test_references_of_every_swap_count() -> None:
    swap = {"swap-in": "reference", "on": "sites"}
    one = {"swap_in": "reference", "on": {"places": [[2]]}}
    assert ensembles(layered([GATES], before=[[swap]], after=[[one]]))[0].references == 9


def test_the_circuit_of_an_ensemble_cannot_be_changed() -> None:
    (ensemble,) = ensembles(layered([GATES, Z]))
    table = ensemble.parameters["repeat"][0][0]
    assert isinstance(table, FrozenTable)
    assert hash(ensemble.parameters["repeat"]) == hash(
        Ensemble.of("layered", **ensemble.parameters).parameters["repeat"]
    )
    with pytest.raises(TypeError, match="cannot be changed"):
        table["on"] = "sites"
    with pytest.raises(TypeError, match="cannot be changed"):
        table.pop("on")
    ensemble.normal_form()["repeat"][0][0]["on"] = "sites"
    assert ensemble.normal_form()["repeat"][0][0]["on"] == "bonds-from-0"


def test_the_specification_keeps_parameters_by_name_and_synonyms_folded() -> None:
    spec = layered([{"choose": MIXTURE, "on": "bonds_from_0"}], parameters={"p": {"from": 0, "to": 1, "step": 0.5}})
    (block,) = Sweep.parse(spec).normalized()["circuit"]
    assert block["parameters"] == {"p": [0, 0.5, 1]}
    assert block["repeat"][0][0]["choose"][1] == {
        "weight": {"parameter": "p", "complement": True},
        "steps": [{"apply": "cx"}, {"measure": "XX", "rate": 0.5}],
    }


def test_spellings_that_no_size_tells_apart_are_folded_in_the_specification_too() -> None:
    constant = {"profile": "list", "by": "site", "values": [0.5, 0.5]}
    one = layered(
        [Z | {"on": {"blocks": {"width": 1}}, "rate": constant}, {"apply": "CX", "on": {"blocks": {"width": 2}}}]
    )
    assert Sweep.parse(one).key == Sweep.parse(layered([Z | {"rate": 0.5}, {"apply": "cx", "on": "bonds"}])).key


NUMBERS = st.integers(0, 1000).map(lambda n: n / 1000)
RATES = st.one_of(
    NUMBERS,
    st.just(P),
    st.builds(lambda v, by: {"profile": "list", "by": by, "values": v}, st.lists(NUMBERS, min_size=1, max_size=4),
              st.sampled_from(["site", "layer"])),
    st.builds(lambda a, b: {"disorder": "two-valued", "values": [a, b], "weight": 0.25}, NUMBERS, NUMBERS),
    st.builds(lambda a: {"disorder": "power-law", "exponent": a, "largest": 0.5}, NUMBERS),
)  # fmt: skip
ONE = st.sampled_from(["sites", {"sublattice": {"every": 3}}, {"blocks": {"width": 1, "from": 2, "every": 2}}])
TWO = st.sampled_from(
    ["bonds", "bonds-from-1", {"blocks": {"width": 2, "every": 2}}, {"places": [[0, 2], [5, 1]]}, {"random_pairs": {}}]
)
FIXED_TWO = TWO.filter(lambda on: "random_pairs" not in on)
STEPS = st.one_of(
    st.builds(lambda on, rate: {"measure": "Z", "on": on, "rate": rate}, ONE, RATES),
    st.builds(lambda on, rate: {"apply": "iswap-class", "on": on, "rate": rate}, FIXED_TWO, RATES),
    st.builds(lambda on, rate: {"measure": "XY", "on": on, "recorded": False, "rate": rate}, FIXED_TWO, RATES),
    st.builds(lambda on, rate: {"reset": True, "on": on, "rate": rate}, ONE, RATES),
    st.builds(
        lambda on, weight: {
            "on": on,
            "choose": [{"weight": 1, "steps": [{"apply": "CZ"}]}, {"weight": weight, "steps": [{"measure": "ZZ"}]}],
        },
        TWO,
        NUMBERS,
    ),
)
PROGRAMS = st.lists(st.lists(STEPS, max_size=3), min_size=1, max_size=3)


@settings(max_examples=60, deadline=None)
@given(PROGRAMS, st.lists(st.lists(STEPS, max_size=2), max_size=2), st.sampled_from(["periodic", "open"]))
def test_the_normal_form_of_a_normal_form_is_itself(
    repeat: list[list[Any]], after: list[list[Any]], boundary: str
) -> None:
    known = {"parameters": {"p": [0.25, 0.75]}} if '"parameter"' in json.dumps([repeat, after]) else {}
    sweep = Sweep.parse(layered(*repeat, after=after, boundary=boundary, **known))
    again = Sweep.parse(json.loads(sweep.canonical()))
    assert again.canonical() == sweep.canonical()
    assert [point.ensemble for point in again.points] == [point.ensemble for point in sweep.points]
    assert [point.ensemble.labels for point in again.points] == [point.ensemble.labels for point in sweep.points]
    for point in sweep.points:
        form = json.loads(canonical(point.ensemble.normal_form()))
        assert only(specification(**{name: value for name, value in form.items() if name != "revision"})) == form
        assert Ensemble.from_normal_form(form) == point.ensemble
        assert Ensemble.from_normal_form(form).key == key_of(form)
