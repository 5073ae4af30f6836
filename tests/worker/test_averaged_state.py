"""What the average over circuits and records knows of the measurement rate: nothing, unlike single trajectories.

Exactly: a uniform Clifford gate ends in a uniformly random Pauli frame, and the mean of a state over all frames of some
sites is maximally mixed there. Measurements whose outcomes are averaged over, and all later gates, keep the maximally
mixed state. So after a layer that acts on every site the mean of each Pauli product is 0 at every rate and time, and
expectations, which are 1, 0 or -1, show the rate in their squares only, like entropies.
"""

import random
from functools import reduce

import numpy as np
import pytest

from support import dense
from support.budget import z_limit
from support.rows import random_layer, row
from sweepmill.coordinates import coordinates
from sweepmill.ensemble import Ensemble
from sweepmill.observation import Observation, observation_from_normal_form
from sweepmill.statistics import Moments, summarize
from sweepmill_worker.program import operations as op
from sweepmill_worker.sample import sample

PRODUCTS = [("Z", [0]), ("X", [3]), ("ZZ", [0, 1]), ("ZZ", [0, 3]), ("XYZ", [1, 2, 3]), ("ZZZZZZ", [0, 1, 2, 3, 4, 5])]


@pytest.mark.parametrize("seed", range(4))
def test_a_random_frame_of_all_sites_leaves_the_maximally_mixed_state_and_nothing_later_changes_it(seed: int) -> None:
    draw = random.Random(seed)
    state = reduce(lambda held, one: dense.apply(held, one, 2, 0), _gates(draw), dense.start("zeros", 2))
    gate = draw.randrange(720)
    framed = _sum([dense.apply(state, row(op.GATE, [0, 1], gate, frame), 2, 0) for frame in range(16)]) / 16
    np.testing.assert_allclose(framed, np.eye(4) / 4, atol=1e-6)
    for one in random_layer(draw, 2, 12, forced=False, mixing=False).tolist():
        outcomes = (0, 1) if one[op.CODE] == op.MEASURE else (0,)
        framed = _sum([dense.apply(framed, one, 2, outcome) for outcome in outcomes])
    np.testing.assert_allclose(framed, np.eye(4) / 4, atol=1e-5)


def _sum(states: list[dense.Matrix]) -> dense.Matrix:
    return np.asarray(np.sum(states, axis=0), dtype=np.complex128)


def _gates(draw: random.Random) -> list[list[int]]:
    return [row(op.GATE, [0, 1], draw.randrange(720), draw.randrange(16)) for _ in range(3)]


def pauli(letters: str, sites: list[int]) -> Observation:
    form = {"quantity": "pauli-expectation", "revision": 1, "pauli": letters, "sites": sites, "at": "end"}
    return observation_from_normal_form(form)


def test_means_of_pauli_products_are_trivial_at_all_rates_and_entropies_are_not() -> None:
    """Rates far below, near and above the transition at about 0.16; six means each, and two entropies as contrast."""
    half = observation_from_normal_form({"quantity": "entropy", "revision": 1})
    products = [pauli(*one) for one in PRODUCTS]
    entropies, squares = [], []
    for rate in (0.05, 0.16, 0.5):
        ensemble = Ensemble.of("hybrid-clifford", sites=6, measurement_rate=rate, layers=10, engine="reference")
        total = sample(ensemble, [*products, half], 0, 80).accumulators
        rows: list[Moments] = [summarize(total[item.key], coordinates(ensemble, item))[0] for item in (*products, half)]
        for one in rows[:-1]:
            assert abs(one.mean) < z_limit("averaged-state", 18) * one.standard_error
        entropies.append(rows[-1])
        squares.append(sum(one.variance for one in rows[:-1]))
    assert squares[2] > 1.5 * squares[0]  # about 8 times, known to a quarter
    for low, high in ((1, 0), (2, 1)):  # each at least 8 standard errors apart
        error = np.hypot(entropies[low].standard_error, entropies[high].standard_error)
        assert entropies[high].mean - entropies[low].mean > 3 * error
