"""Which parameter a value comes from, said beside what is wrong with the value."""

from collections.abc import Iterable, Iterator, Mapping
from typing import Any

from sweepmill.errors import Fault
from sweepmill.language.numbers import Parameter
from sweepmill.language.program import parameter_values


def traced(faults: Iterable[Fault], parts: Mapping[str, Any], given: Mapping[str, float]) -> Iterator[Fault]:
    """The faults, those of a parameter's value with its name; ``parts`` are what was written, by path."""
    origins = {where: _origin(found, given) for path in parts for where, found in parameter_values(parts[path], path)}
    for path, message in faults:
        yield Fault(path, f"{message} ({origins[path]})" if path in origins else message)


def _origin(value: Parameter, given: Mapping[str, float]) -> str:
    named = f"{value.parameter} = {given[value.parameter]:g}"
    return f"1 - {value.parameter}, {named}" if value.complement else named
