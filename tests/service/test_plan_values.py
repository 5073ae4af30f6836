"""Batches that carry values end before these are too many to travel."""

from sweepmill_service.plan.plan import EnsembleInfo, Plan
from sweepmill_service.plan.sweeps import Request, SweepInfo
from sweepmill_service.plan.task import SizeRules, Task
from sweepmill_worker.kept import BATCH_BYTES


def tasks_of(kept_bytes: dict[str, int], cap: int) -> list[Task]:
    """All tasks of an ensemble whose trajectories take a microsecond."""
    plan = Plan(SizeRules())
    info = SweepInfo("s", (Request("ada", 0, 0.0),), ("a", "b"), 100, False, None, 0.0)
    one = EnsembleInfo("e", cap, 0, 1e-6, 1e-6, kept_bytes=kept_bytes)
    plan.add_sweep(info, [one])
    tasks: list[Task] = []
    while (task := plan.choose(1)) is not None:
        tasks.append(task)
    return tasks


def test_a_batch_carries_no_more_values_than_are_allowed() -> None:
    tasks = tasks_of({"a": 1000, "b": 600}, 9000)
    assert max(task.count for task in tasks) == BATCH_BYTES // 1600
    assert sum(task.count for task in tasks) == 9000


def test_a_single_trajectory_of_many_values_is_a_batch() -> None:
    assert [task.count for task in tasks_of({"a": 2 * BATCH_BYTES}, 3)] == [1, 1, 1]


def test_without_values_only_the_time_counts() -> None:
    assert max(task.count for task in tasks_of({}, 100_000)) > BATCH_BYTES // 1600
