"""The normal form of a circuit written as data: what keys hash and what is sampled.

Plain data with one spelling: places folded, parameters resolved to numbers, defaults left out.
"""

from collections.abc import Iterable, Iterator, Mapping
from typing import Any

from sweepmill.errors import Fault
from sweepmill.language.geometry import on_form, place_faults, word_of
from sweepmill.language.numbers import ListProfile
from sweepmill.language.origin import traced
from sweepmill.language.places import Blocks, RandomPairs, Sublattice
from sweepmill.language.program import Program, parameters_in, visits
from sweepmill.language.rates import exponent_fault, rate_faults, rate_form, value_of, weight_faults
from sweepmill.language.steps import Branch, Choose


class Chain:
    """The size that a circuit is resolved at."""

    def __init__(self, sites: int, periodic: bool) -> None:
        self.sites = sites
        self.periodic = periodic

    def place_faults(self, program: Program, path: str) -> Iterator[Fault]:
        """Places that are not there at this size."""
        for visit in visits(program, path):
            if not visit.inside:
                yield from place_faults(visit.on, visit.on_path, self.sites, self.periodic)


class Resolution:
    """A circuit at one size and one value of every parameter: its normal form and its faults."""

    def __init__(self, chain: Chain, given: Mapping[str, float]) -> None:
        self.chain = chain
        self.given = given
        self.faults: list[Fault] = []

    def program(self, program: Program, path: str) -> dict[str, list[list[dict[str, Any]]]]:
        """``before``, ``repeat`` and ``after`` as lists of layers of steps."""
        return {
            part: [self._steps(layer, f"{path}.{part}[{index}]") for index, layer in enumerate(layers)]
            for part, layers in zip(Program._fields, program, strict=True)
        }

    def _steps(self, steps: tuple[Any, ...], path: str) -> list[dict[str, Any]]:
        return [self._step(step, f"{path}[{index}]") for index, step in enumerate(steps)]

    def _step(self, step: Any, path: str) -> dict[str, Any]:
        form: dict[str, Any] = {}
        for name in type(step).model_fields:
            value = getattr(step, name)
            if name == "on":
                form |= {"on": self._on(value, f"{path}.on")} if value is not None else {}
            elif name == "rate":
                form |= self._rate(value, f"{path}.rate")
            elif name == "choose":
                form["choose"] = self._branches(step, path)
            elif value != type(step).model_fields[name].default:
                form[name] = value
        return form

    def _on(self, on: Any, path: str) -> Any:
        if not isinstance(on, RandomPairs):
            return on_form(on, self.chain.sites, self.chain.periodic)
        exponent = value_of(on.random_pairs.exponent, self.given)
        if message := exponent_fault(exponent):
            where = f"{path}.random_pairs.exponent"
            self._note([Fault(where, message)], {where: on.random_pairs.exponent})
        return on_form(on, self.chain.sites, self.chain.periodic, exponent)

    def _rate(self, rate: Any, path: str) -> dict[str, Any]:
        form = rate_form(rate, self.given)
        self._note(rate_faults(form, path), {path: rate})
        return {} if form == 1 else {"rate": form}

    def _note(self, faults: Iterable[Fault], parts: Mapping[str, Any]) -> None:
        """Keep the faults of some parts of the circuit as written, by path."""
        self.faults.extend(traced(faults, parts, self.given))

    def _branches(self, step: Choose, path: str) -> list[dict[str, Any]]:
        weights = [rate_form(branch.weight, self.given) for branch in step.choose]
        paths = [f"{path}.choose[{index}].weight" for index in range(len(weights))]
        written = {where: branch.weight for where, branch in zip(paths, step.choose, strict=True)}
        self._note(weight_faults(weights, paths, f"{path}.choose", self.chain.sites), written)
        return [
            {"weight": weight, "steps": self._steps(branch.steps, f"{path}.choose[{index}].steps")}
            for index, (weight, branch) in enumerate(zip(weights, step.choose, strict=True))
        ]


def written_form(part: Any) -> Any:
    """A piece of the language as plain data with its parameters by name: synonyms folded, defaults left out."""
    if isinstance(part, Branch):
        return {"weight": written_form(part.weight), "steps": written_form(part.steps)}
    if isinstance(part, ListProfile) and not any(parameters_in(part, "")):
        return rate_form(part, {})
    if isinstance(part, Blocks | Sublattice) and (word := word_of(part)):
        return word
    if isinstance(part, tuple):
        return [written_form(item) for item in part]
    if not hasattr(type(part), "model_fields"):
        return part
    return {
        field.alias or name: written_form(value)
        for name, field in type(part).model_fields.items()
        if (value := getattr(part, name)) != field.default
    }
