"""What the language of circuits refuses: every fault, each with its path and what would pass."""

from typing import Any

import pytest

from support.circuits import GATES, Z, faults, layered

P: dict[str, Any] = {"parameter": "p"}
PAIRS: dict[str, Any] = {"random_pairs": {}}


def rated(rate: Any) -> dict[str, Any]:
    return layered([Z | {"rate": rate}])


def on(places: Any, **step: Any) -> dict[str, Any]:
    return layered([{**(step or {"depolarise": True}), "on": places}])


def chosen(*branches: dict[str, Any], **fields: Any) -> dict[str, Any]:
    return layered([{"choose": list(branches), "on": "sites"}], **fields)


def branch(weight: Any, *steps: dict[str, Any]) -> dict[str, Any]:
    return {"weight": weight, "steps": list(steps)}


STEP = "circuit.repeat[0][0]"
GRAMMAR: list[tuple[dict[str, Any], str, str]] = [
    (layered(), "circuit.repeat", "needs at least one item"),
    (layered([Z], before={"measure": "Z"}), "circuit.before", "must be a list"),
    (layered([3]), STEP, "a step is a table such as"),  # type: ignore[list-item]
    (layered([{"measur": "Z", "on": "sites"}]), STEP, "did you mean 'measure'?"),
    (layered([{"measure": "Z", "apply": "x", "on": "sites"}]), STEP, "got measure and apply"),
    (layered([Z | {"rat": 0.1}]), f"{STEP}.rat", "unknown field"),
    (layered([Z | {"if": "outcome"}]), STEP, "'if': no step can depend on earlier outcomes"),
    (layered([{"feedback": "x", "on": "sites"}]), STEP, "without signs"),
    (layered([{"measure": "Z"}]), f"{STEP}.on", "is missing"),
    (layered([{"apply": "cnott", "on": "bonds"}]), f"{STEP}.apply", "did you mean 'cnot'?"),
    (layered([{"apply": "t", "on": "sites"}]), f"{STEP}.apply", "gates: uniform-clifford, identity-class"),
    (layered([{"measure": "ZI", "on": "bonds"}]), f"{STEP}.measure", "a product of the letters X, Y and Z"),
    (layered([{"measure": "ZZZZZ", "on": "sites"}]), f"{STEP}.measure", "at most 4 sites, got 5"),
    (layered([{"depolarise": False, "on": "sites"}]), f"{STEP}.depolarise", "must be true"),
    (layered([{"swap_in": "ancilla", "on": "sites"}]), f"{STEP}.swap_in", "must be 'reference'"),
    (layered([GATES | {"fixed": "layer"}]), f"{STEP}.fixed", "must be 'trajectory' or 'ensemble'"),
    (on("sitse"), f"{STEP}.on", "did you mean 'sites'?"),
    (on({"place": [[0]]}), f"{STEP}.on", "did you mean 'places'?"),
    (on({"blocks": {"width": 5}}), f"{STEP}.on.blocks.width", "less than or equal to 4"),
    (on({"blocks": {"every": 2}}), f"{STEP}.on.blocks.width", "is missing"),
    (on({"sublattice": {"every": 0}}), f"{STEP}.on.sublattice.every", "greater than or equal to 1"),
    (on({"places": [[0, -1]]}), f"{STEP}.on.places[0][1]", "greater than or equal to 0"),
    (on({"random_pairs": {"count": "some"}}), f"{STEP}.on.random_pairs.count", "must be 'all'"),
    (on({"random_sequential": {"count": 3, "of": "pairs"}}), f"{STEP}.on.random_sequential.of", "'sites' or 'bonds'"),
    (rated("half"), f"{STEP}.rate", "must be a number"),
    (rated({"value": 0.1}), f"{STEP}.rate", "'parameter', 'profile' or 'disorder'"),
    (rated({"profile": "stripes"}), f"{STEP}.rate", "did you mean 'stripe'?"),
    (rated({"disorder": "normal"}), f"{STEP}.rate", "disorders: uniform, two-valued, power-law"),
    (rated({"profile": "list", "by": "time", "values": [0]}), f"{STEP}.rate.by", "must be 'site' or 'layer'"),
    (rated({"profile": "list", "by": "site", "values": [0, "x"]}), f"{STEP}.rate.values[1]", "must be a number"),
    (chosen(), f"{STEP}.choose", "needs at least one item"),
    (chosen({"steps": []}), f"{STEP}.choose[0].weight", "is missing"),
    (chosen(branch(1, {"mesure": "Z"})), f"{STEP}.choose[0].steps[0]", "did you mean 'measure'?"),
]
MEANING: list[tuple[dict[str, Any], str, str]] = [
    (rated({"parameter": "q"}), f"{STEP}.rate.parameter", "unknown parameter 'q': the circuit has no parameters"),
    (layered([Z | {"rate": {"parameter": "q"}}], parameters={"p": 0.1}), f"{STEP}.rate.parameter", "one of p"),
    (layered([Z], parameters={"p": 0.1}), "circuit.parameters.p", "no step uses this parameter"),
    (layered([Z], parameters={"sites": 0.1}), "circuit.parameters.sites", "is a field of a circuit"),
    (layered([Z], parameters={"mean": 0.1}), "circuit.parameters.mean", "a column of a table"),
    (layered([Z], parameters={"1p": 0.1}), "circuit.parameters.1p", "letters, digits and underscores"),
    (
        layered([Z | {"rate": P}], parameters={"p": [0.1, 0.1]}),
        "circuit.parameters.p[1]",
        "stands in this axis already",
    ),
    (layered([{"apply": "cx", "on": "sites"}]), f"{STEP}.apply", "cx acts on 2 sites, the places have 1"),
    (layered([{"apply": "swap-class", "on": "sites"}]), f"{STEP}.apply", "swap-class acts on 2 sites"),
    (on({"places": [[0, 1, 2]]}, apply="uniform-clifford"), f"{STEP}.apply", "acts on 1 or 2 sites"),
    (layered([{"measure": "Z", "on": "bonds"}]), f"{STEP}.measure", "Z is a product of 1 site, the places have 2"),
    (layered([{"apply": "cx", "on": "bonds", "fixed": "ensemble"}]), f"{STEP}.fixed", "cx is a definite gate"),
    (on(PAIRS, apply="uniform-clifford", fixed="trajectory"), f"{STEP}.fixed", "drawn anew in every layer"),
    (layered([{"apply": "cz", "on": "bonds", "rotated": True}]), f"{STEP}.rotated", "cz is a definite one"),
    (layered([{"apply": "uniform-clifford", "on": "sites", "rotated": True}]), f"{STEP}.rotated", "two sites"),
    (layered([GATES | {"rotated": True, "fixed": "ensemble"}]), f"{STEP}.rotated", "its projections are forced"),
    (on({"places": [[0, 1], [2]]}), f"{STEP}.on.places[1]", "equally many sites: 2 in the first, 1 here"),
    (on({"places": [[0, 1], [2, 2]]}), f"{STEP}.on.places[1]", "distinct"),
    (on({"places": [[0, 1, 2, 3, 4]]}), f"{STEP}.on.places[0]", "1 to 4 sites, got 5"),
    (on({"places": [[7], [8]]}), f"{STEP}.on.places[1]", "site 8 is outside a chain of 8 sites (0 to 7)"),
    (on({"sublattice": {"from": 8, "every": 2}}), f"{STEP}.on.sublattice.from", "outside a chain of 8"),
    (on({"blocks": {"width": 2, "from": 9}}), f"{STEP}.on.blocks.from", "outside a chain of 8"),
    (on({"random_pairs": {"count": 5}}), f"{STEP}.on.random_pairs.count", "at most 4 disjoint pairs, got 5"),
    (on({"random_pairs": {"exponent": -1}}), f"{STEP}.on.random_pairs.exponent", "exponent 0 to 64, got -1"),
    (
        on({"random_sequential": {"count": {"per_site": 0.3}, "of": "sites"}}),
        f"{STEP}.on.random_sequential.count",
        "per_site = 0.3 gives 2.4 at 8 sites",
    ),
    (rated(1.5), f"{STEP}.rate", "between 0 and 1, got 1.5"),
    (rated(1e-9), f"{STEP}.rate", "0 or at least 1e-06"),
    (layered([Z | {"rate": P}], parameters={"p": [0.5, 2]}), f"{STEP}.rate", "between 0 and 1, got 2"),
    (rated({"profile": "list", "by": "site", "values": [0, -1]}), f"{STEP}.rate.values[1]", "got -1"),
    (
        rated({"profile": "stripe", "by": "site", "period": 2, "width": 3, "inside": 0, "outside": 1}),
        f"{STEP}.rate.width",
        "exceeds the period, 2",
    ),
    (
        rated({"profile": "quasi-periodic", "by": "site", "mean": 0.2, "amplitude": 0.3, "wavelength": 2}),
        f"{STEP}.rate",
        "reach from -0.1 to 0.5",
    ),
    (
        rated({"profile": "quasi-periodic", "by": "site", "mean": 0.2, "amplitude": 0.1, "wavelength": 0}),
        f"{STEP}.rate.wavelength",
        "greater than 0",
    ),
    (rated({"disorder": "uniform", "from": 0.3, "to": 0.2}), f"{STEP}.rate", "runs upwards"),
    (rated({"disorder": "two-valued", "values": [0, 1], "weight": 2}), f"{STEP}.rate.weight", "between 0 and 1"),
    (rated({"disorder": "power-law", "exponent": -1, "largest": 1}), f"{STEP}.rate.exponent", "-0.9 to 100"),
    (rated({"disorder": "power-law", "exponent": 1, "largest": 0}), f"{STEP}.rate.largest", "greater than 0"),
    (on(PAIRS, depolarise=True, rate={"disorder": "uniform", "from": 0, "to": 1}), f"{STEP}.rate", "drawn anew"),
    (chosen(branch(0), branch(0, {"measure": "Z"})), f"{STEP}.choose", "all weights are 0"),
    (chosen(branch(-1), branch(1)), f"{STEP}.choose[0].weight", "at least 0, got -1"),
    (chosen(branch(1e-9), branch(1)), f"{STEP}.choose[0].weight", "1e-06 of the largest"),
    (chosen(branch({"profile": "list", "by": "layer", "values": [1, 0]})), f"{STEP}.choose", "site 0 in layer 2"),
    (chosen(branch({"disorder": "power-law", "exponent": 0, "largest": 1})), f"{STEP}.choose", "all weights may be 0"),
    (chosen(branch(1, {"measure": "Z", "on": "sites"})), f"{STEP}.choose[0].steps[0].on", "leave 'on' out"),
    (layered([{"swap_in": "reference", "on": "sites"}]), f"{STEP}.swap_in", "not in 'repeat'"),
    (layered([Z], before=[[{"swap_in": "reference", "on": "bonds"}]]), "circuit.before[0][0].on", "single sites"),
    (
        layered([Z], after=[[{"swap_in": "reference", "on": {"random_sequential": {"count": 2, "of": "sites"}}}]]),
        "circuit.after[0][0].on",
        "definite places",
    ),
    (
        layered([Z], before=[[{"choose": [branch(1, {"swap_in": "reference"})], "on": "sites"}]]),
        "circuit.before[0][0].choose[0].steps[0].swap_in",
        "no choice can swap",
    ),
    (layered([Z | {"forced": True}]), f"{STEP}.forced", "could have probability 0"),
    (
        layered([Z | {"forced": True}, GATES | {"fixed": "ensemble"}]),
        f"{STEP}.forced",
        "no random gate certainly",
    ),
    (layered([GATES, Z | {"forced": True, "recorded": False}]), "circuit.repeat[0][1].forced", "not recorded"),
    (layered([Z] * 48), "circuit.repeat[0]", "at most 47 steps, those of branches included, got 48"),
    (chosen(branch(1, *[{"measure": "Z"}] * 47)), "circuit.repeat[0]", "got 48"),
    (layered(*[[Z | {"rate": {"disorder": "uniform", "from": 0, "to": 1}}]] * 49), "circuit", "at most 48 quenched"),
    (layered([GATES], layers={"per_site": 0.3}), "circuit.layers", "must be an integer"),
]


@pytest.mark.parametrize(("spec", "path", "words"), [*GRAMMAR, *MEANING])
def test_a_bad_circuit_is_refused_with_its_path(spec: dict[str, Any], path: str, words: str) -> None:
    found = faults(spec)
    assert path in found, found
    assert words in found[path]


def test_every_fault_of_the_grammar_is_listed() -> None:
    spec = layered(
        [{"apply": "cnott", "on": "bnds", "rate": "x"}, {"measure": "Q", "on": "sites"}],
        [{"measure": "Z", "on": "sites", "rate": {"profile": "list", "by": "site", "values": []}}],
        after=[[{"reset": 1, "on": "sites"}]],
    )
    assert sorted(faults(spec)) == [
        "circuit.after[0][0].reset",
        "circuit.repeat[0][0].apply",
        "circuit.repeat[0][0].on",
        "circuit.repeat[0][0].rate",
        "circuit.repeat[0][1].measure",
        "circuit.repeat[1][0].rate.values",
    ]


def test_every_fault_of_the_meaning_is_listed_also_those_of_other_fields() -> None:
    spec = layered(
        [{"apply": "cx", "on": "sites"}, Z | {"rate": P}, {"measure": "ZZ", "on": {"places": [[0, 0], [8, 1]]}}],
        [Z | {"rate": 2}],
        sites=[8, 8],
        parameters={"q": 0.1},
    )
    assert sorted(faults(spec)) == [
        "circuit.parameters.q",
        "circuit.repeat[0][0].apply",
        "circuit.repeat[0][1].rate.parameter",
        "circuit.repeat[0][2].on.places[0]",
        "circuit.repeat[0][2].on.places[1]",
        "circuit.repeat[1][0].rate",
        "circuit.sites[1]",
    ]


def test_faults_of_the_size_name_each_size() -> None:
    spec = layered([{"apply": "cx", "on": "bonds-from-1"}, {"apply": "cz", "on": PAIRS}], sites=[7, 8, 9])
    found = faults(spec)
    assert "got 7" in found["circuit.repeat[0][0].on"]
    assert "got 9" in found["circuit.repeat[0][0].on"]
    assert "8" not in found["circuit.repeat[0][0].on"]
    assert "got 9: give a count" in found["circuit.repeat[0][1].on.random_pairs.count"]


def test_an_open_chain_takes_bonds_from_1_with_any_number_of_sites() -> None:
    assert faults(layered([{"apply": "cx", "on": "bonds-from-1"}], sites=7, boundary="open")) == {}


def test_two_values_that_give_one_circuit_are_refused() -> None:
    rest = {"parameter": "p", "complement": True}  # 1 - p is taken to twelve digits
    found = faults(layered([Z | {"rate": rest}], parameters={"p": [1e-14, 2e-14]}))
    assert "gives the circuit of p = 2e-14 already" in found["circuit.parameters"]
