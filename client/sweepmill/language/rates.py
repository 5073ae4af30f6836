"""Normal forms of rates and weights, their parameters resolved, and what is wrong with them."""

import math
from collections.abc import Iterator, Mapping, Sequence
from decimal import Decimal
from itertools import product
from typing import Any

from pydantic import BaseModel

from sweepmill.axes import normal_number
from sweepmill.errors import Fault
from sweepmill.language.numbers import Parameter

LARGEST_EXPONENT = 64  # of weights r^-exponent: beyond, pairs are nearest neighbors for every practical purpose
STEEPEST_DENSITY = (-0.9, 100)  # exponents of power-law disorder that are resolved to 2^-32 in reasonable time
SMALLEST_RATE = 1e-6  # the kernel's resolution, 2.3e-10, is 2e-4 of it
MOST_COMBINATIONS = 100_000  # of sites and layers at which weights by profile are looked at


def exponent_fault(exponent: float) -> str | None:
    """What is wrong with the exponent of random pairs."""
    if 0 <= exponent <= LARGEST_EXPONENT:
        return None
    return f"pairs are drawn with weight r^-exponent, exponent 0 to {LARGEST_EXPONENT}, got {exponent:g}"


def value_of(value: Any, given: Mapping[str, float]) -> float:
    """A number, its parameter resolved; the complement is taken in decimal arithmetic."""
    if not isinstance(value, Parameter):
        return normal_number(value)
    number = given[value.parameter]
    return normal_number(float(1 - Decimal(repr(number)))) if value.complement else normal_number(number)


def rate_form(rate: Any, given: Mapping[str, float]) -> Any:
    """A number, or a table with ``profile`` or ``disorder``; a list that repeats itself is cut to its period."""
    if isinstance(rate, Parameter) or not isinstance(rate, BaseModel):
        return value_of(rate, given)
    form = {
        field.alias or name: _resolved(getattr(rate, name), given) for name, field in type(rate).model_fields.items()
    }
    if form.get("profile") == "list":
        form["values"] = _one_period(form["values"])
        return form["values"][0] if len(form["values"]) == 1 else form
    return form


def _resolved(value: Any, given: Mapping[str, float]) -> Any:
    if isinstance(value, tuple):
        return [value_of(item, given) for item in value]
    return value if isinstance(value, str) else value_of(value, given)


def _one_period(values: list[float]) -> list[float]:
    divisors = (n for n in range(1, len(values) + 1) if len(values) % n == 0)
    return next(values[:n] for n in divisors if values == values[:n] * (len(values) // n))


def bounds(form: Any) -> tuple[float, float]:
    """Smallest and largest value that a normal form takes (a quasi-periodic one: that it comes close to)."""
    if not isinstance(form, Mapping):
        return form, form
    match form.get("profile") or form["disorder"]:
        case "list" | "two-valued":
            return min(form["values"]), max(form["values"])
        case "stripe":
            return min(form["inside"], form["outside"]), max(form["inside"], form["outside"])
        case "quasi-periodic":
            middle, swing = Decimal(repr(form["mean"])), abs(Decimal(repr(form["amplitude"])))
            return float(middle - swing), float(middle + swing)
        case "uniform":
            return form["from"], form["to"]
    return 0, form["largest"]


def rate_faults(form: Any, path: str) -> Iterator[Fault]:
    """What keeps a normal form from being a probability everywhere."""
    yield from _shape_faults(form, path)
    for where, value in _values(form, path):
        if not 0 <= value <= 1:
            yield Fault(where, f"a rate is a probability between 0 and 1, got {value:g}")
        elif 0 < value < SMALLEST_RATE:
            yield Fault(where, f"a rate is 0 or at least {SMALLEST_RATE:g} (it is resolved to 2^-32), got {value:g}")
    yield from _swing_faults(form, path, 1)


def weight_faults(forms: Sequence[Any], paths: Sequence[str], path: str, sites: int) -> Iterator[Fault]:
    """What keeps normal forms from being the weights of a choice everywhere."""
    largest = max(bounds(form)[1] for form in forms)
    before = list(_single_weight_faults(forms, paths, largest))
    yield from before
    if not before and (message := _vanishing(forms, largest, sites)):
        yield Fault(path, message)


def _single_weight_faults(forms: Sequence[Any], paths: Sequence[str], largest: float) -> Iterator[Fault]:
    for form, path in zip(forms, paths, strict=True):
        yield from _shape_faults(form, path)
        for where, value in _values(form, path):
            if value < 0:
                yield Fault(where, f"a weight is at least 0, got {value:g}")
            elif 0 < value < SMALLEST_RATE * largest:
                yield Fault(where, f"a weight is 0 or at least {SMALLEST_RATE:g} of the largest, got {value:g}")
        yield from _swing_faults(form, path, math.inf)


def _values(form: Any, path: str) -> Iterator[tuple[str, float]]:
    """Values that a form takes by themselves."""
    if not isinstance(form, Mapping):
        yield path, form
        return
    for name in ("inside", "outside", "from", "to", "largest"):
        if name in form:
            yield f"{path}.{name}", form[name]
    for index, value in enumerate(form.get("values", ())):
        yield f"{path}.values[{index}]", value


def _swing_faults(form: Any, path: str, most: float) -> Iterator[Fault]:
    if isinstance(form, Mapping) and form.get("profile") == "quasi-periodic":
        low, high = bounds(form)
        if low < 0 or high > most:
            wanted = "0 to 1" if most == 1 else "0 or more"
            yield Fault(path, f"mean and amplitude reach from {low:g} to {high:g}, must stay within {wanted}")


def _shape_faults(form: Any, path: str) -> Iterator[Fault]:
    if not isinstance(form, Mapping):
        return
    if "wavelength" in form and form["wavelength"] <= 0:
        yield Fault(f"{path}.wavelength", f"must be greater than 0, got {form['wavelength']:g}")
    if form.get("disorder") == "uniform" and form["from"] >= form["to"]:
        yield Fault(path, f"an interval runs upwards: from {form['from']:g} to {form['to']:g} does not")
    if form.get("disorder") == "two-valued" and not 0 <= form["weight"] <= 1:
        yield Fault(f"{path}.weight", f"is a probability between 0 and 1, got {form['weight']:g}")
    if form.get("disorder") == "power-law":
        lowest, highest = STEEPEST_DENSITY
        if not lowest <= form["exponent"] <= highest:
            yield Fault(
                f"{path}.exponent", f"exponents of a density are {lowest} to {highest}, got {form['exponent']:g}"
            )
        if form["largest"] <= 0:
            yield Fault(f"{path}.largest", f"must be greater than 0, got {form['largest']:g}")


def _vanishing(forms: Sequence[Any], largest: float, sites: int) -> str | None:
    """Why the weights of some place may all be 0, or so small that they are resolved to 0."""
    if largest <= 0:
        return "all weights are 0"
    if sum(bounds(form)[0] for form in forms) >= SMALLEST_RATE * largest:
        return None
    by_site, by_layer = min(_period(forms, "site"), sites), _period(forms, "layer")
    if by_site * by_layer > MOST_COMBINATIONS:
        return "the weights may all be 0 at some place: add a branch with a constant weight"
    for site, layer in product(range(by_site), range(1, by_layer + 1)):
        if sum(_least(form, site, layer) for form in forms) < SMALLEST_RATE * largest:
            return f"all weights may be 0 at site {site} in layer {layer}"
    return None


def _period(forms: Sequence[Any], by: str) -> int:
    profiles = [form for form in forms if isinstance(form, Mapping) and form.get("by") == by]
    return math.lcm(*(len(form.get("values", ())) or int(form.get("period", 1)) for form in profiles))


def _least(form: Any, site: int, layer: int) -> float:
    """Value of a list or a stripe, the smallest value of anything else."""
    if not isinstance(form, Mapping) or form.get("profile") not in ("list", "stripe"):
        return bounds(form)[0]
    index = site if form["by"] == "site" else layer
    if form["profile"] == "stripe":
        return float(form["inside"] if index % form["period"] < form["width"] else form["outside"])
    first = 0 if form["by"] == "site" else 1  # layers count from 1
    return float(form["values"][(index - first) % len(form["values"])])
