"""What follows from a round: on the ladder, within caps and budget, and the same from the same evidence.

The values are invented: they cross at 0.5 with the exponent 4/3, or grow with the logarithm of the size.
"""

from dataclasses import replace
from typing import Any

import numpy as np
import pytest

from sweepmill.accumulate import Accumulator
from sweepmill.coordinates import coordinates
from sweepmill.ensemble import Ensemble
from sweepmill.ladder import rungs
from sweepmill.sweep import Sweep
from sweepmill_service.plan.costs import default_seconds_per_trajectory
from sweepmill_service.rounds.costs import power_of_two, weighed_costs
from sweepmill_service.rounds.decide import decide
from sweepmill_service.store.rounds import Evidence, StoredPlace

ISING: dict[str, Any] = {"family": "projective-ising", "layers": {"per_site": 2}}


def critical_point(**goal: Any) -> Sweep:
    rule = {"of": "i3", "below": 0.0005, "within": [0.3, 0.7], "step": 0.02} | goal
    return Sweep.parse(
        {
            "circuit": ISING | {"sites": [16, 32], "bond_rate": [0.3, 0.4, 0.5, 0.6, 0.7]},
            "observe": [{"name": "i3", "quantity": "tripartite-information"}],
            "stop": {"trajectories": 3000, "critical_point": rule},
        }
    )


def law(below: float = 1e-4, cap: int = 3000) -> Sweep:
    return Sweep.parse(
        {
            "circuit": ISING | {"sites": [8, 12, 16, 24], "bond_rate": [0.5, 0.4]},
            "observe": [{"name": "half", "quantity": "entropy"}],
            "stop": {
                "trajectories": cap,
                "law": {"of": "half", "law": "logarithm", "coefficient": "a", "below": below},
            },
        }
    )


def invented(ensemble: Ensemble, critical: bool, number: int) -> bytes:
    """Total of readings, two for each trajectory as in a unit cell, whose mean is known."""
    sites, rate = ensemble.sites, ensemble.parameters["bond_rate"]
    mean = 1 / (1 + np.exp(-2 * (rate - 0.5) * sites**0.75)) if critical else 0.1 * np.log(sites) + rate - 0.3
    draw = np.random.default_rng(sites * 1000 + round(1000 * rate))
    return Accumulator.from_values(2 * draw.binomial(4, mean, (number, 1)), 0).to_bytes()


def evidence(sweep: Sweep, number: int = 200, **changes: Any) -> Evidence:
    """What the store has after a first round, sampled."""
    assert sweep.goal is not None
    critical = sweep.stop.critical_point is not None
    places = []
    for ordinal, point in enumerate(sweep.points):
        placed = point.ensemble.key in sweep.starting
        places.append(
            StoredPlace(
                ordinal=ordinal,
                ensemble=point.ensemble.key,
                normal_form=point.ensemble.normal_form(),
                judged=number if placed else 0,
                most=point.cap,
                stuck=False,
                seconds=default_seconds_per_trajectory(point.ensemble) if placed else None,
                accumulator=invented(point.ensemble, critical, number) if placed else None,
            )
        )
    known = Evidence(sweep.key, {}, sweep.canonical(), 200, 0, 1.0, None, tuple(places))
    return replace(known, **changes)


@pytest.fixture(scope="module")
def known() -> Evidence:
    return evidence(critical_point())


def test_the_next_round_is_on_the_ladder_and_never_below_what_there_is(known: Evidence) -> None:
    decision = decide(known)
    assert decision.met_by == {}
    ladder = {0, *rungs(200, 3000)}
    for place in known.places:
        assert decision.targets[place.ordinal] in ladder
        assert decision.targets[place.ordinal] >= place.judged
    assert sum(decision.targets.values()) > sum(place.judged for place in known.places)
    (answer,) = decision.answers
    assert (answer["quantity"], answer["of"], answer["round"], answer["met"]) == ("p_c", "i3", 1, False)


def test_the_same_evidence_gives_the_same_decision(known: Evidence) -> None:
    assert decide(known) == decide(known)


def test_a_bound_that_is_met_settles_every_place_by_error() -> None:
    decision = decide(evidence(critical_point(below=0.3)))
    assert decision.targets == {}
    assert set(decision.met_by.values()) == {"error"}
    assert decision.answers[0]["error"] < 0.3


def test_when_every_place_has_its_cap_the_sweep_settles_by_cap(known: Evidence) -> None:
    full = replace(known, places=tuple(place._replace(most=place.judged or 1, stuck=False) for place in known.places))
    exhausted = replace(full, places=tuple(place._replace(stuck=not place.judged) for place in full.places))
    decision = decide(exhausted)
    assert set(decision.met_by.values()) == {"cap"}


def test_a_stuck_place_keeps_its_number(known: Evidence) -> None:
    ordinal = next(place.ordinal for place in known.places if place.judged)
    places = tuple(place._replace(stuck=place.ordinal == ordinal) for place in known.places)
    assert decide(replace(known, places=places)).targets[ordinal] == 200


def test_a_round_does_not_cost_more_than_the_budget_has_left(known: Evidence) -> None:
    price = cost_of(known)
    less = replace(known, budget=known.core_seconds + price / 3)
    assert 0 < cost_of(less) <= price / 3


def cost_of(known: Evidence) -> float:
    decision = decide(known)
    return sum(
        decision.costs[place.ordinal] * (decision.targets.get(place.ordinal, 0) - place.judged)
        for place in known.places
        if decision.targets.get(place.ordinal, 0) > place.judged
    )


def test_costs_are_powers_of_two_and_empty_places_cost_what_their_size_turned_out_to(known: Evidence) -> None:
    slow = tuple(place._replace(seconds=place.seconds and 8 * place.seconds) for place in known.places)
    costs, before = weighed_costs(slow), weighed_costs(known.places)
    assert costs == [8 * one for one in before]
    assert all(power_of_two(one) == one for one in costs)
    by_size = {place.normal_form["sites"]: cost for place, cost in zip(known.places, before, strict=True)}
    assert before == [by_size[place.normal_form["sites"]] for place in known.places]


def test_groups_of_a_law_are_judged_by_themselves() -> None:
    decision = decide(evidence(law()))
    assert [answer["where"] for answer in decision.answers] == [{"bond_rate": 0.5}, {"bond_rate": 0.4}]
    assert decision.met_by == {}
    assert all(target >= 200 for target in decision.targets.values())


def test_a_group_that_met_its_goal_gets_no_more_while_the_others_go_on() -> None:
    decision = decide(known := evidence(law(below=0.026), 1600))
    met = [answer["met"] for answer in decision.answers]
    assert sorted(met) == [False, True]
    for place in known.places:
        mine = met[0 if place.normal_form["bond_rate"] == 0.5 else 1]
        assert (decision.targets[place.ordinal] == 1600) or not mine


def by_position(boundary: str, region: str, slope: float) -> Evidence:
    """A chain of 16 sites with invented entropies that go by the chord; a length and its complement have the same."""
    averaged = {"average_translations": True} if boundary == "periodic" else {}
    sweep = Sweep.parse(
        {
            "circuit": ISING | {"sites": 16, "bond_rate": 0.5, "boundary": boundary},
            "observe": [{"name": "cuts", "quantity": "entropy", "region": region, **averaged}],
            "stop": {
                "trajectories": 20000,
                "law": {"of": "cuts", "law": "logarithm", "coefficient": "a", "over": "position", "below": 0.1},
            },
        }
    )
    (point,), number = sweep.points, 4000
    at = coordinates(point.ensemble, sweep.observations[0].observation)
    means = np.array([0.0, *(slope * np.log(np.sin(np.pi * np.arange(1, 9) / 16)) + 2)])
    drawn = np.random.default_rng(16).binomial(4, means / 4, (number, 9))
    values = np.stack([drawn[:, min(int(one.position or 0), 16 - int(one.position or 0))] * one.scale for one in at], 1)
    total = Accumulator.from_values(values, 0).to_bytes()
    place = StoredPlace(0, point.ensemble.key, point.ensemble.normal_form(), number, 20000, False, 1e-3, total)
    return Evidence(sweep.key, {}, sweep.canonical(), 200, 0, 1.0, None, (place,))


@pytest.mark.parametrize(
    ("boundary", "region"), [("open", "every-cut"), ("periodic", "every-cut"), ("periodic", "every-interval")]
)
def test_a_law_in_the_position_is_read_up_to_half_the_chain_in_chords(boundary: str, region: str) -> None:
    # an open chain has (2 L/pi) sin(pi l/L) in place of l, a ring its chord: J. Stat. Mech. P06002 (2004), from memory
    decision = decide(by_position(boundary, region, 0.8))
    (answer,) = decision.answers
    assert set(decision.met_by.values()) == {"error"}
    assert abs(answer["value"] - 0.8) < 5 * answer["error"]  # chance of failure 6e-7
