"""Whatever stands where a circuit is expected: it is a circuit, or a specification refused with paths."""

import json
from typing import Any

from hypothesis import given, settings
from hypothesis import strategies as st

from support.circuits import faults, layered
from sweepmill.sweep import Sweep

WORDS = [
    *(
        "apply",
        "measure",
        "depolarise",
        "reset",
        "swap_in",
        "choose",
        "on",
        "rate",
        "weight",
        "steps",
        "fixed",
        "rotated",
    ),
    *("parameter", "complement", "profile", "disorder", "by", "values", "period", "width", "inside", "outside", "mean"),
    *(
        "from",
        "to",
        "exponent",
        "largest",
        "blocks",
        "sublattice",
        "every",
        "places",
        "random_pairs",
        "count",
        "per_site",
    ),
    *(
        "random_sequential",
        "of",
        "sites",
        "bonds",
        "list",
        "stripe",
        "uniform",
        "two-valued",
        "cx",
        "h",
        "Z",
        "ZZ",
        "all",
    ),
    *("site", "layer", "trajectory", "reference", "p", "recorded", "forced", "uniform-clifford", "iswap-class"),
]
LEAVES = st.one_of(
    *(st.none(), st.booleans(), st.integers(-2, 9), st.floats(width=16), st.sampled_from(WORDS), st.text(max_size=2)),
    st.integers(2**53, 2**70),
)
ANYTHING: st.SearchStrategy[Any] = st.recursive(
    LEAVES,
    lambda inner: st.lists(inner, max_size=3) | st.dictionaries(st.sampled_from(WORDS), inner, max_size=4),
    max_leaves=12,
)


def nearly(value: Any) -> st.SearchStrategy[Any]:
    """The value, mostly."""
    return st.sampled_from([value] * 4) | ANYTHING


PLACES = st.fixed_dictionaries({"random_pairs": st.fixed_dictionaries({}, optional={"count": ANYTHING})}) | nearly(
    "bonds"
)
NEAR = st.fixed_dictionaries(
    {"on": PLACES},
    optional={"apply": nearly("cx"), "measure": nearly("ZZ"), "rate": ANYTHING, "choose": ANYTHING, "forced": ANYTHING},
)
LAYERS = st.lists(st.lists(NEAR | ANYTHING, max_size=3), max_size=2)


@settings(max_examples=150, deadline=None)
@given(LAYERS | ANYTHING, LAYERS, st.dictionaries(st.sampled_from(["p", "sites", ""]), ANYTHING, max_size=2))
def test_anything_is_a_circuit_or_refused(repeat: Any, before: Any, parameters: Any) -> None:
    spec = layered() | {
        "circuit": layered()["circuit"] | {"repeat": repeat, "before": before, "parameters": parameters}
    }
    found = faults(spec)
    assert all(path.startswith("circuit") for path in found)
    if not found:
        sweep = Sweep.parse(spec)
        assert Sweep.parse(json.loads(sweep.canonical())).canonical() == sweep.canonical()
