"""Judging a round: a pure function of the evidence."""

import math
from collections.abc import Sequence
from typing import Any, Literal, NamedTuple

from sweepmill.analysis.design import Advice, Place, advise_critical_point, advise_law
from sweepmill.analysis.estimate import Estimate, finite
from sweepmill.goals import CriticalPointGoal, Goal, Group, LawGoal, groups
from sweepmill.ladder import rungs
from sweepmill_service.rounds.costs import weighed_costs
from sweepmill_service.rounds.material import curve_of, points_of
from sweepmill_service.store.rounds import Decision, Evidence, StoredPlace
from sweepmill_service.stored import StoredSweep, expand, stored_goal

DOUBLING = 2


class _Judged(NamedTuple):
    group: Group
    advice: Advice


def decide(known: Evidence) -> Decision:
    """What the goal of a sweep is known to be, and where to sample next."""
    goal, sweep = stored_goal(known.specification), expand(known.specification)
    costs = weighed_costs(known.places)
    judged = [_judge(goal, group, known, sweep, costs) for group in groups(goal, sweep.ensembles)]
    answers = tuple(_answer(goal, one, known.rounds + 1) for one in judged)
    by_ordinal = {place.ordinal: cost for place, cost in zip(known.places, costs, strict=True)}
    wanted = _targets(known, judged)
    targets = _affordable(known, wanted, by_ordinal)
    if _raises(known, targets):
        return Decision(answers, targets, by_ordinal, {})
    if _raises(known, wanted):
        spent = f"what is left of the budget of {known.budget:g} core-seconds pays for no further round"
        answers = tuple(one if one["met"] else {**one, "reason": spent} for one in answers)
    return Decision(answers, {}, by_ordinal, _met_by(judged))


def _raises(known: Evidence, targets: dict[int, int]) -> bool:
    return any(targets[place.ordinal] > place.judged for place in known.places)


def _judge(goal: Goal, group: Group, known: Evidence, sweep: StoredSweep, costs: Sequence[float]) -> _Judged:
    """The group as it stands; data that no fit takes withhold its answer, and are no fault of the sweep."""
    try:
        return _advised(goal, group, known, sweep, costs)
    except ValueError as error:
        return _Judged(group, _nothing([known.places[ordinal] for ordinal in group.ordinals], str(error)))


def _advised(goal: Goal, group: Group, known: Evidence, sweep: StoredSweep, costs: Sequence[float]) -> _Judged:
    observed = next(item.observation for item in sweep.observations if item.name == goal.of)
    stored = [known.places[ordinal] for ordinal in group.ordinals]
    sampled = [index for index, place in enumerate(stored) if place.accumulator is not None]
    places = [
        Place(size, x, costs[place.ordinal], place.judged, _at_most(place))
        for place, size, x in zip(stored, group.sizes, group.x, strict=True)
    ]
    if isinstance(goal, LawGoal) and goal.over == "position":
        curve, ring = curve_of(stored[0], observed)
        return _Judged(group, advise_law(curve, places, goal.law, goal.coefficient, goal.below, ring))
    if not sampled:
        return _Judged(group, _nothing(stored, "none of its ensembles could be sampled"))
    points = points_of(
        [stored[i] for i in sampled], observed, [group.sizes[i] for i in sampled], [group.x[i] for i in sampled]
    )
    if isinstance(goal, CriticalPointGoal):
        return _Judged(group, advise_critical_point(points, places, goal.below))
    return _Judged(group, advise_law(points, places, goal.law, goal.coefficient, goal.below))


def _at_most(place: StoredPlace) -> int:
    return place.judged if place.stuck else max(place.most, place.judged)


def _nothing(stored: Sequence[StoredPlace], why: str) -> Advice:
    estimate = Estimate(math.nan, math.nan, 0.0, why)
    return Advice(estimate, False, tuple(place.judged for place in stored), math.inf, estimate.withheld)


def _targets(known: Evidence, judged: Sequence[_Judged]) -> dict[int, int]:
    """N of every place in the next round, on the ladder; a group that met the goal stays where it is."""
    targets: dict[int, int] = {}
    for group, advice in judged:
        wanted = [known.places[o].judged for o in group.ordinals] if advice.met else list(advice.targets)
        stored = [known.places[ordinal] for ordinal in group.ordinals]
        snapped = [_snap(known, place, number) for place, number in zip(stored, wanted, strict=True)]
        if advice.estimate.withheld and all(n <= place.judged for n, place in zip(snapped, stored, strict=True)):
            snapped = [_snap(known, place, DOUBLING * place.judged) for place in stored]  # perhaps more data tell
        targets.update(zip(group.ordinals, snapped, strict=True))
    return targets


def _met_by(judged: Sequence[_Judged]) -> dict[int, Literal["error", "cap"]]:
    return {ordinal: "error" if advice.met else "cap" for group, advice in judged for ordinal in group.ordinals}


def _snap(known: Evidence, place: StoredPlace, wanted: int) -> int:
    """The rung that holds so many trajectories; what was sampled already is the least."""
    if wanted <= place.judged or place.stuck:
        return place.judged
    ladder = rungs(min(known.at_least, place.most), place.most)
    return next((rung for rung in ladder if rung >= wanted), ladder[-1])


def _affordable(known: Evidence, targets: dict[int, int], costs: dict[int, float]) -> dict[int, int]:
    """Smaller steps where the round would cost more than the budget has left."""
    if known.budget is None:
        return targets
    left, share, scaled = known.budget - known.core_seconds, 1.0, dict(targets)
    while _price(known, scaled, costs) > left and share > 1e-3:
        share /= 2
        scaled = {
            place.ordinal: _snap(known, place, place.judged + round(share * (targets[place.ordinal] - place.judged)))
            for place in known.places
            if place.ordinal in targets
        }
    return scaled


def _price(known: Evidence, targets: dict[int, int], costs: dict[int, float]) -> float:
    return sum(costs[place.ordinal] * max(0, targets.get(place.ordinal, 0) - place.judged) for place in known.places)


def _answer(goal: Goal, judged: _Judged, number: int) -> dict[str, Any]:
    estimate, advice = judged.advice.estimate, judged.advice
    return {
        "quantity": "p_c" if isinstance(goal, CriticalPointGoal) else goal.coefficient,
        "of": goal.of,
        "where": judged.group.where,
        "round": number,
        "below": goal.below,
        "met": advice.met,
        "reason": advice.reason or None,
        "predicted_error": finite(advice.predicted_error),
        **estimate.to_dict(),
    }
