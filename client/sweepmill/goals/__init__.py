"""Goals: stopping rules on quantities derived from the whole table, such as a critical point or a law's coefficient."""

from sweepmill.goals.groups import Group, groups
from sweepmill.goals.models import LAWS, CriticalPointGoal, Goal, LawGoal, kind_of
from sweepmill.goals.placing import placed, resolved
from sweepmill.goals.refusals import goal_faults

__all__ = [
    "LAWS",
    "CriticalPointGoal",
    "Goal",
    "Group",
    "LawGoal",
    "goal_faults",
    "groups",
    "kind_of",
    "placed",
    "resolved",
]
