"""Predicted costs, and counting ensembles before expanding them."""

from typing import Any

import pytest
from hypothesis import given
from hypothesis import strategies as st

from support.specs import small, transition
from sweepmill.ensemble import Ensemble
from sweepmill.errors import SpecificationError
from sweepmill.sweep import Sweep
from sweepmill_service.cost import Costs
from sweepmill_service.counting import too_many
from sweepmill_service.estimate import Sampled, estimate, sampled
from sweepmill_service.finish import Share
from sweepmill_service.plan.costs import (
    KINDS,
    default_seconds_per_trajectory,
    seconds_of,
    what_would_pass,
)
from sweepmill_service.plan.work import Work
from sweepmill_service.programs import too_many_places
from sweepmill_service.settings import ServerLimits
from sweepmill_service.specification import accepted
from sweepmill_service.store import Store
from sweepmill_service.store.common import to_json
from sweepmill_service.store.evidence import Timed
from sweepmill_service.stored import expand


def chain(sites: int, rate: float = 0.1) -> Ensemble:
    return Ensemble.of("hybrid-clifford", sites=sites, measurement_rate=rate, layers=4 * sites)


def timed(one: Ensemble, factor: float) -> Timed:
    """A batch of an ensemble that took so many times the default."""
    return Timed(to_json(one.normal_form()), (), 1000, 1000 * factor * default_seconds_per_trajectory(one))


def test_a_measured_ensemble_costs_what_it_took_and_tells_of_its_neighbors() -> None:
    ensembles = [chain(64), chain(128), chain(512)]
    small_one, middle, large = ensembles
    costs = Costs(ensembles, [], [timed(small_one, 2.0), timed(large, 0.7)], [small_one.key, large.key])
    ratios = [costs[one.key].seconds / default_seconds_per_trajectory(one) for one in ensembles]
    assert ratios[0] == pytest.approx(2.0, rel=0.2)
    assert ratios[2] == pytest.approx(0.7, rel=0.2)
    assert ratios[2] < ratios[1] < ratios[0]
    assert [costs[one.key].origin for one in ensembles] == ["measured", "learned", "measured"]
    assert costs[small_one.key].deviation < costs[middle.key].deviation


def test_without_measurements_the_default_is_taken_with_a_wide_range() -> None:
    one = chain(64)
    cost = Costs([one], [])[one.key]
    assert cost.seconds == pytest.approx(default_seconds_per_trajectory(one))
    assert (cost.origin, cost.deviation > 0.3) == ("default", True)


def test_what_is_sampled_counts_with_every_observation(store: Store) -> None:
    sweep = Sweep.parse(small(stop={"trajectories": 20}))
    store.submit(sweep, "ada")
    assert sampled(sweep, store) == [Sampled(0, 20)] * 4


@pytest.mark.parametrize(
    "circuit",
    [
        {"sites": [8, 16], "measurement_rate": {"from": 0.1, "to": 0.2, "points": 7}},
        {"sites": {"from": 4, "to": 16, "step": 4}, "measurement_rate": 0.1, "replicate": [0, 1, 2]},
        {"sites": 8, "measurement_rate": {"from": 0.1, "to": 0.4, "step": 0.1}, "boundary": ["open", "periodic"]},
        {"sites": 8, "measurement_rate": 0.1},
    ],
)
def test_counting_agrees_with_expanding(circuit: dict[str, Any]) -> None:
    body = {"circuit": {"family": "hybrid-clifford", **circuit}, "observe": [{"quantity": "entropy"}]}
    count = len(Sweep.parse(body | {"stop": {"trajectories": 1}}).points)
    assert too_many(body, count) is None
    assert too_many(body, count - 1) is not None


def test_blocks_add_up() -> None:
    block = {"family": "hybrid-clifford", "sites": [8, 16], "measurement_rate": 0.1}
    fault = too_many({"circuit": [block, block]}, 3)
    assert fault is not None
    assert "multiply to 4" in fault.message


@pytest.mark.parametrize(
    "axis",
    [
        {"from": -1e308, "to": 1e308, "step": 1e-308},
        {"from": 0, "to": 10**400, "step": 1},
        {"from": 0, "to": 1, "points": 10**4000},
        {"from": float("-inf"), "to": 0, "step": 1},
        {"from": 1, "to": 0, "step": 1e-300},
    ],
)
def test_ranges_beyond_counting_are_counted_as_many(axis: dict[str, Any]) -> None:
    fault = too_many({"circuit": {"sites": axis, "replicate": axis}}, 100)
    assert fault is None or "or more" in fault.message


anything = st.recursive(
    st.none() | st.booleans() | st.integers() | st.floats() | st.text(max_size=3),
    lambda inner: (
        st.lists(inner, max_size=3) | st.dictionaries(st.sampled_from(["from", "to", "step", "points"]), inner)
    ),
    max_leaves=8,
)


@given(st.dictionaries(st.sampled_from(["circuit", "observe"]), st.dictionaries(st.text(max_size=3), anything)))
def test_counting_takes_whatever_comes(body: dict[str, Any]) -> None:
    too_many(body, 100)


@pytest.mark.parametrize("body", [small(), transition()])
def test_a_stored_specification_expands_to_what_was_submitted(body: dict[str, Any]) -> None:
    sweep = Sweep.parse(body)
    stored = expand(sweep.canonical())
    assert stored.ensembles == tuple(point.ensemble for point in sweep.points)
    assert stored.observations == sweep.observations


@pytest.mark.parametrize("kind", KINDS)
def test_the_sizes_said_to_pass_do_and_the_next_ones_do_not(kind: str) -> None:
    work = Work(kind, 600, 2400)
    limit, factor = seconds_of(work) / 7, 1.5
    layers, sites = what_would_pass(work, factor, limit)
    assert (
        factor * seconds_of(work._replace(layers=layers))
        <= limit
        < factor * seconds_of(work._replace(layers=layers + 1))
    )
    assert (
        factor * seconds_of(Work(kind, sites, 4 * sites))
        <= limit
        < factor * seconds_of(Work(kind, sites + 1, 4 * sites + 4))
    )
    assert what_would_pass(work, factor, 1e-9) == (0, 0)


def test_layers_that_prepare_the_state_cost_as_much_as_others() -> None:
    plain = Ensemble.of("hybrid-clifford", sites=64, measurement_rate=0.1, layers=100)
    scrambled = Ensemble.of("hybrid-clifford", sites=64, measurement_rate=0.1, layers=100, scrambling_layers=900)
    layer = [{"apply": "uniform-clifford", "on": "bonds"}]
    short = Ensemble.of("layered", sites=64, layers=100, repeat=[layer])
    long = Ensemble.of("layered", sites=64, layers=100, repeat=[layer], before=[layer] * 500, after=[layer] * 400)
    for one, other in ((plain, scrambled), (short, long)):
        ratio = default_seconds_per_trajectory(other) / default_seconds_per_trajectory(one)
        assert ratio == pytest.approx(10, rel=0.05)


def test_a_circuit_too_long_to_compile_is_refused_before_it_is(store: Store) -> None:
    long = {"circuit__scrambling_layers": 100_000, "circuit__sites": 1024}
    with pytest.raises(SpecificationError, match="compiles circuits of at most 2000000 places") as error:
        accepted(small(**long, observe=[{"quantity": "entropy"}]), store, ServerLimits())
    assert [fault.path for fault in error.value.faults] == ["circuit"]
    wave = {"profile": "quasi-periodic", "by": "layer", "mean": 0.5, "amplitude": 0.1, "wavelength": 1.618, "phase": 0}
    slow = Ensemble.of("layered", sites=8, layers=20_000, repeat=[[{"measure": "Z", "on": "sites", "rate": wave}]])
    assert too_many_places([slow], ServerLimits()) is not None


def test_a_goal_is_estimated_by_its_first_round_and_its_caps(store: Store) -> None:
    sweep = Sweep.parse(
        {
            "circuit": {"family": "hybrid-clifford", "sites": [8, 16], "measurement_rate": [0.12, 0.2]},
            "observe": [{"name": "i3", "quantity": "tripartite-information"}],
            "stop": {
                "trajectories": 4000,
                "critical_point": {"of": "i3", "below": 0.01, "within": [0.12, 0.2], "step": 0.02},
            },
        }
    )
    sweep, costs = accepted(sweep.normalized(), store, ServerLimits())
    found = estimate(sweep, costs, store, Share(0.0, (), 2), None)
    assert (found.ensembles, found.trajectories_cap) == (4, 800)
    assert found.seconds is None
    assert found.rounds is not None
    assert found.core_seconds_expected is not None
    assert found.core_seconds > 10 * found.core_seconds_expected > 0  # ten places to their caps
