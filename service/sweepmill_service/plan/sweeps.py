"""One live sweep in the plan."""

from collections.abc import Callable
from dataclasses import dataclass, field
from typing import NamedTuple

from sweepmill_service.plan.queue import Item, LazyQueue


@dataclass(frozen=True)
class Request:
    """One owner's request."""

    owner: str
    priority: int
    at: float


class Waiting(NamedTuple):
    """What an owner's request for a sweep still has to be given: core-seconds, under way or waiting."""

    owner: str
    sweep: str
    priority: int
    at: float
    core_seconds: float

    @property
    def rank(self) -> tuple[int, float]:
        """Smaller comes first among the owner's sweeps."""
        return -self.priority, self.at


@dataclass
class SweepInfo:
    """What the plan must know of a sweep besides its ensembles."""

    key: str
    requests: tuple[Request, ...]
    observations: tuple[str, ...]
    at_least: int
    has_rules: bool
    budget: float | None
    core_seconds: float  # charged so far
    has_goal: bool = False  # judged in rounds


@dataclass
class PlanSweep:
    """A live sweep with its open ensembles, and those among them that have work, in two queues."""

    info: SweepInfo
    is_current: Callable[[Item], bool]
    open: set[str] = field(default_factory=set)
    remaining: float = 0.0  # predicted core-seconds not handed out yet
    under_way: float = 0.0  # predicted core-seconds handed out

    def __post_init__(self) -> None:
        self.likely = LazyQueue(self.is_current)
        self.speculative = LazyQueue(self.is_current)

    def waiting(self) -> list[Waiting]:
        """One part for each owner, who share the work."""
        left = max(0.0, min(self.remaining + self.under_way, self.budget_left() + self.under_way))
        requests = self.info.requests
        return [Waiting(one.owner, self.info.key, one.priority, one.at, left / len(requests)) for one in requests]

    def queue(self, speculative: bool) -> LazyQueue:
        """Work that is surely or probably needed, or work for while a judgement is under way."""
        return self.speculative if speculative else self.likely

    def budget_left(self) -> float:
        """Core-seconds that may still be handed out."""
        if self.info.budget is None:
            return float("inf")
        return self.info.budget - self.info.core_seconds - self.under_way

    def spent(self) -> bool:
        """Whether the budget is used up."""
        return self.info.budget is not None and self.info.core_seconds >= self.info.budget
