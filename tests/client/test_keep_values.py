"""The field ``keep_values``: its place in keys, and the limit on what a sweep may keep."""

from typing import Any

import pytest

from support.specs import small
from sweepmill.coordinates import coordinates, kept_bytes
from sweepmill.ensemble import Ensemble
from sweepmill.errors import SpecificationError
from sweepmill.limits import Limits, check_limits, kept_values_bytes
from sweepmill.observation import QUANTITIES, observation_from_normal_form
from sweepmill.sweep import Sweep

OWN: dict[str, dict[str, Any]] = {
    "pauli-expectation": {"pauli": "ZZ", "sites": [0, 1]},
    "cross-entropy": {"against": "plus"},
}
RING = Ensemble.of("hybrid-clifford", sites=16, measurement_rate=0.1, layers=64)


def observed(**fields: Any) -> Any:
    return Sweep.parse(small(observe=[fields])).observations[0].observation


def keeping(**changes: Any) -> Sweep:
    return Sweep.parse(small(observe=[{"quantity": "entropy", "at": "end", "keep_values": True}], **changes))


@pytest.mark.parametrize("quantity", QUANTITIES)
def test_every_quantity_may_keep_its_values_under_a_key_of_its_own(quantity: str) -> None:
    form = {"quantity": quantity, "revision": 1, **OWN.get(quantity, {})}
    plain = observation_from_normal_form(form)
    kept = observation_from_normal_form({**form, "keep_values": True})
    assert kept.normal_form() == {**plain.normal_form(), "keep_values": True}
    assert kept.key != plain.key
    assert observation_from_normal_form({**form, "keep_values": False}).key == plain.key


@pytest.mark.parametrize("wrong", [1, "true", None])
def test_anything_but_true_and_false_is_refused(wrong: Any) -> None:
    with pytest.raises(SpecificationError, match=r"observe\[0\].keep_values: must be true or false"):
        observed(quantity="entropy", keep_values=wrong)


@pytest.mark.parametrize(
    ("fields", "integers", "width"),
    [
        ({"quantity": "entropy", "at": "end"}, 1, 1),
        ({"quantity": "entropy", "average_translations": True}, 1, 2),  # 16 sites x 16 translations x 2 layers
        ({"quantity": "entropy", "region": "every-cut", "at": [1, 2, 4]}, 45, 1),
        ({"quantity": "outcome-randomness", "at": {"every": 8}}, 16, 2),
        ({"quantity": "record-bits", "at": {"average_over": {"last": 1}}}, 1, 4),
    ],
)
def test_a_trajectory_takes_one_integer_for_each_coordinate(fields: dict[str, Any], integers: int, width: int) -> None:
    item = observed(**fields, keep_values=True)
    assert kept_bytes(RING, item) == integers * width
    assert len(coordinates(RING, item)) * item.COMPONENTS == integers
    assert kept_bytes(RING, observed(**fields)) == 0


def test_a_sweep_that_would_keep_too_much_is_refused_with_what_would_pass() -> None:
    sweep = keeping(stop__trajectories=1000)
    assert kept_values_bytes(sweep) == 4 * 1000
    assert check_limits(sweep, Limits(kept_values=4000)) == []
    (fault,) = check_limits(sweep, Limits(kept_values=3999))
    assert fault.path == "observe[0].keep_values"
    assert "take 4000 bytes, this server keeps at most 3999 of a sweep (limits.kept_values)" in fault.message
    assert "up to 999 trajectories per ensemble would pass" in fault.message
    assert check_limits(keeping(stop__trajectories=999), Limits(kept_values=3999)) == []


def test_a_server_may_keep_no_values_at_all() -> None:
    (fault,) = check_limits(keeping(), Limits(kept_values=0))
    assert "read fewer ensembles, layers or cuts" in fault.message
    assert check_limits(Sweep.parse(small()), Limits(kept_values=0)) == []
