"""The stopping rule: how many trajectories per ensemble, or which standard error, is enough."""

from typing import Annotated, Any

from pydantic import BeforeValidator, Field

from sweepmill.axes import Integer, Number
from sweepmill.errors import Fault
from sweepmill.goals.models import CriticalPointGoal, Goal, LawGoal
from sweepmill.ladder import rungs
from sweepmill.times import Strict, as_tuple

DEFAULT_AT_LEAST = 200
LEAST_FOR_A_GOAL = 128
"""Two trajectories in each of the folds that the error of a derived quantity comes from."""


class StandardErrorRule(Strict):
    """Settle once the standard error of every coordinate of an observation is below a bound."""

    of: str
    below: Annotated[Number, Field(gt=0)]


def _few(number: int) -> str:
    return f"a goal is judged from at least {LEAST_FOR_A_GOAL} trajectories per ensemble, got {number}"


def _rule_list(value: Any) -> Any:
    return (value,) if isinstance(value, dict) else as_tuple(value)


class Stop(Strict):
    """Cap per ensemble, optional standard-error rules (all must hold) or one goal, optional budget in core-seconds."""

    trajectories: Annotated[Integer, Field(ge=1)]
    at_least: Annotated[Integer, Field(ge=2)] | None = None
    budget: Annotated[Number, Field(gt=0)] | None = None
    standard_error: Annotated[tuple[StandardErrorRule, ...], BeforeValidator(_rule_list)] = ()
    critical_point: CriticalPointGoal | None = None
    law: LawGoal | None = None

    @property
    def goal(self) -> Goal | None:
        """The derived quantity that decides, if one does."""
        return self.critical_point or self.law

    @property
    def first_rung(self) -> int:
        """The smallest N at which the rule is judged."""
        return min(DEFAULT_AT_LEAST, self.trajectories) if self.at_least is None else self.at_least

    def ladder(self, cap: int) -> tuple[int, ...]:
        """All N at which an ensemble with this cap is judged."""
        return rungs(self.first_rung, cap) if self.standard_error or self.goal else (cap,)

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
        if self.critical_point is not None:
            form["critical_point"] = self.critical_point.normal_form()
        if self.law is not None:
            form["law"] = self.law.normal_form()
        return form

    def faults(self, names: set[str]) -> list[Fault]:
        """What does not fit together, given the names of the sweep's observations."""
        found: list[Fault] = []
        if self.at_least is not None and self.at_least > self.trajectories:
            found.append(Fault("stop.at_least", f"{self.at_least} exceeds the cap of {self.trajectories} trajectories"))
        found += self._goal_faults(names)
        seen: set[str] = set()
        for index, rule in enumerate(self.standard_error):
            path = f"stop.standard_error[{index}].of"
            if rule.of not in names:
                found.append(Fault(path, f"no observation is named {rule.of!r}: one of {', '.join(sorted(names))}"))
            elif rule.of in seen:
                found.append(Fault(path, f"a rule for {rule.of!r} stands above already"))
            seen.add(rule.of)
        return found

    def _goal_faults(self, names: set[str]) -> list[Fault]:
        found: list[Fault] = []
        given = [("critical_point", self.critical_point), ("law", self.law)]
        goals = [(name, goal) for name, goal in given if goal is not None]
        if goals and self.first_rung < LEAST_FOR_A_GOAL:
            field = "trajectories" if self.at_least is None else "at_least"
            found.append(Fault(f"stop.{field}", _few(self.first_rung)))
        rules = [*(["standard_error"] if self.standard_error else []), *(name for name, _ in goals)]
        found += [
            Fault(f"stop.{name}.of", f"no observation is named {goal.of!r}: one of {', '.join(sorted(names))}")
            for name, goal in goals
            if goal.of not in names
        ]
        if goals and len(rules) > 1:
            found.append(Fault("stop", f"{' and '.join(rules)} cannot decide together: keep one of them"))
        return found
