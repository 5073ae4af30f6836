"""An estimate as people read it."""

from sweepmill.messages import Estimate, ExpectedError, Range
from sweepmill.text import aligned, count, duration

SOURCES = {
    "measured": "from batches of these ensembles",
    "learned": "learned from batches of other ensembles",
    "default": "by default costs: nothing like it was sampled here",
    "mixed": "partly from batches of these ensembles",
    "sampled": "from what is sampled",
    "unknown": "nothing tells",
}
ERROR_SOURCES = SOURCES | {
    "learned": "learned from other ensembles",
    "default": "a rough guess",
    "mixed": "partly from what is sampled",
}


def estimate_text(estimate: Estimate) -> str:
    """Aligned lines: what is there, work, time, memory and errors, each with its range of one standard deviation."""
    kept = f"{estimate.kept_bytes / 1e6:.3g} MB of kept values, " if estimate.kept_bytes else ""
    lines = [
        f"sampled       {count(estimate.sampled_trajectories)} of {count(estimate.trajectories_cap)} trajectories"
        f" already, {count(estimate.sampled_ensembles)} ensembles completely",
        *_work(estimate),
        f"time          {_time(estimate)}",
        f"memory        {estimate.accumulator_bytes / 1e6:.3g} MB of totals, {kept}"
        f"{estimate.worker_bytes / 1e6:.3g} MB per worker, at most",
    ]
    if estimate.standard_errors:
        rows = [_error(one, estimate.ensembles) for one in estimate.standard_errors]
        table = aligned(["expected standard errors", "largest", "range", "median", "", ""], rows)
        lines += ["", *table.splitlines()]
    return "\n".join(lines)


def _work(estimate: Estimate) -> list[str]:
    source = SOURCES[estimate.core_seconds_from]
    at_most = f"{_hours(estimate.core_seconds)} core-hours{_hours_range(estimate.core_seconds_range)} at most"
    if estimate.rounds is not None:
        first = f"{_hours(estimate.core_seconds_expected or 0.0)} core-hours for the first round"
        return [f"work left     {first}, {at_most}, {source}"]
    expected, numbers = estimate.core_seconds_expected, estimate.trajectories_expected
    if expected is None or numbers is None or numbers == estimate.trajectories_cap:
        return [f"work left     {at_most}, {source}"]
    until = f"{_hours(expected)} core-hours{_hours_range(estimate.core_seconds_expected_range)}"
    return [
        f"work left     {until} until the rules hold, after {count(numbers)} trajectories",
        f"              {at_most}, {source}",
    ]


def _hours(seconds: float) -> str:
    return f"{seconds / 3600:.3g}"


def _hours_range(between: Range | None) -> str:
    return "" if between is None else f" ({_hours(between.low)} to {_hours(between.high)})"


def _time(estimate: Estimate) -> str:
    if estimate.seconds is None:
        return f"not known: {estimate.seconds_unknown or 'no pool samples for this service'}"
    between = estimate.seconds_range
    spread = "" if between is None else f" ({duration(between.low)} to {duration(between.high)})"
    cores = f"{estimate.cores} core{'s' if estimate.cores != 1 else ''}"
    queued = estimate.queued_core_seconds
    beside = f", with {_hours(queued)} core-hours of other sweeps queued" if queued else ""
    return f"{duration(estimate.seconds)}{spread} on {cores}{beside}"


def _error(one: ExpectedError, ensembles: int) -> list[object]:
    between = one.largest_range
    spread = "" if between is None else f"{between.low:.2g} to {between.high:.2g}"
    rule = "" if one.below is None else f"below {one.below:g}"
    if one.met is not None:
        rule += f" in {one.met} of {ensembles} ensembles"
    numbers = ["" if value is None else f"{value:.2g}" for value in (one.largest, one.median)]
    return [f"  {one.name}", numbers[0], spread, numbers[1], rule, ERROR_SOURCES[one.source]]
