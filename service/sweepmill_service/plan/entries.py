"""One ensemble in the plan: what is covered, which sweeps want it, and how far."""

from collections.abc import Iterable
from dataclasses import dataclass, field

from sweepmill_service.plan.costs import Calibration
from sweepmill_service.plan.marks import COMMON_MARKS, Reach, ladder, next_mark, next_rung
from sweepmill_service.plan.task import Task

WORTH_KEEPING = 1.0  # core-seconds in a total: less is sampled again sooner than a batch is cut for it
NOTHING = Reach(0, frozenset())


@dataclass
class Track:
    """Ranges of one observation that are stored or under way: a prefix and islands beyond it (first -> count)."""

    reach: Reach = NOTHING
    islands: dict[int, int] = field(default_factory=dict)

    @property
    def next_needed(self) -> int:
        """First trajectory that is neither stored nor under way."""
        end = self.reach.prefix
        while end in self.islands:
            end += self.islands[end]
        return end

    def room(self, first: int) -> int | None:
        """Where the next island after ``first`` begins, None if nothing lies ahead."""
        return min((start for start in self.islands if start > first), default=None)

    def set_reach(self, reach: Reach) -> None:
        """Take over what the store knows; islands inside the prefix are done."""
        self.reach = reach
        for first in [first for first in self.islands if first < reach.prefix]:
            del self.islands[first]


@dataclass
class PlanMember:
    """An ensemble within one live sweep."""

    sweep: str
    ordinal: int
    cap: int
    judged: int
    at_least: int
    has_rules: bool
    observations: tuple[str, ...]
    needed: int | None = None  # extrapolated at the last judgement
    remaining: float = 0.0  # predicted core-seconds, as counted in its sweep

    @property
    def ladder(self) -> tuple[int, ...]:
        """All N at which it is judged."""
        return ladder(self.at_least, self.cap, self.has_rules)


@dataclass
class Entry:
    """An ensemble wanted by at least one live sweep."""

    key: str
    default_seconds: float
    measured_seconds: float | None
    calibration: Calibration
    stuck: bool = False
    largest: int = 0  # trajectories of the largest batch that came back
    tracks: dict[str, Track] = field(default_factory=dict)
    members: dict[str, PlanMember] = field(default_factory=dict)
    faults: dict[int, int] = field(default_factory=dict)  # first -> failed attempts
    kept_bytes: dict[str, int] = field(default_factory=dict)  # by observation, of one trajectory
    version: int = 0

    @property
    def seconds_per_trajectory(self) -> float:
        """Measured if possible; always positive."""
        if self.measured_seconds is None:
            return max(self.default_seconds * self.calibration.factor, 1e-9)
        return max(self.measured_seconds, 1e-9)

    def track(self, observation: str) -> Track:
        """Ranges of an observation."""
        return self.tracks.setdefault(observation, Track())

    def first_needed(self, member: PlanMember) -> int:
        """Next trajectory that a sweep lacks in one of its observations."""
        return min(self.track(key).next_needed for key in member.observations)

    def next_judged(self, member: PlanMember) -> int:
        """The N at which the sweep judges it next."""
        rung = next_rung(member.ladder, member.judged)
        return next_mark(rung, (self.track(key).reach for key in member.observations))

    def likely_target(self, member: PlanMember) -> int:
        """The N it will surely or probably be sampled to: the next judgement, or the rung its rule asks for."""
        certain = self.next_judged(member)
        if member.needed is None:
            return certain
        return max(certain, _rung_at(member.ladder, member.needed))

    def speculative_target(self, member: PlanMember) -> int:
        """One rung further: what may be sampled while a judgement is under way."""
        likely = self.likely_target(member)
        return max(likely, next((step for step in member.ladder if step > likely), likely))

    def cut(self, first: int) -> int | None:
        """The next N after ``first`` at which a total must be kept: no task crosses it."""
        worth = WORTH_KEEPING / self.seconds_per_trajectory
        ahead = [number for number in COMMON_MARKS if number > first and number >= worth][:1]
        ahead += [
            step
            for member in self.members.values()
            for step in (self.next_judged(member), *member.ladder)
            if step > first
        ]
        return min(ahead, default=None)

    def place(self, task: Task) -> None:
        """Count a task's range as covered."""
        for key in task.observations:
            self.track(key).islands[task.first] = task.count

    def release(self, task: Task) -> None:
        """A task ended without being stored."""
        for key in task.observations:
            self.track(key).islands.pop(task.first, None)

    def limit(self, observation: str, speculative: bool) -> int:
        """How far an observation may be sampled, over all sweeps that want it."""
        target = self.speculative_target if speculative else self.likely_target
        wanting = [member for member in self.members.values() if observation in member.observations]
        return max((target(member) for member in wanting), default=0)

    def observations(self) -> Iterable[str]:
        """Observations that some live sweep wants, each once."""
        return dict.fromkeys(key for member in self.members.values() for key in member.observations)


def _rung_at(steps: tuple[int, ...], number: int) -> int:
    return next((step for step in steps if step >= number), steps[-1])
