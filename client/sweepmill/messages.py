"""Bodies of the HTTP interface, shared by the service that writes them and the client that reads them."""

from typing import Annotated, Any, Literal

from pydantic import AfterValidator, BaseModel, ConfigDict, Field

from sweepmill.language.refusal import printable

SweepState = Literal["waiting", "sampling", "settled", "withdrawn", "stuck"]
MetBy = Literal["error", "cap"]
CircuitFormat = Literal["stim", "openqasm3"]
Scalar = int | float | str
Parameters = dict[str, Scalar | list[Any]]  # the lists are the layers of a circuit written as data


class Message(BaseModel):
    """Base of all bodies: unknown fields are ignored, so that an older client reads a newer service."""

    model_config = ConfigDict(frozen=True, extra="ignore")


class Request(Message):
    """One owner's wish for a sweep."""

    owner: str
    label: str | None = None
    priority: int = 0
    at: float = Field(description="Submission time, seconds since 1970-01-01 UTC")
    core_seconds: float = Field(0.0, description="Core-seconds charged to this request")


class Answer(Message):
    """What the last round found of the quantity a sweep is sampled for."""

    quantity: str = Field(description="p_c, or the coefficient of a law")
    of: str = Field(description="Name of the observation it is derived from")
    where: dict[str, Scalar] = Field(default_factory=dict, description="What tells these ensembles from others")
    round: int
    value: float | None = None
    error: float | None = Field(None, description="One standard error; absent where none may be quoted")
    statistical: float | None = Field(None, description="Part of the error from the noise of the data")
    spread: float | None = Field(None, description="Part of the error from what different fits disagree by")
    withheld: str | None = Field(None, description="Why no error is quoted")
    below: float = Field(description="The error asked for")
    met: bool
    reason: str | None = Field(None, description="What was decided, in words")
    predicted_error: float | None = Field(None, description="Error expected after the next round")


class SweepStatus(Message):
    """A sweep with its progress."""

    key: str
    state: SweepState
    reason: str | None = Field(None, description="Why a stuck sweep cannot proceed")
    families: list[str]
    axes: list[str]
    names: list[str] = Field(description="Names of the observations")
    requests: list[Request]
    ensembles: int
    settled: int = Field(description="Ensembles that met the stopping rule")
    trajectories: int = Field(description="Contiguous trajectories sampled, summed over ensembles")
    trajectories_cap: int = Field(description="The same if every ensemble ran to its cap")
    core_seconds: float
    budget: float | None = None
    created_at: float
    commit: int = Field(description="Commit counter: grows with every change of progress")
    seconds_left: float | None = Field(None, description="Predicted time to settle on the current pool")
    goal: dict[str, Any] | None = Field(None, description="The derived quantity that decides when it is enough")
    answers: list[Answer] = Field(default_factory=list, description="What the last round found of it")


class SweepList(Message):
    """One page of sweeps, newest first."""

    sweeps: list[SweepStatus]
    next: str | None = Field(None, description="Value of `after` for the next page")


class RoundPlace(Message):
    """One ensemble in a round."""

    ordinal: int
    judged: int = Field(description="Its trajectories in this round, 0 where it is placed by this round")
    cost: float | None = Field(None, description="Core-seconds per trajectory as weighed, a power of two")
    target: int = Field(description="Its trajectories in the next round")


class Round(Message):
    """One judgement of a goal, with what followed from it."""

    number: int
    trajectories: int
    core_seconds: float = Field(description="Charged to the sweep when the round was judged")
    answers: list[Answer]
    places: list[RoundPlace]
    settled: bool
    at: float


class RoundList(Message):
    """All rounds of a sweep, oldest first."""

    sweep: str
    rounds: list[Round]


class EnsembleProgress(Message):
    """Progress of one ensemble within a sweep."""

    ordinal: int
    ensemble: str
    parameters: Parameters
    trajectories: int
    cap: int
    met_by: MetBy | None = None
    reason: str | None = Field(None, description="Why a stuck ensemble cannot proceed")
    changed: int = Field(description="Sweep commit counter at the last change")


class ProgressPage(Message):
    """Per-ensemble progress, in the order of the table."""

    sweep: str
    commit: int
    ensembles: list[EnsembleProgress]
    next: int | None = Field(None, description="Value of `after` for the next page")


class Submitted(Message):
    """Answer to a submission: the sweep, and how much of it was there already."""

    key: str
    created: bool = Field(description="False if the sweep was there already")
    status: SweepStatus
    sampled_ensembles: int = Field(description="Ensembles with every observation sampled to the cap already")
    sampled_trajectories: int = Field(description="Trajectories of the sweep that were there already")
    revisions: dict[str, int] = Field(description="Family and quantity revisions of the server")


class Amendment(Message):
    """Changes to one's own request; absent fields stay as they are."""

    model_config = ConfigDict(frozen=True, extra="forbid")

    label: Annotated[str, AfterValidator(printable)] | None = Field(None, max_length=200)
    priority: int | None = Field(None, ge=-10, le=10)


class Range(Message):
    """Where a number is expected to lie two times out of three."""

    low: float
    high: float


class ExpectedError(Message):
    """Standard errors of one observation once the sweep has settled, over its ensembles and their coordinates."""

    name: str = Field(description="Name of the observation")
    largest: float | None = Field(None, description="Of the noisiest coordinate of the noisiest ensemble")
    largest_range: Range | None = None
    median: float | None = Field(None, description="Median over ensembles, of the noisiest coordinate of each")
    below: float | None = Field(None, description="The bound of a stopping rule for this observation")
    met: int | None = Field(None, description="Ensembles that are expected to meet the rule before their caps")
    source: Literal["sampled", "learned", "default", "mixed", "unknown"] = Field(
        description="Whether this rests on what is sampled of these ensembles, on others sampled with the same "
        "observation, on rough defaults, or nothing tells"
    )


class Estimate(Message):
    """What a sweep would cost, take and tell; nothing is stored. Ranges hold two times out of three."""

    key: str
    ensembles: int
    trajectories_cap: int
    trajectories_expected: int | None = Field(
        None, description="Trajectories after which the rules are expected to hold"
    )
    sampled_ensembles: int
    sampled_trajectories: int
    core_seconds: float = Field(description="Predicted core-seconds still to spend if every ensemble runs to its cap")
    core_seconds_range: Range | None = None
    core_seconds_expected: float | None = Field(
        None, description="Predicted core-seconds still to spend until the rules hold; the same without rules"
    )
    core_seconds_expected_range: Range | None = None
    core_seconds_from: Literal["measured", "learned", "default", "mixed"] = Field(
        description="Whether the prediction rests on measured batches of these ensembles, on those of others with "
        "the same kind of work, or on default costs"
    )
    cores: int = Field(description="Cores of the pool")
    seconds: float | None = Field(
        None, description="Predicted time until the sweep settles on the pool as it is now, with the work queued there"
    )
    seconds_range: Range | None = None
    seconds_unknown: str | None = Field(None, description="Why no time is given, if so")
    queued_core_seconds: float = Field(
        0.0, description="Predicted core-seconds queued for other sweeps; owners share the pool evenly"
    )
    accumulator_bytes: int = Field(description="Size of all totals of the sweep, at most")
    kept_bytes: int = Field(0, description="Size of all kept values if every ensemble runs to its cap, uncompressed")
    worker_bytes: int = Field(description="Memory that a batch of the largest ensemble adds to an idle worker, at most")
    standard_errors: list[ExpectedError] = Field(default_factory=list, description="One for each observation")
    rounds: str | None = Field(
        None, description="With a goal: expectations are those of its first round, all but the core-seconds at most"
    )


class BatchRecord(Message):
    """Provenance of one stored batch."""

    observation: str
    first: int
    count: int
    digest: str
    seconds: float
    worker: str
    versions: dict[str, str]
    at: float


class FaultRecord(Message):
    """A batch that failed."""

    first: int
    count: int
    attempt: int
    kind: str
    message: str
    traceback: str
    worker: str
    at: float


class ObservationRecord(Message):
    """What is stored of one observation of an ensemble."""

    key: str
    observation: dict[str, Any]
    trajectories: int = Field(description="Length of the contiguous prefix")
    digest: str


class EnsembleRecord(Message):
    """One ensemble: parameters, counts and provenance."""

    key: str
    family: str
    parameters: Parameters
    revision: int
    reason: str | None = None
    observations: list[ObservationRecord]
    batches: int
    core_seconds: float
    latest: list[BatchRecord] = Field(description="The latest batches, newest first (at most 100)")
    faults: list[FaultRecord]


class TrajectoryValue(Message):
    """Values of one observation on one trajectory."""

    observation: dict[str, Any]
    values: list[dict[str, Any]] = Field(
        description="One entry per coordinate: layer, position, value (or numerator and denominator)"
    )


class CircuitText(Message):
    """The circuit of one trajectory for other programs; where it measures, outcomes are drawn anew."""

    format: CircuitFormat
    text: str


class Trajectory(Message):
    """One trajectory, recomputed on demand."""

    ensemble: str
    trajectory: int
    parameters: Parameters
    observations: list[TrajectoryValue]
    versions: dict[str, str]
    circuit: CircuitText | None = Field(None, description="The circuit, if it was asked for")


class WorkerStatus(Message):
    """One worker process and what it is computing."""

    name: str
    address: str
    threads: int
    computing: list[str] = Field(description="Tasks as ensemble:first+count, ensemble keys shortened")


class PoolStatus(Message):
    """The pool as the dispatcher sees it."""

    ready: bool
    reason: str | None = Field(None, description="Why nothing is dispatched, if so")
    workers: list[WorkerStatus]
    cores: int
    in_flight: int
    window: int
    batches_committed: int
    trajectories_per_second: float
    busy_fraction: float = Field(description="Core-seconds of sampling per core and second, over the last minute")


class Problem(Message):
    """RFC 9457 problem document."""

    type: str = "about:blank"
    title: str
    status: int
    detail: str
    instance: str | None = None
    faults: list[dict[str, str]] = Field(default_factory=list, description="Every fault: path and message")


class Table(Message):
    """The aggregated table, one list per column; `metadata` names keys, ranges of trajectories and digests."""

    columns: dict[str, list[Any]]
    metadata: dict[str, Any]
