"""Keeping the plan in step with the store."""

from collections.abc import Iterable, Iterator, Mapping, Sequence
from typing import Any

from sweepmill.coordinates import kept_bytes
from sweepmill.ensemble import Ensemble
from sweepmill.observation import observation_from_normal_form
from sweepmill_service.cost import Costs
from sweepmill_service.plan.plan import EnsembleInfo, Plan
from sweepmill_service.plan.sweeps import Request, SweepInfo
from sweepmill_service.plan.task import Task
from sweepmill_service.plan.work import work_of
from sweepmill_service.store import Store
from sweepmill_service.store.common import chunks
from sweepmill_service.store.loading import LiveSweep, OpenEnsemble
from sweepmill_service.store.results import Outcome

SUPERSEDED = "revision superseded, submit again"
JUDGED_AT_ONCE = 500


class Follower:
    """Brings new sweeps into the plan, takes withdrawn ones out, and applies what commits changed."""

    def __init__(self, store: Store, plan: Plan) -> None:
        self._store = store
        self._plan = plan
        self._seen: int | None = None
        self._ensembles: dict[str, dict[str, Any]] = {}  # normal forms by key
        self._observations: dict[str, dict[str, Any]] = {}

    def look(self) -> None:
        """Take over submissions, withdrawals and amendments since the last look."""
        counter = self._store.change_counter()
        if counter == self._seen:
            return
        live = {sweep.key: sweep for sweep in self._store.live_sweeps()}
        for key in self._plan.sweeps.keys() - live.keys():
            self.drop(key)
        for key, sweep in live.items():
            if key in self._plan.sweeps:
                self._plan.update_requests(key, _requests(sweep))
            else:
                self._take_up(sweep)
        self._seen = counter

    def arguments(self, task: Task) -> tuple[Any, ...]:
        """What the pool computes a task from: plain values."""
        observations = [self._observations[key] for key in task.observations]
        return self._ensembles[task.ensemble], observations, task.first, task.count

    def apply(self, outcome: Outcome) -> None:
        """Take over what a commit or a judgement changed."""
        self._plan.set_reaches(outcome.reaches)
        for ensemble in outcome.stuck:
            self._plan.stick(ensemble)
        for verdict in outcome.verdicts:
            if verdict.met_by is not None:
                self._plan.settled(verdict.sweep, verdict.ensemble)
            else:
                self._plan.judged(verdict.sweep, verdict.ensemble, verdict.judged, verdict.needed)
        for key in outcome.settled_sweeps:
            self.drop(key)
        for ensemble in {refused.ensemble for refused in outcome.refused if refused.why == "overlap"}:
            self._plan.set_ranges(ensemble, *self._store.ranges(ensemble))

    def stop_stuck(self) -> None:
        """Sweeps that cannot proceed: budget spent, or nothing left but ensembles that are stuck."""
        for key in self._plan.over_budget():
            info = self._plan.sweeps[key].info
            spent = f"budget of {info.budget:g} core-seconds spent"
            if not (info.has_goal and self._store.end_rounds(key, spent)):
                self._store.stick_sweep(key, f"{spent} before the rule was met")
            self.drop(key)
        if self._plan.stuck:
            for key in self._store.stick_sweeps(self._plan.with_stuck()):
                self.drop(key)

    def renew(self, key: str) -> None:
        """Take a sweep up anew whose places have changed."""
        self.drop(key)
        for sweep in self._store.live_sweeps():
            if sweep.key == key:
                self._take_up(sweep)

    def drop(self, key: str) -> None:
        """Take a sweep out of the plan."""
        self._plan.remove_sweep(key)
        gone = self._ensembles.keys() - self._plan.entries.keys()
        for ensemble in gone - {task.ensemble for task in self._plan.under_way.values()}:
            del self._ensembles[ensemble]

    def _take_up(self, sweep: LiveSweep) -> None:
        if self._store.superseded(sweep.key):
            self._store.stick_sweep(sweep.key, SUPERSEDED)
            return
        for piece in chunks(self._store.due_ensembles(sweep.key), JUDGED_AT_ONCE):
            self.apply(self._store.judge(piece))
        members = self._store.open_ensembles(sweep.key)
        if not members:
            return
        read = self._store.observation_forms(sweep.observations)
        self._observations.update(read)
        self._ensembles.update((one.key, one.normal_form) for one in members)
        self._plan.add_sweep(_info(sweep), _ensemble_infos(members, read.values(), self._store))


def _requests(sweep: LiveSweep) -> tuple[Request, ...]:
    return tuple(Request(one.owner, one.priority, one.at) for one in sweep.requests)


def _info(sweep: LiveSweep) -> SweepInfo:
    return SweepInfo(
        key=sweep.key,
        requests=_requests(sweep),
        observations=sweep.observations,
        at_least=sweep.at_least,
        has_rules=sweep.has_rules,
        has_goal=sweep.has_goal,
        budget=sweep.budget,
        core_seconds=sweep.core_seconds,
    )


def _ensemble_infos(
    members: Sequence[OpenEnsemble], observations: Iterable[Mapping[str, Any]], store: Store
) -> Iterator[EnsembleInfo]:
    """With costs learned from all that is stored, so that a dispatcher that starts anew knows what the last one did."""
    ensembles = {one.key: Ensemble.from_normal_form(one.normal_form) for one in members}
    read = [observation_from_normal_form(form) for form in observations]
    kept = {item.key: item for item in read if getattr(item, "keep_values", False)}
    costs = Costs.of(ensembles.values(), read, store)
    for one in members:
        cost = costs[ensembles[one.key].key]
        yield EnsembleInfo(
            key=one.key,
            cap=one.cap,
            judged=one.judged,
            default_seconds=cost.seconds,
            measured_seconds=None if one.seconds_per_trajectory is None else cost.seconds,
            kind=work_of(ensembles[one.key]).kind,
            stuck=one.stuck,
            reaches=one.reaches,
            islands=one.islands,
            faults=one.faults,
            kept_bytes={key: kept_bytes(ensembles[one.key], item) for key, item in kept.items()},
        )
