"""The layered form of every preset: a circuit of the language, with its steps where the random words expect them."""

import json
from typing import Any

import pytest

from support.circuits import only, specification
from sweepmill import layered_form
from sweepmill.ensemble import FAMILY_PARAMETERS, Ensemble
from sweepmill.language.geometry import listed
from sweepmill.presets import lattice_bonds

GATES: dict[str, Any] = {"apply": "uniform-clifford"}
Z: dict[str, Any] = {"measure": "Z", "on": "sites", "rate": 0.25}
BATH: dict[str, Any] = {"depolarise": True, "on": {"places": [[0]]}}
ROTATED: dict[str, Any] = GATES | {"rotated": True}

PRESETS = [
    Ensemble.of("hybrid-clifford", sites=8, measurement_rate=0.25, layers=6),
    Ensemble.of("hybrid-clifford", sites=8, measurement_rate=1, layers=6, boundary="open", initial_state="mixed"),
    Ensemble.of("hybrid-clifford", sites=8, measurement_rate=0, layers=6, references=3, scrambling_layers=3),
    Ensemble.of("hybrid-clifford-square", width=4, height=6, measurement_rate=0.25, layers=6),
    Ensemble.of("hybrid-clifford-square", width=2, height=3, measurement_rate=0.25, layers=6, boundary="open"),
    Ensemble.of("hybrid-clifford-long-range", sites=8, exponent=0, measurement_rate=0.25, layers=6),
    Ensemble.of("hybrid-clifford-long-range", sites=8, exponent=2, measurement_rate=0.25, layers=6, replicate=4),
    Ensemble.of("projective-ising", sites=7, bond_rate=0.3, layers=6, engine="reference"),
    Ensemble.of("edge-bath", sites=7, layers=6),
    *(Ensemble.of("rotated-clifford", sites=8, layers=n, ends=e) for n in (5, 6) for e in ("open", "product", "ring")),
]


def form_of(family: str, **parameters: Any) -> dict[str, Any]:
    return layered_form(Ensemble.of(family, **{"layers": 6} | parameters))


@pytest.mark.parametrize("preset", PRESETS, ids=lambda preset: preset.family)
def test_the_layered_form_is_a_circuit_that_the_language_takes_as_it_is(preset: Ensemble) -> None:
    form = layered_form(preset)
    block = {name: value for name, value in form.items() if name != "revision"}
    assert only(specification(**json.loads(json.dumps(block)))) == form


@pytest.mark.parametrize("preset", PRESETS, ids=lambda preset: preset.family)
def test_the_layered_form_has_the_shape_of_the_preset(preset: Ensemble) -> None:
    again = Ensemble.from_normal_form(layered_form(preset))
    assert again.shape[1:9] == preset.shape[1:9]
    assert bool(again.forcing) == bool(preset.forcing)  # the field to blame for it differs
    assert again.measures_before == preset.measures_before
    assert again.key != preset.key
    assert again.parameters["replicate"] == preset.parameters["replicate"]


def test_every_preset_has_a_layered_form_and_that_of_a_layered_circuit_is_its_own() -> None:
    assert {preset.family for preset in PRESETS} | {"layered"} == FAMILY_PARAMETERS.keys()
    layered = Ensemble.from_normal_form(layered_form(PRESETS[2]))
    assert layered_form(layered) == layered.normal_form()


def test_the_hybrid_chain_applies_gates_first_and_measures_then() -> None:
    form = form_of("hybrid-clifford", sites=8, measurement_rate=0.25)
    assert form["repeat"] == [[GATES | {"on": "bonds-from-0"}, Z], [GATES | {"on": "bonds-from-1"}, Z]]
    assert set(form) == {"family", "revision", "sites", "layers", "repeat"}


def test_reference_qubits_come_in_at_equal_spacings_before_the_scrambling() -> None:
    form = form_of("hybrid-clifford", sites=8, measurement_rate=0.25, references=3, scrambling_layers=3)
    assert form["before"] == [
        [{"swap_in": "reference", "on": {"places": [[0], [2], [5]]}}],
        [GATES | {"on": "bonds-from-0"}],
        [GATES | {"on": "bonds-from-1"}],
        [GATES | {"on": "bonds-from-0"}],
    ]


@pytest.mark.parametrize("periodic", [True, False])
def test_the_four_classes_of_bonds_are_all_bonds_of_the_lattice_once(periodic: bool) -> None:
    width, height = 4, 6
    classes = [lattice_bonds(width, height, periodic, v, first) for v in (False, True) for first in (0, 1)]
    for bonds in classes:
        sites = [site for bond in bonds for site in bond]
        assert len(sites) == len(set(sites))
    steps = {
        tuple(sorted((y * width + x, (y + dy) % height * width + (x + dx) % width)))
        for y in range(height)
        for x in range(width)
        for dx, dy in ((1, 0), (0, 1))
        if periodic or (x + dx < width and y + dy < height)
    }
    assert sorted(tuple(sorted(bond)) for bonds in classes for bond in bonds) == sorted(steps)
    assert classes[0][:3] == [[0, 1], [2, 3], [4, 5]]
    assert classes[2][:5] == [[0, 4], [1, 5], [2, 6], [3, 7], [8, 12]]


def test_pairs_of_any_distance_are_drawn_in_every_layer() -> None:
    layer = [GATES | {"on": {"random_pairs": {"exponent": 2}}}, Z]
    assert form_of("hybrid-clifford-long-range", sites=8, exponent=2, measurement_rate=0.25)["repeat"] == [layer, layer]
    flat = form_of("hybrid-clifford-long-range", sites=8, exponent=0, measurement_rate=0.25)["repeat"]
    assert flat[0][0]["on"] == {"random_pairs": {}}


def test_the_ising_chain_measures_bonds_and_then_sites() -> None:
    form = form_of("projective-ising", sites=7, bond_rate=0.3)
    layer = [{"measure": "ZZ", "on": "bonds", "rate": 0.3}, {"measure": "X", "on": "sites", "rate": 0.7}]
    assert (form["initial_state"], form["repeat"]) == ("plus", [layer, layer])


def test_the_bath_takes_the_first_site_after_every_layer() -> None:
    form = form_of("edge-bath", sites=7)
    assert form["boundary"] == "open"
    assert form["repeat"] == [[GATES | {"on": "bonds-from-0"}, BATH], [GATES | {"on": "bonds-from-1"}, BATH]]


@pytest.mark.parametrize("columns", [5, 6])
def test_the_last_column_of_a_rotated_circuit_acts_on_odd_slices_and_pairs_start_on_the_other_offset(
    columns: int,
) -> None:
    form = form_of("rotated-clifford", sites=8, layers=columns, ends="ring")
    acts = [form["repeat"][(j - 1) % 2] for j in range(1, columns + 1)]
    assert acts[-1] == [ROTATED | {"on": "bonds-from-0"}]
    assert acts[-2] == [ROTATED | {"on": "bonds-from-1"}]
    first = acts[0][0]["on"]
    (before,) = form["before"]
    assert [step["apply"] for step in before] == ["h", "cx"]
    assert {before[1]["on"], first} == {"bonds-from-0", "bonds-from-1"}
    pairs = listed(before[1]["on"], 8, periodic=True)
    assert [[left] for left, _ in pairs] == before[0]["on"]["places"]


def test_slices_left_alone_at_open_ends_stay_zero() -> None:
    (before,) = form_of("rotated-clifford", sites=8, layers=5)["before"]
    assert before == [{"apply": "h", "on": {"places": [[1], [3], [5]]}}, {"apply": "cx", "on": "bonds-from-1"}]


def test_ends_of_rotated_circuits() -> None:
    ends: dict[str, Any] = {"places": [[0], [7]]}
    gates = ROTATED | {"on": "bonds-from-0"}
    free = form_of("rotated-clifford", sites=8, layers=5, ends="open")
    product = form_of("rotated-clifford", sites=8, layers=5, ends="product")
    assert free["repeat"] == [[{"depolarise": True, "on": ends}, gates], [ROTATED | {"on": "bonds-from-1"}]]
    assert product["repeat"][0] == [
        {"reset": True, "on": {"places": [[0]]}},
        {"depolarise": True, "on": {"places": [[7]]}},
        gates,
        {"measure": "Z", "on": {"places": [[0]]}, "forced": True},
    ]
    assert free["boundary"] == product["boundary"] == "open"
