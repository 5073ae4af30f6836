"""The values of an axis that a search for a critical point may place, as circuit blocks."""

from collections.abc import Sequence
from typing import Any

from sweepmill.axes import located_values
from sweepmill.families.block import Block
from sweepmill.families.checks import RANGES
from sweepmill.families.layered import Layered
from sweepmill.goals.models import CriticalPointGoal, Goal

SIZES = ("sites", "width", "height")
NOT_AN_AXIS = (*SIZES, "layers", "replicate", "references", "scrambling_layers")


def resolved(goal: Goal | None, blocks: Sequence[Block]) -> Goal | None:
    """The goal with the name of its axis, where only one field can be meant."""
    if not isinstance(goal, CriticalPointGoal) or goal.axis is not None:
        return goal
    several = [name for name in candidates(blocks) if len({v for b in blocks for v in values(b, name)}) > 1]
    able = several or candidates(blocks)
    return goal.model_copy(update={"axis": able[0]}) if len(able) == 1 else goal


def placed(blocks: Sequence[Block], goal: Goal | None) -> tuple[Block, ...]:
    """The blocks with every value that may be placed, in ascending order; as they are where nothing may be."""
    if not isinstance(goal, CriticalPointGoal) or goal.axis not in candidates(blocks) or bad_bounds(goal):
        return tuple(blocks)
    try:
        grid = goal.grid()
    except ValueError:
        return tuple(blocks)
    return tuple(_with(block, str(goal.axis), grid) for block in blocks)


def bad_bounds(goal: CriticalPointGoal) -> list[str]:
    """What is wrong with the bounds as values of the axis."""
    check = RANGES.get(goal.axis or "")
    messages = [check(bound) for bound in goal.within] if check else []
    return [message for message in messages if message]


def candidates(blocks: Sequence[Block]) -> list[str]:
    """Fields and parameters with real values that every block has."""
    common = [set(_numeric(block)) for block in blocks]
    return [name for name in _numeric(blocks[0]) if all(name in names for names in common)]


def values(block: Block, name: str) -> tuple[Any, ...]:
    """The values of a field or parameter as they stand in the block; none if they cannot be expanded."""
    axis = block.parameters.get(name) if isinstance(block, Layered) else None
    if axis is None:
        axis = getattr(block, name, None)
    if axis is None:
        return ()
    try:
        return tuple(value for _, value in located_values(axis, ""))
    except ValueError:
        return ()


def _numeric(block: Block) -> list[str]:
    names = [*type(block).model_fields, *(block.parameters if isinstance(block, Layered) else ())]
    return [
        name
        for name in names
        if name not in NOT_AN_AXIS
        and name != "trajectories"
        and (found := values(block, name))
        and all(isinstance(value, int | float) for value in found)
    ]


def _with(block: Block, name: str, grid: tuple[float, ...]) -> Block:
    own = values(block, name)
    if not own or not all(isinstance(value, int | float) for value in own):
        return block
    merged = tuple(sorted({*own, *grid})) if len(set(own)) == len(own) else own
    if isinstance(block, Layered) and name in block.parameters:
        return block.model_copy(update={"parameters": block.parameters | {name: merged}})
    return block.model_copy(update={name: merged})
