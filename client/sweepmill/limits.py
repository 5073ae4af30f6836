"""Limits a server sets on sweeps: a refusal names the limit and what would pass."""

from collections.abc import Iterator

from pydantic import BaseModel, ConfigDict, Field

from sweepmill.coordinates import accumulator_bytes, kept_bytes
from sweepmill.ensemble import Ensemble
from sweepmill.errors import Fault
from sweepmill.sweep import Point, Sweep

CLUSTERS = "projective-ising"  # its engine takes far longer chains than the others


class Limits(BaseModel):
    """Largest values accepted; all are settings of the server."""

    model_config = ConfigDict(frozen=True, extra="forbid")

    sites: int = Field(1024, ge=2, description="Sites of one ensemble, and its reference qubits")
    cluster_sites: int = Field(1_000_000, ge=2, description="Sites of projective-ising, which has an engine of its own")
    reference_sites: int = Field(64, ge=2, description="Sites with engine = 'reference'")
    layers: int = Field(100_000, ge=1, description="Layers of one ensemble")
    ensembles: int = Field(20_000, ge=1, description="Ensembles of one sweep")
    trajectories: int = Field(10_000_000, ge=1, description="Cap of one ensemble")
    accumulator_bytes: int = Field(1_048_576, ge=1024, description="Size of one total")
    kept_values: int = Field(1_073_741_824, ge=0, description="Kept values of one sweep, in bytes before compression")

    def sites_of(self, ensemble: Ensemble) -> tuple[int, str]:
        """How many sites an ensemble may have, and of what this is the limit."""
        if ensemble.parameters["engine"] == "reference":
            return self.reference_sites, "sites per ensemble with engine = 'reference'"
        if ensemble.family == CLUSTERS:
            return self.cluster_sites, f"sites per ensemble of {CLUSTERS}"
        return self.sites, "sites per ensemble"


def check_limits(sweep: Sweep, limits: Limits) -> list[Fault]:
    """Every limit the sweep exceeds, once each with the worst offender."""
    points = sweep.points
    fitting = tuple(p for p in points if p.ensemble.sites <= limits.sites_of(p.ensemble)[0])
    faults = [
        *_sites_faults(points, limits),
        _beyond("circuit.references", max(p.ensemble.references for p in points), limits.sites, "reference qubits"),
        _beyond("circuit.layers", max(p.ensemble.layers for p in points), limits.layers, "layers per ensemble"),
        _beyond("circuit", len(points), limits.ensembles, "ensembles per sweep"),
        _beyond("stop.trajectories", max(p.cap for p in points), limits.trajectories, "trajectories per ensemble"),
        *(_size_fault(sweep, index, fitting, limits) for index in range(len(sweep.observe)) if fitting),
        _kept_fault(sweep, fitting, limits.kept_values),
    ]
    return [fault for fault in faults if fault is not None]


def _sites_faults(points: tuple[Point, ...], limits: Limits) -> Iterator[Fault | None]:
    most: dict[tuple[int, str], int] = {}
    for point in points:
        kind = limits.sites_of(point.ensemble)
        most[kind] = max(most.get(kind, 0), point.ensemble.sites)
    for (limit, what), sites in most.items():
        yield _beyond("circuit.sites", sites, limit, what)


def _beyond(path: str, value: int, limit: int, what: str) -> Fault | None:
    return Fault(path, f"this server takes at most {limit} {what}, got {value}") if value > limit else None


def _size_fault(sweep: Sweep, index: int, points: tuple[Point, ...], limits: Limits) -> Fault | None:
    item = sweep.observe[index]
    shapes = {p.ensemble.shape: p.ensemble for p in points}
    size, largest = max((accumulator_bytes(e, item), e.sites) for e in shapes.values())
    if size <= limits.accumulator_bytes:
        return None
    return Fault(
        f"observe[{index}]",
        f"its total takes {size} bytes at {largest} sites, this server keeps at most {limits.accumulator_bytes}: "
        "read fewer layers or cuts",
    )


def kept_values_bytes(sweep: Sweep) -> int:
    """Size of all values a sweep keeps if every ensemble runs to its cap, before they are compressed."""
    return sum(point.cap * size for point, size in _kept_by_point(sweep, sweep.points))


def _kept_by_point(sweep: Sweep, points: tuple[Point, ...]) -> Iterator[tuple[Point, int]]:
    """Every point with the bytes its values take for each trajectory."""
    known: dict[tuple[object, ...], int] = {}
    kept = {item.observation.key: item.observation for item in sweep.observations if item.observation.keep_values}
    for point in points if kept else ():
        shape = point.ensemble.shape
        if shape not in known:
            known[shape] = sum(kept_bytes(point.ensemble, item) for item in kept.values())
        yield point, known[shape]


def _kept_fault(sweep: Sweep, points: tuple[Point, ...], limit: int) -> Fault | None:
    sizes = list(_kept_by_point(sweep, points))
    total = sum(point.cap * size for point, size in sizes)
    if total <= limit:
        return None
    index = next(i for i, item in enumerate(sweep.observe) if item.keep_values)
    passing = limit // sum(size for _, size in sizes)
    fewer = f"up to {passing} trajectories per ensemble would pass, or fewer" if passing else "read fewer"
    return Fault(
        f"observe[{index}].keep_values",
        f"the values of all trajectories up to the caps take {total} bytes, this server keeps at most {limit} of a "
        f"sweep (limits.kept_values): {fewer} ensembles, layers or cuts",
    )
