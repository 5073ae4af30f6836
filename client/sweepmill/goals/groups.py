"""Which ensembles of a sweep answer a goal together."""

from collections.abc import Sequence
from typing import Any, NamedTuple

from sweepmill.ensemble import Ensemble
from sweepmill.goals.models import CriticalPointGoal, Goal, LawGoal
from sweepmill.goals.placing import SIZES


class Group(NamedTuple):
    """Ensembles that give one value of the quantity: their ordinals, sizes and values of the axis.

    ``where`` are the parameters that tell the group from the others; ``x`` equals ``sizes`` where the law is in the
    size, and is not used where it is in the position.
    """

    where: dict[str, Any]
    ordinals: tuple[int, ...]
    sizes: tuple[float, ...]
    x: tuple[float, ...]


def groups(goal: Goal, ensembles: Sequence[Ensemble]) -> list[Group]:
    """All groups, in the order of their first ensembles."""
    found: dict[Any, list[int]] = {}
    for ordinal, ensemble in enumerate(ensembles):
        found.setdefault(_apart(goal, ordinal, ensemble), []).append(ordinal)
    shared = [[_columns(goal, ensembles[i]) for i in ordinals] for ordinals in found.values()]
    varying = [name for name in _names(shared) if len({str(some[0].get(name)) for some in shared}) > 1]
    return [
        _group(goal, ensembles, ordinals, {name: some[0][name] for name in varying if name in some[0]})
        for ordinals, some in zip(found.values(), shared, strict=True)
    ]


def _apart(goal: Goal, ordinal: int, ensemble: Ensemble) -> Any:
    if isinstance(goal, LawGoal) and goal.over == "position":
        return ordinal
    return (ensemble.family, *sorted((name, str(value)) for name, value in _columns(goal, ensemble).items()))


def _columns(goal: Goal, ensemble: Ensemble) -> dict[str, Any]:
    """What must be equal within a group."""
    whole = {"family": ensemble.family, **ensemble.columns}
    if isinstance(goal, LawGoal) and goal.over == "position":
        return whole
    axis = (goal.axis,) if isinstance(goal, CriticalPointGoal) else ()
    return {name: value for name, value in whole.items() if name not in (*SIZES, "layers", *axis)}


def _names(shared: list[list[dict[str, Any]]]) -> list[str]:
    return list(dict.fromkeys(name for some in shared for name in some[0]))


def _group(goal: Goal, ensembles: Sequence[Ensemble], ordinals: list[int], where: dict[str, Any]) -> Group:
    sizes = tuple(_size(ensembles[i]) for i in ordinals)
    x = sizes
    if isinstance(goal, CriticalPointGoal):
        x = tuple(float(ensembles[i].columns[goal.axis or ""]) for i in ordinals)
    return Group(where, tuple(ordinals), sizes, x)


def _size(ensemble: Ensemble) -> float:
    """Sites of a chain, the width of a lattice: the length that scales, as fits of tables take it."""
    return float(ensemble.columns.get("width", ensemble.sites))
