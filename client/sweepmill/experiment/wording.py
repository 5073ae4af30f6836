"""Sentences and numbers that both forms of the report share."""

from collections.abc import Mapping, Sequence
from typing import Any

from sweepmill.analysis.estimate import Estimate, with_error
from sweepmill.experiment.amounts import repetitions, wall_clock
from sweepmill.experiment.cost import Cost
from sweepmill.experiment.record import Record
from sweepmill.text import short

TITLE = "What an experiment would pay"
ASSUMPTIONS = (
    "Gates, preparation and readout are ideal: there is no noise, and no error is mitigated or corrected.",
    "Measurements are projective, and each one counts as one operation in the middle of the circuit.",
    "The gates and the places of the measurements stay the same from run to run; only outcomes differ. Without "
    "decoding or feedback, a record is met again only by chance.",
    "The circuits are Clifford: a record of r random outcomes has probability 2^-r exactly. For Haar-random gates in "
    "the same places the mean chance that two runs agree is exactly the same, and the mean information of a record is "
    "at least as large as that chance tells: Clifford counts are lower bounds in this sense.",
    "Typical numbers are 2 to the mean of r over circuits. The mean of 2^r rests on rare circuits and is not used.",
)
CAUTION = (
    "This bounds circuits, not a particular machine: connectivity, parallel readout, loss and drift make it dearer, "
    "and observables that need no post-selection, decoders, or a classical partner simulation can make it cheaper."
)
MOST_SELECTED = 8
"""Circuits whose post-selection fits on a page."""
NEW_CIRCUITS = "Errors are one standard error over circuits."


def number(estimate: Estimate) -> str:
    """A value with its error in its last digits."""
    return f"{estimate.value:.4g}" if estimate.error is None else with_error(estimate.value, estimate.error)


def axes_text(labels: Mapping[str, Any]) -> str:
    """Values on axes as one phrase."""
    return ", ".join(
        f"{name.replace('_', ' ')} {value:.6g}" if isinstance(value, int | float) else f"{value}"
        for name, value in labels.items()
        if value is not None
    )


def size_of(record: Record) -> Any:
    """Number of sites, as far as known."""
    return record.labels.get("sites", record.sites)


def rest_of(record: Record) -> dict[str, Any]:
    """Values on the other axes."""
    return {name: value for name, value in record.labels.items() if name not in ("sites", "width", "layers")}


def largest(records: Sequence[Record]) -> list[Record]:
    """Those of the largest size."""
    sizes = [size_of(one) for one in records if size_of(one) is not None]
    return [one for one in records if not sizes or size_of(one) == max(sizes)]


def selectable(cost: Cost) -> list[Record]:
    """Circuits whose post-selection is shown: all where they are few, otherwise those of the largest size."""
    return cost.final if len(cost.final) <= MOST_SELECTED else largest(cost.final)


def unselected(cost: Cost) -> str:
    """Which sizes `selectable` leaves out, as a sentence; empty where it is none."""
    shown = {size_of(one) for one in selectable(cost)}
    left_out = sorted({size_of(one) for one in cost.final if size_of(one) not in shown} - {None})
    return f"Left out, but in the report as JSON: {', '.join(map(str, left_out))} sites." if left_out else ""


def row_heads(records: Sequence[Record]) -> tuple[str, dict[str, str]]:
    """A title and what stands for each circuit below it, sizes aside: values alone where only one axis varies."""
    names = list(dict.fromkeys(name for one in records for name in rest_of(one)))
    if len(names) != 1:
        return "", {axes_text(rest_of(one)): axes_text(rest_of(one)) for one in records}
    values = {axes_text(rest_of(one)): rest_of(one)[names[0]] for one in records}
    shown = {text: f"{value:.6g}" if isinstance(value, int | float) else f"{value}" for text, value in values.items()}
    return names[0].replace("_", " "), shown


def band_text(one: Record) -> str:
    """Median and the middle nine tenths."""
    about = "" if one.band.exact else "≈ "
    return f"{about}{one.band.median:.0f} ({one.band.low:.0f} to {one.band.high:.0f})"


def runs_and_time(log2: float, shot_time: float) -> tuple[str, str]:
    """Repetitions and how long they take."""
    return repetitions(log2), wall_clock(log2, shot_time)


def headline(cost: Cost) -> str:
    """The cheapest and the dearest circuit in one sentence."""
    if not cost.final:
        return "These circuits have no record: every run of the laboratory counts."
    ordered = sorted(cost.final, key=lambda one: one.again.value)
    first = _said(ordered[0], cost.options.shot_time)
    if len(ordered) == 1:
        return f"Meeting one record again takes {first}."
    return f"Meeting one record again takes from {first} to {_said(ordered[-1], cost.options.shot_time)}."


def _said(record: Record, shot_time: float) -> str:
    runs, time = runs_and_time(record.again.value, shot_time)
    where = axes_text(record.labels)
    return f"{runs} runs ({time}{'; ' + where if where else ''})"


def rare(records: Sequence[Record]) -> str:
    """What the mean of 2^r would rest on."""
    known = [one for one in records if one.from_few is not None and one.mean_of_power is not None]
    if not known:
        return "No histogram was kept: bands are from the variance, as if r were normal, and marked with ≈."
    worst = max(known, key=lambda one: one.from_few or 0.0)
    assert worst.mean_of_power is not None
    return (
        f"At {axes_text(worst.labels) or 'this depth'} the mean of 2^r would be 2^{worst.mean_of_power.value:.1f} in "
        f"place of 2^{worst.again.value:.1f}, with {worst.from_few:.0%} of it from a hundredth of the circuits."
    )


def provenance(cost: Cost) -> list[tuple[str, str, str]]:
    """Key, values on the axes, and N behind every number."""
    found = [(short(one.key), axes_text(one.labels), f"{one.trajectories:,}") for one in cost.final]
    both = cost.beside
    if both is not None and both.rotated is not None and both.entropy is not None:
        where = f"{both.rotated.family}, sites {both.rotated.sites}, layers {both.rotated.layers}"
        found.append((short(both.rotated.key), where, f"{both.entropy.trajectories:,}"))
    return found


def shot_text(shot_time: float) -> str:
    """The assumed duration of a repetition."""
    for size, unit in ((1.0, "s"), (1e-3, "ms"), (1e-6, "µs")):
        if shot_time >= size:
            return f"{shot_time / size:.4g} {unit}"
    return f"{shot_time:.3g} s"
