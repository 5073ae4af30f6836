"""What does not fit between a goal and the circuits and observations of its sweep."""

from collections.abc import Iterator, Sequence
from typing import Any

from sweepmill.coordinates import coordinates
from sweepmill.ensemble import Ensemble
from sweepmill.errors import Fault
from sweepmill.families.block import Block
from sweepmill.goals.groups import Group, groups
from sweepmill.goals.models import LAWS, CriticalPointGoal, Goal, LawGoal
from sweepmill.goals.placing import bad_bounds, candidates, values


def goal_faults(goal: Goal, blocks: Sequence[Block], ensembles: Sequence[Ensemble], observed: Any) -> list[Fault]:
    """Every fault; ``observed`` is the observation the goal is about. Call it once the blocks are valid."""
    path = "stop.critical_point" if isinstance(goal, CriticalPointGoal) else "stop.law"
    faults = list(_axis_faults(goal, blocks) if isinstance(goal, CriticalPointGoal) else _law_faults(goal))
    if not faults and ensembles:
        faults = [*_group_faults(goal, groups(goal, ensembles)), *_place_faults(goal, ensembles, observed)]
    return [Fault(f"{path}.{where}" if where else path, message) for where, message in faults]


def _axis_faults(goal: CriticalPointGoal, blocks: Sequence[Block]) -> Iterator[tuple[str, str]]:
    try:
        goal.grid()
    except ValueError as error:
        yield "step", str(error)
    able = candidates(blocks)
    if goal.axis is None:
        yield "axis", f"say which field takes new values: one of {', '.join(able) or 'none that all circuits have'}"
        return
    if goal.axis not in able:
        yield "axis", f"{goal.axis!r} is not a field with real values of every circuit: one of {', '.join(able)}"
        return
    yield from (("within", message) for message in bad_bounds(goal))
    low, high = goal.within
    for value in dict.fromkeys(value for block in blocks for value in values(block, goal.axis)):
        if not low <= value <= high:
            yield "within", f"the value {value} of {goal.axis} lies outside of {low} to {high}"


def _law_faults(goal: LawGoal) -> Iterator[tuple[str, str]]:
    if goal.coefficient not in LAWS[goal.law]:
        yield "coefficient", f"{goal.coefficient!r} is not a coefficient of this law: {', '.join(LAWS[goal.law])}"


def _group_faults(goal: Goal, found: Sequence[Group]) -> Iterator[tuple[str, str]]:
    if isinstance(goal, CriticalPointGoal) and len(found) > 1:
        differ = ", ".join(dict.fromkeys(name for group in found for name in group.where))
        yield "", f"one critical point for all circuits of a sweep, and they differ in {differ}: submit one sweep each"
        return
    for group in found:
        yield from _sizes_fault(goal, group)


def _sizes_fault(goal: Goal, group: Group) -> Iterator[tuple[str, str]]:
    if isinstance(goal, LawGoal) and goal.over == "position":
        return
    sizes = len(set(group.sizes))
    least = 2 if isinstance(goal, CriticalPointGoal) else len(LAWS[goal.law]) + 1
    if sizes < least:
        yield "", f"needs at least {least} sizes, got {sizes}" + _said(group)
    elif len(set(zip(group.sizes, group.x, strict=True))) < len(group.sizes):
        yield "", "two ensembles of one size differ only in their layers: give each size one number of layers"


def _said(group: Group) -> str:
    return f" where {', '.join(f'{name} = {value}' for name, value in group.where.items())}" if group.where else ""


def _place_faults(goal: Goal, ensembles: Sequence[Ensemble], observed: Any) -> Iterator[tuple[str, str]]:
    """The observation gives one number per ensemble, or one per position."""
    first = ensembles[0]
    if observed is None or observed.fault(first):
        return  # found elsewhere
    if observed.COMPONENTS != 1:
        yield "of", "a ratio of counts cannot be the quantity of a goal: take one that is a plain mean"
        return
    places = coordinates(first, observed)
    if isinstance(goal, LawGoal) and goal.over == "position":
        if len({place.layer for place in places}) > 1 or any(place.position is None for place in places):
            yield "of", 'a law in the position needs a quantity of every position at one time, such as "every-cut"'
        elif (number := min(_within_half(ensemble, observed) for ensemble in ensembles)) < len(LAWS[goal.law]) + 2:
            yield "of", f"{number} positions up to half the chain are too few for this law"
    elif len(places) > 1:
        yield "of", f"needs one number per ensemble, and this observation has {len(places)}: read it at one time"


def _within_half(ensemble: Ensemble, observed: Any) -> int:
    """Positions up to half the chain, beyond which the same cuts come again."""
    return sum((place.position or 0) <= ensemble.sites / 2 for place in coordinates(ensemble, observed))
