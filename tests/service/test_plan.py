"""The choice of the next task: pure, without database or pool."""

from collections import Counter

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from sweepmill_service.plan.marks import Reach, next_mark
from sweepmill_service.plan.plan import EnsembleInfo, Plan
from sweepmill_service.plan.sweeps import Request, SweepInfo
from sweepmill_service.plan.task import SizeRules, Task

SIZES = SizeRules(batch_seconds=4.0, first_batch_seconds=0.5, least_seconds=0.25, growth=4)


def sweep_info(key: str = "s", *owners: str, **changes: object) -> SweepInfo:
    fields: dict[str, object] = {
        "key": key,
        "requests": tuple(Request(owner, 0, 0.0) for owner in owners or ("ada",)),
        "observations": ("a", "b"),
        "at_least": 100,
        "has_rules": False,
        "has_goal": False,
        "budget": None,
        "core_seconds": 0.0,
    }
    return SweepInfo(**(fields | changes))  # type: ignore[arg-type]


def ensemble(key: str = "e", cap: int = 400, pace: float | None = 0.01, **changes: object) -> EnsembleInfo:
    fields: dict[str, object] = {
        "key": key,
        "cap": cap,
        "judged": 0,
        "default_seconds": 0.01,
        "measured_seconds": pace,
    }
    return EnsembleInfo(**(fields | changes))  # type: ignore[arg-type]


def plan_of(*sweeps: tuple[SweepInfo, list[EnsembleInfo]]) -> Plan:
    plan = Plan(SIZES)
    for info, ensembles in sweeps:
        plan.add_sweep(info, ensembles)
    return plan


def choose(plan: Plan, threads: int = 2) -> Task:
    task = plan.choose(threads)
    assert task is not None
    return task


def choose_all(plan: Plan, threads: int = 2, most: int = 1000) -> list[Task]:
    tasks: list[Task] = []
    while len(tasks) < most and (task := plan.choose(threads)) is not None:
        tasks.append(task)
    return tasks


def covered(tasks: list[Task], observation: str) -> list[int]:
    return sorted(k for task in tasks if observation in task.observations for k in range(task.first, task.end))


def test_every_trajectory_up_to_the_cap_is_handed_out_once() -> None:
    tasks = choose_all(plan_of((sweep_info(), [ensemble("e", 350), ensemble("f", 20)])))
    for key, cap in (("e", 350), ("f", 20)):
        mine = [task for task in tasks if task.ensemble == key]
        assert covered(mine, "a") == covered(mine, "b") == list(range(cap))


def test_only_what_is_missing_is_handed_out() -> None:
    info = ensemble(cap=100, reaches={"a": Reach(30, frozenset())}, islands={"a": {50: 10}})
    tasks = choose_all(plan_of((sweep_info(), [info])))
    assert covered(tasks, "a") == [*range(30, 50), *range(60, 100)]
    assert covered(tasks, "b") == list(range(100))


def test_observations_that_need_the_same_trajectories_share_a_task() -> None:
    info = ensemble(cap=100, reaches={"a": Reach(30, frozenset())})
    tasks = choose_all(plan_of((sweep_info(), [info])))
    assert [(task.first, task.observations) for task in tasks if task.first in (0, 30)] == [
        (0, ("b",)),
        (30, ("a", "b")),
    ]


def test_an_ensemble_of_two_sweeps_is_sampled_once_as_far_as_either_needs() -> None:
    first = sweep_info("s", observations=("a",))
    second = sweep_info("t", "bob", observations=("a", "b"))
    plan = plan_of((first, [ensemble(cap=50)]), (second, [ensemble(cap=80)]))
    tasks = choose_all(plan)
    assert covered(tasks, "a") == covered(tasks, "b") == list(range(80))
    assert all(task.observations == ("a", "b") for task in tasks)
    assert {task.sweep for task in tasks if task.first >= 50} == {"t"}


def test_no_task_crosses_an_n_at_which_a_rule_is_judged() -> None:
    plan = plan_of((sweep_info(has_rules=True), [ensemble(cap=1000, pace=0.0001)]))
    assert [(task.first, task.end) for task in choose_all(plan)] == [(0, 100), (100, 118)]


def test_after_a_judgement_the_rungs_up_to_the_predicted_need_are_handed_out() -> None:
    plan = plan_of((sweep_info(has_rules=True), [ensemble(cap=1000, pace=0.0001)]))
    choose_all(plan)
    plan.judged("s", "e", 100, 150)
    assert [(task.first, task.end) for task in choose_all(plan)] == [(118, 141), (141, 168), (168, 200)]


def test_work_beyond_the_next_judgement_waits_for_ensembles_that_surely_need_theirs() -> None:
    ensembles = [ensemble("e", 1000, 0.0001), ensemble("f", 1000, 0.0001)]
    plan = plan_of((sweep_info(has_rules=True), ensembles))
    assert [(task.ensemble, task.first) for task in choose_all(plan)] == [("e", 0), ("f", 0), ("e", 100), ("f", 100)]


def test_the_ensemble_furthest_from_its_rule_goes_first() -> None:
    far = ensemble("f", 400, reaches={name: Reach(100, frozenset()) for name in "ab"})
    near = ensemble("n", 400, reaches={name: Reach(300, frozenset()) for name in "ab"})
    small = ensemble("m", 100, reaches={name: Reach(60, frozenset()) for name in "ab"})
    assert choose(plan_of((sweep_info(), [near, small, far]))).ensemble == "f"


def test_higher_priority_goes_first_within_an_owner_then_the_older_request() -> None:
    sweeps = [
        sweep_info("young", requests=(Request("ada", 0, 2.0),)),
        sweep_info("old", requests=(Request("ada", 0, 1.0),)),
        sweep_info("urgent", requests=(Request("ada", 3, 9.0),)),
    ]
    plan = plan_of(*((info, [ensemble(info.key, 10)]) for info in sweeps))
    assert [task.sweep for task in choose_all(plan)] == ["urgent", "old", "young"]
    plan = plan_of(*((info, [ensemble(info.key, 10)]) for info in sweeps))
    plan.update_requests("young", (Request("ada", 9, 2.0),))
    assert choose(plan).sweep == "young"


def test_owners_share_by_core_seconds_not_by_tasks_or_sweeps() -> None:
    slow = [(sweep_info(f"slow{n}", "ada"), [ensemble(f"slow{n}", 10_000, 0.4)]) for n in range(5)]
    fast = (sweep_info("fast", "bob"), [ensemble("fast", 1_000_000, 0.001)])
    plan = plan_of(*slow, fast)
    spent = {"ada": 0.0, "bob": 0.0}
    for _ in range(200):
        task = choose(plan)
        actual = task.count * (0.8 if task.owner == "ada" else 0.0005)  # the first predictions are wrong
        spent[task.owner] += actual
        plan.landed(task, actual)
    assert abs(spent["ada"] - spent["bob"]) < 20


def test_an_owner_who_comes_late_gets_half_from_then_on_and_no_credit() -> None:
    plan = plan_of((sweep_info("s", "ada"), [ensemble("e", 1_000_000)]))
    for _ in range(50):
        plan.landed(task := choose(plan), task.seconds)
    plan.add_sweep(sweep_info("t", "bob"), [ensemble("f", 1_000_000)])
    owners: Counter[str] = Counter()
    for _ in range(40):
        task = choose(plan)
        owners[task.owner] += 1
        plan.landed(task, task.seconds)
    assert abs(owners["ada"] - owners["bob"]) <= 2


def test_work_under_way_counts_so_that_nobody_fills_the_window_first() -> None:
    plan = plan_of((sweep_info("s", "ada"), [ensemble("e")]), (sweep_info("t", "bob"), [ensemble("f")]))
    assert Counter(choose(plan).owner for _ in range(4)) == {"ada": 2, "bob": 2}


@pytest.fixture
def _no_common_marks(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("sweepmill_service.plan.entries.WORTH_KEEPING", float("inf"))


def test_batches_end_at_common_marks_where_a_total_is_worth_keeping() -> None:
    costly = plan_of((sweep_info(), [ensemble(cap=4000, pace=0.01)]))
    ends = {task.end for task in choose_all(costly)}
    assert {200, 800, 3200} <= ends
    cheap = plan_of((sweep_info(), [ensemble(cap=4000, pace=1e-5)]))
    assert not {200, 800, 3200} & {task.end for task in choose_all(cheap, threads=1)}


@pytest.mark.usefixtures("_no_common_marks")
def test_batches_start_short_grow_in_steps_and_are_bounded() -> None:
    plan = plan_of((sweep_info(), [ensemble(cap=1_000_000, pace=None)]))
    seconds = []
    for _ in range(4):
        task = choose(plan)
        seconds.append(round(task.seconds, 6))
        plan.landed(task, task.seconds)
    assert seconds == [0.5, 2.0, 4.0, 4.0]


def test_the_first_batches_teach_what_trajectories_of_other_ensembles_take() -> None:
    ensembles = [ensemble(f"{n}", 1_000_000, None, default_seconds=1e-6) for n in range(40)]
    plan = plan_of((sweep_info(), ensembles))
    counts = []
    for _ in ensembles:
        task = choose(plan)
        counts.append(task.count)
        plan.landed(task, task.count * 1e-3)  # a thousand times slower than the default
    assert counts[0] == 4000
    assert counts[-1] == pytest.approx(500, rel=0.05)  # half a second


def test_ensembles_of_another_kind_of_work_learn_nothing_from_it() -> None:
    slow = [ensemble(f"{n}", 1_000_000, None, default_seconds=1e-6, kind="slow") for n in range(5)]
    other = ensemble("other", 1_000_000, None, default_seconds=1e-6, kind="other")
    plan = plan_of((sweep_info(), [*slow, other]))
    counts = {}
    for _ in range(6):
        task = choose(plan)
        counts[task.ensemble] = task.count
        plan.landed(task, task.count * 1e-3)
    assert counts["other"] == 4000
    assert min(counts.values()) < 4000


def test_a_slow_trajectory_is_a_batch_of_its_own() -> None:
    assert choose(plan_of((sweep_info(), [ensemble(pace=60.0)]))).count == 1


@pytest.mark.usefixtures("_no_common_marks")
def test_near_the_end_of_a_sweep_the_rest_is_shared_between_threads() -> None:
    plan = plan_of((sweep_info(), [ensemble(cap=400, pace=0.01)]))
    seconds = [task.seconds for task in choose_all(plan, threads=4)]
    assert seconds[0] == pytest.approx(1.0)
    assert seconds == sorted(seconds, reverse=True)
    assert min(seconds[:-1]) == pytest.approx(0.25)


def test_a_lost_task_is_handed_out_again_as_the_next_attempt() -> None:
    plan = plan_of((sweep_info(), [ensemble(cap=20)]))
    task = choose(plan)
    plan.lost(task, 1)
    again = choose(plan)
    assert (again.first, again.count, again.attempt) == (task.first, task.count, 2)
    assert again.key != task.key


def test_a_stuck_ensemble_is_left_alone_and_the_rest_goes_on() -> None:
    plan = plan_of((sweep_info(), [ensemble("e"), ensemble("f")]))
    plan.stick("e")
    assert {task.ensemble for task in choose_all(plan)} == {"f"}
    assert plan.with_stuck() == {"s"}


def test_a_withdrawn_sweep_is_not_fed_and_what_is_under_way_ends() -> None:
    plan = plan_of((sweep_info("s"), [ensemble("e")]), (sweep_info("t"), [ensemble("e"), ensemble("f")]))
    task = choose(plan)
    plan.remove_sweep("s")
    plan.remove_sweep("t")
    assert plan.choose(2) is None
    plan.landed(task, 1.0)
    assert not plan.under_way
    assert not plan.entries


def test_a_sweep_that_comes_back_does_not_sample_again_what_is_under_way() -> None:
    plan = plan_of((sweep_info(), [ensemble(cap=100)]))
    task = choose(plan)
    plan.remove_sweep("s")
    plan.add_sweep(sweep_info(), [ensemble(cap=100)])
    assert covered([task, *choose_all(plan)], "a") == list(range(100))


def test_a_budget_bounds_what_is_handed_out() -> None:
    plan = plan_of((sweep_info(budget=3.0), [ensemble(cap=100_000)]))
    tasks = choose_all(plan)
    assert sum(task.seconds for task in tasks) == pytest.approx(3.0)
    assert plan.over_budget() == []
    for task in tasks:
        plan.landed(task, 1.01 * task.seconds)
    assert plan.over_budget() == ["s"]
    assert plan.choose(2) is None


def test_the_time_left_is_what_remains_over_the_threads() -> None:
    plan = plan_of((sweep_info(), [ensemble(cap=400, pace=0.01)]))
    choose(plan)
    assert plan.seconds_left("s", 2) == pytest.approx(2.0)
    assert plan.seconds_left("s", 0) is plan.seconds_left("unknown", 2) is None


# One event of a run: what happens to which of the tasks under way.
EVENTS = st.lists(st.tuples(st.sampled_from(["choose", "land", "lose"]), st.integers(0, 50)), max_size=80)


@settings(max_examples=150, deadline=None, derandomize=True)
@given(EVENTS, st.integers(1, 60), st.integers(1, 60), st.booleans())
def test_tasks_never_overlap_whatever_is_lost_or_lands(
    events: list[tuple[str, int]], first_cap: int, second_cap: int, has_rules: bool
) -> None:
    first = sweep_info("s", observations=("a",), has_rules=has_rules, at_least=10)
    second = sweep_info("t", "bob", observations=("a", "b"))
    pace = {"pace": 0.3}
    plan = plan_of((first, [ensemble(cap=first_cap, **pace)]), (second, [ensemble(cap=second_cap, **pace)]))  # type: ignore[arg-type]
    done: list[Task] = []
    for what, index in events:
        under_way = list(plan.under_way.values())
        if what == "choose":
            plan.choose(2)
        elif under_way and what == "land":
            plan.landed(under_way[index % len(under_way)], 1.0)
            done.append(under_way[index % len(under_way)])
        elif under_way:
            plan.lost(under_way[index % len(under_way)], 1)
    everything = [*done, *plan.under_way.values(), *choose_all(plan)]
    for name, cap in (("a", max(first_cap if not has_rules else 10, second_cap)), ("b", second_cap)):
        ranges = covered(everything, name)
        assert ranges == sorted(set(ranges))
        assert set(range(min(cap, second_cap))) <= set(ranges)


def test_the_next_mark_is_the_rung_unless_a_total_there_was_not_kept() -> None:
    nothing, beyond = Reach(0, frozenset()), Reach(150, frozenset())
    assert next_mark(100, [nothing, Reach(100, frozenset())]) == 100
    assert next_mark(100, [nothing, beyond]) == 150
    assert next_mark(100, [nothing, Reach(150, frozenset({100}))]) == 100
    assert next_mark(100, [beyond, Reach(180, frozenset({150}))]) == 150
    assert next_mark(100, [beyond, Reach(180, frozenset({160}))]) == 160


@settings(max_examples=200, deadline=None, derandomize=True)
@given(
    st.integers(1, 50),
    st.lists(st.tuples(st.integers(0, 60), st.frozensets(st.integers(1, 60))), min_size=1, max_size=3),
)
def test_the_next_mark_is_the_smallest_that_every_observation_can_reach(
    rung: int, states: list[tuple[int, frozenset[int]]]
) -> None:
    reaches = [Reach(prefix, frozenset(n for n in marks if n < prefix)) for prefix, marks in states]
    possible = [n for n in range(rung, 120) if all(reach.prefix <= n or n in reach.marks for reach in reaches)]
    assert next_mark(rung, reaches) == min(possible)


def test_a_sweep_with_a_goal_is_ripe_once_all_its_places_were_judged_in_the_round() -> None:
    members = [ensemble("e", 300), ensemble("f", 200), ensemble("g", 200, stuck=True)]
    plan = plan_of((sweep_info(has_goal=True), members))
    assert len(choose_all(plan)) > 0
    assert plan.ripe() == []
    plan.judged("s", "e", 300, None)
    assert plan.ripe() == []
    plan.judged("s", "f", 224, None)  # further than asked, for somebody else
    assert plan.ripe() == ["s"]


def test_a_sweep_without_a_goal_is_never_ripe() -> None:
    plan = plan_of((sweep_info(), [ensemble("e", 300, judged=300)]))
    assert plan.ripe() == []
