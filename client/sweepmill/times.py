"""When an observation is read: the field ``at`` and the layers it stands for.

A unit cell is as many consecutive layers as the circuit takes to repeat: two on a chain, four on the square lattice. It
is named by its last layer. Layers count from 1 to the ensemble's ``layers``.
"""

import itertools
from typing import Annotated, Any, Literal, NamedTuple

from pydantic import AfterValidator, BaseModel, BeforeValidator, ConfigDict, Discriminator, Field, Tag
from pydantic_core import PydanticCustomError

from sweepmill.axes import Flag, Integer, Number, nonempty

MOST_READINGS = 100_000
ADJACENT = 2  # default of a window's `every`: omitted from keys, so it stays what it was before there were longer cells


class Strict(BaseModel):
    """Frozen, unknown fields refused."""

    model_config = ConfigDict(frozen=True, extra="forbid")


class Every(Strict):
    """A series of unit-cell means (or single layers) at n, 2n, 3n, …"""

    every: Annotated[Integer, Field(ge=1)]
    single_layers: Flag = False


class LogSpaced(Strict):
    """A series of at most n unit cells (or single layers), evenly spaced in the logarithm of the layer."""

    log_spaced: Annotated[Integer, Field(ge=2, le=1000)]
    single_layers: Flag = False


class Window(Strict):
    """The unit cells in the last part of the layers, one every so many layers.

    By default one after the other, also where a cell is longer than two layers.
    """

    last: Annotated[Number, Field(gt=0, le=1)] = 0.5
    every: Annotated[Integer, Field(ge=1)] = ADJACENT


class AverageOver(Strict):
    """The mean over late unit cells: one number per trajectory."""

    average_over: Window


def as_tuple(value: Any) -> Any:
    """Lists become tuples, so that models stay hashable."""
    return tuple(value) if isinstance(value, list) else value


def distinct_sorted(values: tuple[int, ...]) -> tuple[int, ...]:
    """Ascending order, which means the same; a value given twice is refused."""
    ordered = tuple(sorted(values))
    for first, second in itertools.pairwise(ordered):
        if first == second:
            raise PydanticCustomError("duplicate", "{value} stands twice in this list", {"value": first})
    return ordered


def _form(value: Any) -> str:
    if isinstance(value, list | tuple):
        return "at-layers"
    if not isinstance(value, dict | Strict):
        return "at-word"
    keys = value.keys() if isinstance(value, dict) else type(value).model_fields.keys()
    if "log_spaced" in keys:
        return "at-log-spaced"
    return "at-average" if "average_over" in keys else "at-every"


AT_TAGS = frozenset({"at-word", "at-layers", "at-every", "at-log-spaced", "at-average"})

LayerList = Annotated[
    tuple[Annotated[Integer, Field(ge=1)], ...],
    BeforeValidator(as_tuple),
    AfterValidator(nonempty),
    AfterValidator(distinct_sorted),
]
At = Annotated[
    Annotated[Literal["last-cell", "end"], Tag("at-word")]
    | Annotated[LayerList, Tag("at-layers")]
    | Annotated[Every, Tag("at-every")]
    | Annotated[LogSpaced, Tag("at-log-spaced")]
    | Annotated[AverageOver, Tag("at-average")],
    Discriminator(_form),
]


class Reading(NamedTuple):
    """One time coordinate: its name in the table (None where the time is not a coordinate) and the layers averaged."""

    layer: int | None
    layers: tuple[int, ...]


def readings(at: Any, layers: int, cell: int = 2) -> tuple[Reading, ...]:
    """The time coordinates of ``at`` in a circuit of ``layers`` layers whose unit cell is ``cell`` layers.

    Raises ValueError saying what would pass.
    """
    if at == "end":
        return (Reading(None, (layers,)),)
    if at == "last-cell":
        _need(layers >= cell, f"'last-cell' averages {cell} layers and the circuit has {layers}: use at = \"end\"")
        return (Reading(None, _cell(layers, cell)),)
    if isinstance(at, tuple):
        _need(at[-1] <= layers, f"layer {at[-1]} is beyond the last layer, {layers}")
        return tuple(Reading(n, (n,)) for n in at)
    if isinstance(at, AverageOver):
        return (Reading(None, _window(at.average_over, layers, cell)),)
    length = 1 if at.single_layers else cell
    if isinstance(at, LogSpaced):
        return _series(_log_spaced(at.log_spaced, length, layers), length)
    _need(at.every >= length, f"unit cells overlap below every = {cell}: use single_layers = true")
    _need(at.every <= layers, f"every = {at.every} is beyond the last layer, {layers}")
    _need_few(layers // at.every)
    return _series(tuple(range(at.every, layers + 1, at.every)), length)


def check_cells(at: Any, times: tuple[Reading, ...], repeated: int) -> None:
    """Raise ValueError where a unit cell reaches beyond the ``repeated`` layers, into those of ``after``."""
    if at == "end" or isinstance(at, tuple) or getattr(at, "single_layers", False):
        return
    name = "the last cell" if at == "last-cell" else "a unit cell"
    single = "" if isinstance(at, AverageOver) or at == "last-cell" else ", or single_layers = true"
    _need(
        max(time.layers[-1] for time in times) <= repeated,
        f'{name} would mix layers of `after` with the circuit: use at = "end" or a list of layers{single}',
    )


def _need(condition: bool, message: str) -> None:
    if not condition:
        raise ValueError(message)


def _need_few(count: int) -> None:
    _need(count <= MOST_READINGS, f"reads {count} cells, at most {MOST_READINGS} pass: read fewer")


def _cell(end: int, length: int) -> tuple[int, ...]:
    return tuple(range(end - length + 1, end + 1))


def _series(ends: tuple[int, ...], length: int) -> tuple[Reading, ...]:
    return tuple(Reading(n, _cell(n, length)) for n in ends)


def _window(window: Window, layers: int, cell: int) -> tuple[int, ...]:
    every = max(window.every, cell) if window.every == ADJACENT else window.every
    _need(every >= cell, f"unit cells overlap below every = {cell}")
    # twelve-digit decimals: the product rounded at nine places is the exact border where it is an integer
    _need_few(int(layers * window.last) // every)
    border = round(layers * (1 - window.last), 9)
    ends = [end for end in range(layers, cell - 1, -every) if end - cell + 1 > border]
    _need(bool(ends), f"the last {window.last} of {layers} layers holds no whole unit cell of {cell} layers")
    return tuple(sorted(n for end in ends for n in _cell(end, cell)))


def _log_spaced(points: int, first: int, layers: int) -> tuple[int, ...]:
    _need(layers > first, f"a log-spaced series needs more than {first} layers, the circuit has {layers}")
    power = points - 1
    return tuple(sorted({_log_point(first, layers, i, power) for i in range(points)}))


def _log_point(first: int, last: int, step: int, steps: int) -> int:
    """Largest n with n^steps <= first^(steps - step) last^step: exact, so that every machine reads the same layers."""
    target = first ** (steps - step) * last**step
    guess: int = round(first * (last / first) ** (step / steps))
    while guess**steps > target:
        guess -= 1
    while (guess + 1) ** steps <= target:
        guess += 1
    return guess
