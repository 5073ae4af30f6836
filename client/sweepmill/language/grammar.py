"""Faults of a circuit written as data that no size and no value of a parameter can mend."""

from collections.abc import Iterable, Iterator
from typing import Any

from sweepmill.errors import Fault
from sweepmill.language.gates import GATES, RANDOM_GATES
from sweepmill.language.numbers import Disorder, Stripe
from sweepmill.language.places import WIDEST_PLACE, Places, is_random, place_width
from sweepmill.language.program import Program, Visit, disorders_in, layers_of, parameters_in, steps_of, visits
from sweepmill.language.rates import rate_faults, rate_form
from sweepmill.language.refusal import near
from sweepmill.language.steps import Apply, Choose, Measure, SwapIn

MOST_STEPS = 47  # of a layer: each has random words of its own kind, and kinds are numbered
MOST_DISORDERS = 48


def grammar_faults(program: Program, parameters: Iterable[str], path: str) -> Iterator[Fault]:
    """Every such fault with its path."""
    yield from _parameter_faults(program, tuple(parameters), path)
    for _, where, layer in layers_of(program, path):
        if (count := sum(1 for _ in steps_of(layer, where))) > MOST_STEPS:
            yield Fault(where, f"a layer has at most {MOST_STEPS} steps, those of branches included, got {count}")
    if (count := disorders_in(tuple(program))) > MOST_DISORDERS:
        yield Fault(path, f"a circuit has at most {MOST_DISORDERS} quenched disorders, got {count}")
    for visit in visits(program, path):
        yield from _place_faults(visit)
        if visit.on is not None:
            yield from _step_faults(visit)


def _parameter_faults(program: Program, names: tuple[str, ...], path: str) -> Iterator[Fault]:
    used = set()
    for part, layers in zip(Program._fields, program, strict=True):
        for where, name in parameters_in(layers, f"{path}.{part}"):
            used.add(name)
            if name not in names:
                known = f"one of {', '.join(names)}" if names else "the circuit has no parameters"
                yield Fault(where, f"unknown parameter {name!r}: {known}")
    for name in names:
        if name not in used:
            yield Fault(f"{path}.parameters.{name}", f"no step uses this parameter{near(name, used - set(names))}")


def _place_faults(visit: Visit) -> Iterator[Fault]:
    if visit.inside:
        if visit.step.on is not None:
            yield Fault(f"{visit.path}.on", "a step of a branch acts where its choice acts: leave 'on' out")
    elif visit.on is None:
        yield Fault(visit.on_path, "is missing")
    elif isinstance(visit.on, Places):
        yield from _listed_faults(visit.on, f"{visit.on_path}.places")


def _listed_faults(on: Places, path: str) -> Iterator[Fault]:
    first = len(on.places[0]) if on.places else 0
    for index, place in enumerate(on.places):
        where = f"{path}[{index}]"
        if not 1 <= len(place) <= WIDEST_PLACE:
            yield Fault(where, f"a place has 1 to {WIDEST_PLACE} sites, got {len(place)}")
        elif len(place) != first:
            yield Fault(where, f"all places of a step have equally many sites: {first} in the first, {len(place)} here")
        if len(set(place)) < len(place):
            yield Fault(where, "the sites of a place are distinct")


def _step_faults(visit: Visit) -> Iterator[Fault]:
    step = visit.step
    if isinstance(step, Apply):
        yield from _gate_faults(visit, step)
    elif isinstance(step, Measure):
        yield from _measurement_faults(visit, step)
    elif isinstance(step, SwapIn):
        yield from _swap_faults(visit)
    yield from _number_faults(visit)


def _gate_faults(visit: Visit, step: Apply) -> Iterator[Fault]:
    width, random = place_width(visit.on), step.apply in RANDOM_GATES
    if width is not None and width not in GATES[step.apply]:
        wanted = " or ".join(map(str, GATES[step.apply]))
        yield Fault(f"{visit.path}.apply", f"{step.apply} acts on {wanted} sites, the places have {width}")
    if step.fixed and not random:
        yield Fault(f"{visit.path}.fixed", f"{step.apply} is a definite gate: only a random one can be drawn and fixed")
    if step.fixed and is_random(visit.on):
        yield Fault(f"{visit.path}.fixed", "the places are drawn anew in every layer, so no gate belongs to a place")
    if step.rotated and not random:
        yield Fault(f"{visit.path}.rotated", f"only a random gate can be rotated, {step.apply} is a definite one")
    if step.rotated and step.fixed == "ensemble":
        yield Fault(f"{visit.path}.rotated", "its projections are forced: the gate has to be drawn for each trajectory")
    if step.rotated and width == 1:
        yield Fault(f"{visit.path}.rotated", "only a gate of two sites can be rotated")


def _measurement_faults(visit: Visit, step: Measure) -> Iterator[Fault]:
    width = place_width(visit.on)
    if width is not None and width != len(step.measure):
        message = f"{step.measure} is a product of {_sites(len(step.measure))}, the places have {width}"
        yield Fault(f"{visit.path}.measure", message)
    if step.forced and not step.recorded:
        yield Fault(f"{visit.path}.forced", "an outcome that is not recorded cannot be forced")


def _swap_faults(visit: Visit) -> Iterator[Fault]:
    where = f"{visit.path}.swap_in"
    if visit.part == "repeat":
        yield Fault(
            where, "each swap takes a new reference qubit, so it stands in 'before' or 'after', not in 'repeat'"
        )
    if visit.inside:
        yield Fault(where, "the number of reference qubits is the same in every trajectory, so no choice can swap")
    if is_random(visit.on):
        yield Fault(visit.on_path, "a swap needs definite places")
    if place_width(visit.on) not in (1, None):
        yield Fault(visit.on_path, f"a swap acts on single sites, the places have {place_width(visit.on)}")


def _number_faults(visit: Visit) -> Iterator[Fault]:
    for where, rate in rates_of(visit):
        if isinstance(rate, Disorder) and is_random(visit.on):
            yield Fault(where, "the places are drawn anew in every layer, so no quenched value belongs to a place")
        if isinstance(rate, Stripe) and rate.width > rate.period:
            yield Fault(f"{where}.width", f"exceeds the period, {rate.period}")


def literal_faults(program: Program, path: str) -> Iterator[Fault]:
    """What is wrong with rates whose values are all written out."""
    for visit in visits(program, path):
        if not isinstance(visit.step, Choose | SwapIn) and not any(parameters_in(visit.step.rate, "")):
            yield from rate_faults(rate_form(visit.step.rate, {}), f"{visit.path}.rate")


def rates_of(visit: Visit) -> Iterator[tuple[str, Any]]:
    """The rate of a step or the weights of its branches, with their paths."""
    if isinstance(visit.step, Choose):
        for index, branch in enumerate(visit.step.choose):
            yield f"{visit.path}.choose[{index}].weight", branch.weight
    elif not isinstance(visit.step, SwapIn):
        yield f"{visit.path}.rate", visit.step.rate


def _sites(number: int) -> str:
    return f"{number} site" if number == 1 else f"{number} sites"
