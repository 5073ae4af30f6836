"""A whole circuit as written, and a walk over its steps."""

from collections.abc import Iterator
from typing import Any, NamedTuple

from pydantic import BaseModel

from sweepmill.language.numbers import Disorder, Parameter
from sweepmill.language.steps import Choose

PARTS = ("before", "repeat", "after")


class Program(NamedTuple):
    """Layers done once, layers taken in turn, layers done once at the end."""

    before: tuple[Any, ...]
    repeat: tuple[Any, ...]
    after: tuple[Any, ...]


class Visit(NamedTuple):
    """A step with its path; ``on`` is where it acts, which branches inherit."""

    part: str
    path: str
    step: Any
    on: Any
    on_path: str
    inside: bool
    """Whether the step stands in a branch of a choice."""


def layers_of(program: Program, path: str) -> Iterator[tuple[str, str, tuple[Any, ...]]]:
    """Part, path and steps of every layer."""
    for part, layers in zip(PARTS, program, strict=True):
        for index, layer in enumerate(layers):
            yield part, f"{path}.{part}[{index}]", layer


def visits(program: Program, path: str) -> Iterator[Visit]:
    """Every step, depth first."""
    for part, where, layer in layers_of(program, path):
        for visit in steps_of(layer, where):
            yield visit._replace(part=part)


def steps_of(steps: tuple[Any, ...], path: str) -> Iterator[Visit]:
    """The steps of one layer, depth first: a choice comes before the steps of its branches."""
    yield from _steps(steps, path, None, "", False)


def _steps(steps: tuple[Any, ...], path: str, on: Any, on_path: str, inside: bool) -> Iterator[Visit]:
    for index, step in enumerate(steps):
        here = f"{path}[{index}]"
        place, place_path = (on, on_path) if inside else (step.on, f"{here}.on")
        yield Visit("", here, step, place, place_path, inside)
        if isinstance(step, Choose):
            for number, branch in enumerate(step.choose):
                yield from _steps(branch.steps, f"{here}.choose[{number}].steps", place, place_path, True)


def parameters_in(value: Any, path: str) -> Iterator[tuple[str, str]]:
    """Path and name of every parameter that a piece of the language mentions."""
    for where, part in parameter_values(value, path):
        yield f"{where}.parameter", part.parameter


def parameter_values(value: Any, path: str) -> Iterator[tuple[str, Parameter]]:
    """The same with the path of the value that is a parameter's, or 1 minus it."""
    for where, part in _parts(value, path):
        if isinstance(part, Parameter):
            yield where, part


def disorders_in(value: Any) -> int:
    """Number of quenched disorders."""
    return sum(isinstance(part, Disorder) for _, part in _parts(value, ""))


def _parts(value: Any, path: str) -> Iterator[tuple[str, Any]]:
    if isinstance(value, tuple):
        for index, item in enumerate(value):
            yield from _parts(item, f"{path}[{index}]")
    elif isinstance(value, BaseModel):
        yield path, value
        for name, field in type(value).model_fields.items():
            yield from _parts(getattr(value, name), f"{path}.{field.alias or name}")
