"""How many measurements and gates a circuit has on average: exact numbers, from the circuit itself."""

from collections.abc import Callable, Mapping, Sequence
from typing import Any

from sweepmill.ensemble import Ensemble
from sweepmill.language.geometry import number_of_places
from sweepmill.presets import layered_form

Step = Mapping[str, Any]
Counter = Callable[[Step, Any], float | None]
"""Mean number of something that a step has at each of its places; None where it is not a plain number."""


def measurements_until(ensemble: Ensemble, layer: int) -> float | None:
    """Mean number of recorded measurements in all layers up to this one, those before the first included.

    Forced ones do not count. None where a rate is not a plain number, so that the mean is not simply the sum.
    """
    return _until(ensemble, layer, _measurement)


def gates_until(ensemble: Ensemble, layer: int) -> float | None:
    """Mean number of two-qubit gates in the same layers; None like `measurements_until`."""
    return _until(ensemble, layer, _two_qubit_gate)


def _measurement(step: Step, _: Any) -> float | None:
    if "measure" not in step or step.get("forced") or step.get("recorded") is False:
        return 0.0
    return _rate(step)


def _two_qubit_gate(step: Step, on: Any) -> float | None:
    return _rate(step) if "apply" in step and _width(on) == 2 else 0.0


def _rate(step: Step) -> float | None:
    rate = step.get("rate", 1)
    return float(rate) if isinstance(rate, int | float) else None


def _width(on: Any) -> int:
    """Sites of a place."""
    if isinstance(on, str):
        return 2 if on.startswith("bonds") else 1
    if "places" in on:
        return len(on["places"][0])
    if "random_sequential" in on:
        return _width(on["random_sequential"]["of"])
    return 2 if "random_pairs" in on else int(on.get("blocks", {}).get("width", 1))


def _until(ensemble: Ensemble, layer: int, counter: Counter) -> float | None:
    form = layered_form(ensemble)
    repeat, after = form["repeat"], form.get("after", [])
    cell = [_of_layer(steps, ensemble, counter) for steps in repeat]
    whole, part = divmod(min(layer, ensemble.repeated), len(repeat))
    once = [*form.get("before", []), *after[: max(0, layer - ensemble.repeated)]]
    numbers = [*cell * whole, *cell[:part], *(_of_layer(steps, ensemble, counter) for steps in once)]
    return _sum(numbers)


def _of_layer(steps: Sequence[Step], ensemble: Ensemble, counter: Counter) -> float | None:
    return _sum(_of_step(step, ensemble, counter) for step in steps)


def _of_step(step: Step, ensemble: Ensemble, counter: Counter) -> float | None:
    on = step["on"]
    each = _of_choice(step["choose"], on, counter) if "choose" in step else counter(step, on)
    return None if each is None else each * number_of_places(on, ensemble.sites, ensemble.periodic)


def _of_choice(branches: Sequence[Step], on: Any, counter: Counter) -> float | None:
    weights = [branch["weight"] for branch in branches]
    numbers = [_sum(counter(step, on) for step in branch["steps"]) for branch in branches]
    if not all(isinstance(weight, int | float) for weight in weights):
        return None
    total = _sum(None if number is None else number * weight for number, weight in zip(numbers, weights, strict=True))
    return None if total is None else total / sum(weights)


def _sum(numbers: Any) -> float | None:
    """Their sum; None if one is unknown."""
    found = list(numbers)
    return None if None in found else float(sum(found))
