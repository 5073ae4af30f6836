"""What the plan hands out."""

from dataclasses import dataclass


@dataclass(frozen=True)
class Task:
    """Trajectories [first, first + count) of an ensemble with some observations, for one owner's request."""

    ensemble: str
    observations: tuple[str, ...]
    first: int
    count: int
    sweep: str
    owner: str
    attempt: int
    seconds: float  # predicted core-seconds
    number: int = 0  # unique within a plan

    @property
    def end(self) -> int:
        """First trajectory after it."""
        return self.first + self.count

    @property
    def key(self) -> str:
        """Name of the task: never used twice, not by another attempt or other observations either."""
        return f"{self.ensemble}-{self.first}-{self.attempt}-{self.number}"


@dataclass(frozen=True)
class SizeRules:
    """How much work a task holds, in core-seconds."""

    batch_seconds: float = 4.0
    first_batch_seconds: float = 0.5
    first_batch_count: int = 4000  # however cheap its trajectories are thought to be before they were measured
    least_seconds: float = 0.25  # at the end of a sweep tasks are not split below this
    growth: int = 4  # a batch is at most so many times the largest one that came back
