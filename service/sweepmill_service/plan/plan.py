"""The plan: every open ensemble of every live sweep, and the choice of the next task.

It is kept in memory, follows the store by increments and is rebuilt from it at start; nothing in it must be saved.
"""

from collections import defaultdict
from collections.abc import Collection, Iterable
from dataclasses import dataclass, field, replace
from itertools import count

from sweepmill_service.plan.costs import Calibration
from sweepmill_service.plan.cutting import batch_seconds, next_task
from sweepmill_service.plan.entries import Entry, PlanMember, Track
from sweepmill_service.plan.fair import FairShare
from sweepmill_service.plan.marks import Reach
from sweepmill_service.plan.queue import Item
from sweepmill_service.plan.sweeps import PlanSweep, Request, SweepInfo, Waiting
from sweepmill_service.plan.task import SizeRules, Task


@dataclass
class EnsembleInfo:
    """What the store knows of an open ensemble of a sweep; by observation key."""

    key: str
    cap: int
    judged: int
    default_seconds: float
    measured_seconds: float | None
    kind: str = ""  # of work: ensembles of one kind in one sweep, whose defaults rest on the same, learn together
    stuck: bool = False
    reaches: dict[str, Reach] = field(default_factory=dict)
    islands: dict[str, dict[int, int]] = field(default_factory=dict)
    faults: dict[int, int] = field(default_factory=dict)
    kept_bytes: dict[str, int] = field(default_factory=dict)  # of one trajectory, where values are kept


class Plan:
    """Chooses owner, then sweep by priority and age, then the ensemble furthest from its rule."""

    def __init__(self, rules: SizeRules | None = None) -> None:
        self.rules = rules or SizeRules()
        self.sweeps: dict[str, PlanSweep] = {}
        self.entries: dict[str, Entry] = {}
        self.under_way: dict[str, Task] = {}
        self.stuck: set[str] = set()
        self.share = FairShare()
        self.calibrations: defaultdict[tuple[str, str], Calibration] = defaultdict(Calibration)
        self._numbers = count(1)  # of versions of entries and of tasks: none ever returns

    # --- sweeps come, change and go

    def add_sweep(self, info: SweepInfo, ensembles: Iterable[EnsembleInfo]) -> None:
        """Take up a sweep with its open ensembles, in table order."""
        sweep = PlanSweep(info, self._is_current)
        self.sweeps[info.key] = sweep
        for ordinal, one in enumerate(ensembles):
            entry = self._entry(info.key, one)
            entry.members[info.key] = PlanMember(
                info.key, ordinal, one.cap, one.judged, info.at_least, info.has_rules, info.observations
            )
            sweep.open.add(one.key)
        for key in sweep.open:
            self._refresh(self.entries[key])

    def update_requests(self, key: str, requests: tuple[Request, ...]) -> None:
        """Other owners, priorities."""
        self.sweeps[key].info.requests = requests

    def remove_sweep(self, key: str) -> None:
        """Forget a sweep; what is under way for it ends by itself."""
        sweep = self.sweeps.pop(key, None)
        for one in () if sweep is None else tuple(sweep.open):
            self._leave(key, one)
        for of in [of for of in self.calibrations if of[0] == key]:
            del self.calibrations[of]

    # --- the choice

    def choose(self, threads: int) -> Task | None:
        """The next task for a pool of ``threads``, counted as under way from now on; None if there is no work."""
        for speculative in (False, True):
            work = self._work(speculative)
            if work:
                owner = self.share.choose(work.keys())
                return self._begin(self._cut(owner, work[owner], speculative, threads))
        return None

    def _work(self, speculative: bool) -> dict[str, PlanSweep]:
        """For each owner with work the sweep that comes first."""
        first: dict[str, tuple[tuple[int, float, str], PlanSweep]] = {}
        for key, sweep in self.sweeps.items():
            if sweep.budget_left() <= 0 or sweep.queue(speculative).peek() is None:
                continue
            for request in sweep.info.requests:
                rank = (-request.priority, request.at, key)
                if request.owner not in first or rank < first[request.owner][0]:
                    first[request.owner] = (rank, sweep)
        return {owner: sweep for owner, (_, sweep) in first.items()}

    def _cut(self, owner: str, sweep: PlanSweep, speculative: bool, threads: int) -> Task:
        item = sweep.queue(speculative).peek()
        assert item is not None
        entry = self.entries[item.ensemble]
        seconds = batch_seconds(entry, self.rules, sweep.remaining, threads)
        seconds = min(seconds, sweep.budget_left())
        task = next_task(entry, entry.members[sweep.info.key], owner, seconds, speculative)
        assert task is not None
        return task

    def _begin(self, cut: Task) -> Task:
        task = replace(cut, number=next(self._numbers))
        self.under_way[task.key] = task
        self.share.charge(task.owner, task.seconds)
        self.sweeps[task.sweep].under_way += task.seconds
        entry = self.entries[task.ensemble]
        entry.place(task)
        self._refresh(entry)
        return task

    # --- tasks end

    def landed(self, task: Task, seconds: float) -> None:
        """A task came back with a result that cost ``seconds``; its range stays covered."""
        self._ended(task, seconds)
        if task.sweep in self.sweeps:
            self.sweeps[task.sweep].info.core_seconds += seconds
        if (entry := self.entries.get(task.ensemble)) is not None:
            entry.largest = max(entry.largest, task.count)
            latest = seconds / task.count
            before = entry.measured_seconds
            if before is None:
                entry.calibration.note(entry.default_seconds, latest)
            entry.measured_seconds = latest if before is None else (before + latest) / 2

    def lost(self, task: Task, failures: int | None = None) -> None:
        """A task came back without one, after so many ``failures`` of its batch; its range is open again."""
        self._ended(task, 0.0 if failures is None else task.seconds)
        if (entry := self.entries.get(task.ensemble)) is not None:
            entry.release(task)
            if failures is not None:
                entry.faults[task.first] = failures
            self._refresh(entry)

    def _ended(self, task: Task, seconds: float) -> None:
        del self.under_way[task.key]
        self.share.correct(task.owner, task.seconds, seconds)
        if task.sweep in self.sweeps:
            self.sweeps[task.sweep].under_way -= task.seconds

    # --- the store moves on

    def set_reaches(self, reaches: dict[tuple[str, str], Reach]) -> None:
        """Take over how far observations are."""
        for (key, observation), reach in reaches.items():
            if (entry := self.entries.get(key)) is not None:
                entry.track(observation).set_reach(reach)
        self._refresh_all({key for key, _ in reaches})

    def set_ranges(self, key: str, reaches: dict[str, Reach], islands: dict[str, dict[int, int]]) -> None:
        """Replace what was thought to be covered by what is stored, and what is under way."""
        if (entry := self.entries.get(key)) is not None:
            entry.tracks = {name: Track(reach) for name, reach in reaches.items()}
            self._cover(entry, islands)
            self._refresh(entry)

    def judged(self, sweep: str, ensemble: str, number: int, needed: int | None) -> None:
        """A rule was judged at ``number`` and not met."""
        entry = self.entries.get(ensemble)
        if entry is not None and sweep in entry.members:
            entry.members[sweep].judged = number
            entry.members[sweep].needed = needed
            self._refresh(entry)

    def settled(self, sweep: str, ensemble: str) -> None:
        """An ensemble met the rule of a sweep."""
        if sweep in self.sweeps and ensemble in self.sweeps[sweep].open:
            self._leave(sweep, ensemble)

    def stick(self, ensemble: str) -> None:
        """An ensemble cannot proceed."""
        if (entry := self.entries.get(ensemble)) is not None:
            entry.stuck = True
            self.stuck.add(ensemble)
            self._refresh(entry)

    def ripe(self) -> list[str]:
        """Sweeps with a goal whose places all have what the round asks for, or cannot proceed."""
        return [key for key, sweep in self.sweeps.items() if sweep.info.has_goal and self._is_ripe(sweep)]

    def _is_ripe(self, sweep: PlanSweep) -> bool:
        entries = [self.entries[key] for key in sweep.open]
        waiting = [one.members[sweep.info.key] for one in entries if not one.stuck]
        return bool(waiting) and all(member.judged >= member.cap for member in waiting)

    def over_budget(self) -> list[str]:
        """Sweeps that have spent their budget."""
        return [key for key, sweep in self.sweeps.items() if sweep.spent()]

    def with_stuck(self) -> set[str]:
        """Sweeps that contain an ensemble that cannot proceed."""
        return {key for one in self.stuck for key in self.entries[one].members}

    def seconds_left(self, sweep: str, threads: int) -> float | None:
        """Predicted seconds until a sweep settles if the pool were its own; None without a pool or a sweep."""
        known = self.sweeps.get(sweep)  # once: other threads ask, too
        if known is None or threads < 1:
            return None
        return max(0.0, known.remaining + known.under_way) / threads

    def waiting(self) -> list[Waiting]:
        """What every request still has to be given; other threads ask, too."""
        return [part for sweep in tuple(self.sweeps.values()) for part in sweep.waiting()]

    # --- upkeep

    def _entry(self, sweep: str, one: EnsembleInfo) -> Entry:
        entry = self.entries.get(one.key)
        if entry is None:
            calibration = self.calibrations[sweep, one.kind]
            entry = self.entries[one.key] = Entry(one.key, one.default_seconds, one.measured_seconds, calibration)
        entry.stuck = one.stuck
        (self.stuck.add if one.stuck else self.stuck.discard)(one.key)
        entry.faults = dict(one.faults)
        entry.kept_bytes.update(one.kept_bytes)
        for observation, reach in one.reaches.items():
            entry.track(observation).set_reach(reach)
        self._cover(entry, one.islands)
        return entry

    def _cover(self, entry: Entry, islands: dict[str, dict[int, int]]) -> None:
        for observation, ranges in islands.items():
            entry.track(observation).islands.update(ranges)
        for task in self.under_way.values():
            if task.ensemble == entry.key:
                entry.place(task)

    def _leave(self, sweep: str, ensemble: str) -> None:
        entry = self.entries[ensemble]
        member = entry.members.pop(sweep)
        if sweep in self.sweeps:
            self.sweeps[sweep].open.discard(ensemble)
            self.sweeps[sweep].remaining -= member.remaining
        if entry.members:
            self._refresh(entry)
        else:
            del self.entries[ensemble]
            self.stuck.discard(ensemble)

    def _refresh_all(self, keys: Collection[str]) -> None:
        for key in keys:
            if key in self.entries:
                self._refresh(self.entries[key])

    def _refresh(self, entry: Entry) -> None:
        """Queue an ensemble anew in each of its sweeps."""
        entry.version = next(self._numbers)
        for member in entry.members.values():
            self._queue(entry, member, self.sweeps[member.sweep])

    def _queue(self, entry: Entry, member: PlanMember, sweep: PlanSweep) -> None:
        first, likely = entry.first_needed(member), entry.likely_target(member)
        remaining = 0.0 if entry.stuck else max(0, likely - first) * entry.seconds_per_trajectory
        sweep.remaining += remaining - member.remaining
        member.remaining = remaining
        if entry.stuck:
            return
        item = Item(first / likely, member.ordinal, entry.version, entry.key)
        if first < likely:
            sweep.likely.push(item, len(sweep.open))
        elif first < entry.speculative_target(member):
            sweep.speculative.push(item, len(sweep.open))

    def _is_current(self, item: Item) -> bool:
        entry = self.entries.get(item.ensemble)
        return entry is not None and entry.version == item.version
