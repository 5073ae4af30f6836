"""Whether this server takes a sweep: valid, within its limits, and of trajectories short enough."""

from collections.abc import Mapping
from typing import Any

from sweepmill.errors import Fault, SpecificationError
from sweepmill.limits import Limits, check_limits
from sweepmill.sweep import MOST_FAULTS, Sweep
from sweepmill_service.cost import Costs
from sweepmill_service.counting import too_many
from sweepmill_service.magnitudes import too_large
from sweepmill_service.memory import memory_fault
from sweepmill_service.plan.costs import seconds_of, what_would_pass
from sweepmill_service.plan.work import work_of
from sweepmill_service.programs import too_long, too_many_places
from sweepmill_service.settings import ServerLimits
from sweepmill_service.store import Store


def accepted(specification: Mapping[str, Any], store: Store, limits: ServerLimits) -> tuple[Sweep, Costs]:
    """The sweep and what its trajectories cost. Raises SpecificationError with every fault."""
    if faults := _immense(specification, limits):
        raise SpecificationError(faults)
    sweep = Sweep.parse(specification)
    if faults := check_limits(sweep, Limits(**limits.model_dump(include=set(Limits.model_fields)))):
        raise SpecificationError(faults)
    if fault := too_many_places((point.ensemble for point in sweep.points), limits):
        raise SpecificationError([fault])
    if fault := memory_fault(sweep, limits.worker_bytes):
        raise SpecificationError([fault])
    costs = Costs.of(
        [point.ensemble for point in sweep.points], [item.observation for item in sweep.observations], store
    )
    if fault := _slow(sweep, costs, limits.trajectory_seconds):
        raise SpecificationError([fault])
    return sweep, costs


def _immense(specification: Mapping[str, Any], limits: ServerLimits) -> list[Fault]:
    """What must be refused before it is expanded, because expanding it would take for ever."""
    many = too_many(specification, limits.ensembles)
    faults = [*too_large(specification, limits), *([many] if many else []), *too_long(specification, limits)]
    return faults[:MOST_FAULTS]


def _slow(sweep: Sweep, costs: Costs, limit: float) -> Fault | None:
    slowest = max((point.ensemble for point in sweep.points), key=lambda ensemble: costs[ensemble.key].seconds)
    seconds = costs[slowest.key].seconds
    if seconds <= limit:
        return None
    work = work_of(slowest)
    layers, sites = what_would_pass(work, seconds / seconds_of(work), limit)
    return Fault(
        "circuit",
        f"one trajectory of {slowest.sites} sites and {slowest.layers} layers is predicted to take {seconds:.0f} s, "
        f"this server takes at most {limit:g} s: up to {layers} layers of this size would pass, "
        f"or up to {sites} sites with as many layers per site",
    )
