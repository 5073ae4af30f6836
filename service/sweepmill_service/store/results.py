"""What the dispatcher hands to the store, and what it learns from it."""

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Literal, NamedTuple

from sweepmill_service.plan.marks import Reach


class Kept(NamedTuple):
    """Values of one observation on all trajectories of a batch, packed; the digest is that of the integers."""

    data: bytes
    digest: str


@dataclass(frozen=True)
class BatchResult:
    """Trajectories [first, first + count) of an ensemble as a worker returned them.

    ``accumulators``, ``digests`` and, where they are kept, ``values`` by observation key; ``seconds`` are CPU seconds,
    charged to (sweep, owner).
    """

    ensemble: str
    first: int
    count: int
    accumulators: Mapping[str, bytes]
    digests: Mapping[str, str]
    seconds: float
    worker: str
    versions: Mapping[str, str]
    sweep: str
    owner: str
    values: Mapping[str, Kept] = field(default_factory=dict)

    def identity(self, observation: str) -> tuple[str, str | None]:
        """Digests of what there is of an observation: its total, and its values if they are kept."""
        values = self.values.get(observation)
        return self.digests[observation], None if values is None else values.digest


@dataclass(frozen=True)
class Start:
    """One task about to be handed to the pool."""

    ensemble: str
    first: int
    count: int
    observations: tuple[str, ...]
    attempt: int
    sweep: str
    owner: str


@dataclass(frozen=True)
class BatchFault:
    """One failed attempt at a batch."""

    ensemble: str
    first: int
    count: int
    kind: str
    message: str
    traceback: str
    worker: str


class Verdict(NamedTuple):
    """Judgement of an ensemble within a sweep at N = ``judged``; ``needed`` extrapolates the N its rules ask for."""

    sweep: str
    ensemble: str
    judged: int
    met_by: Literal["error", "cap"] | None
    needed: int | None


@dataclass(frozen=True)
class Refused:
    """An observation of a result that was not stored."""

    ensemble: str
    observation: str
    first: int
    count: int
    why: Literal["duplicate", "overlap", "determinism"]


@dataclass
class Outcome:
    """What a commit changed: how far each (ensemble, observation) is, verdicts, refusals, ensembles now stuck."""

    reaches: dict[tuple[str, str], Reach] = field(default_factory=dict)
    verdicts: list[Verdict] = field(default_factory=list)
    refused: list[Refused] = field(default_factory=list)
    stuck: dict[str, str] = field(default_factory=dict)
    settled_sweeps: set[str] = field(default_factory=set)
