"""The stopping rule: how many trajectories per ensemble, or which standard error, is enough."""

from typing import Annotated, Any

from pydantic import BeforeValidator, Field

from sweepmill.axes import Integer, Number
from sweepmill.errors import Fault
from sweepmill.ladder import rungs
from sweepmill.times import Strict, as_tuple

DEFAULT_AT_LEAST = 200


class StandardErrorRule(Strict):
    """Settle once the standard error of every coordinate of an observation is below a bound."""

    of: str
    below: Annotated[Number, Field(gt=0)]


def _rule_list(value: Any) -> Any:
    return (value,) if isinstance(value, dict) else as_tuple(value)


class Stop(Strict):
    """Cap per ensemble, optional standard-error rules (all must hold), optional budget in core-seconds."""

    trajectories: Annotated[Integer, Field(ge=1)]
    at_least: Annotated[Integer, Field(ge=2)] | None = None
    budget: Annotated[Number, Field(gt=0)] | None = None
    standard_error: Annotated[tuple[StandardErrorRule, ...], BeforeValidator(_rule_list)] = ()

    @property
    def first_rung(self) -> int:
        """The smallest N at which the rule is judged."""
        return min(DEFAULT_AT_LEAST, self.trajectories) if self.at_least is None else self.at_least

    def ladder(self, cap: int) -> tuple[int, ...]:
        """All N at which an ensemble with this cap is judged."""
        return rungs(self.first_rung, cap) if self.standard_error else (cap,)

    def normal_form(self) -> dict[str, Any]:
        """Defaults omitted, rules in order."""
        form: dict[str, Any] = {"trajectories": self.trajectories}
        if self.at_least is not None and self.at_least != min(DEFAULT_AT_LEAST, self.trajectories):
            form["at_least"] = self.at_least
        if self.budget is not None:
            form["budget"] = self.budget
        if self.standard_error:
            rules = sorted(self.standard_error, key=lambda rule: rule.of)
            form["standard_error"] = [rule.model_dump(mode="json") for rule in rules]
        return form

    def faults(self, names: set[str]) -> list[Fault]:
        """What does not fit together, given the names of the sweep's observations."""
        found: list[Fault] = []
        if self.at_least is not None and self.at_least > self.trajectories:
            found.append(Fault("stop.at_least", f"{self.at_least} exceeds the cap of {self.trajectories} trajectories"))
        seen: set[str] = set()
        for index, rule in enumerate(self.standard_error):
            path = f"stop.standard_error[{index}].of"
            if rule.of not in names:
                found.append(Fault(path, f"no observation is named {rule.of!r}: one of {', '.join(sorted(names))}"))
            elif rule.of in seen:
                found.append(Fault(path, f"a rule for {rule.of!r} stands above already"))
            seen.add(rule.of)
        return found
