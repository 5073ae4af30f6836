"""The rows of the side-by-side comparison."""

from typing import NamedTuple

from sweepmill.experiment.amounts import repetitions
from sweepmill.experiment.beside import Beside, Monitored
from sweepmill.experiment.sideways import Sideways
from sweepmill.experiment.wording import axes_text, number, runs_and_time


class Road(NamedTuple):
    """One line of the comparison: what, and its value on either road."""

    what: str
    monitored: str
    sideways: str


def roads(both: Beside, shot_time: float) -> list[Road]:
    """Every count on either road."""
    left = _monitored(both.monitored, shot_time)
    right = _sideways(both, shot_time)
    return [Road(what, left[what], right[what]) for what in right]


def roads_title(both: Beside) -> str:
    """What the comparison is called."""
    return "Monitored, or unitary and read sideways" if both.monitored else "The circuit that the laboratory would run"


def caption(both: Beside) -> str:
    """Which circuits stand side by side."""
    chosen = "" if both.monitored is None else f"Monitored: {axes_text(both.monitored.record.labels)}. "
    circuit = both.sideways
    unlike = "" if alike(both) else "No monitored circuit of this size here is entangled alike. "
    exact = " Their entropy is at least −log2 of the exact mean purity." if both.entropy is None else ""
    return (
        f"{chosen}{unlike}Sideways: uniform two-qubit Clifford gates on {circuit.chain} qubits, of whose edge the time "
        f"slices {circuit.held.start} to {circuit.held.stop - 1} are held; what enters elsewhere is a random basis "
        f"state, and the qubits left at the end are traced or, for a pure state, projected and post-selected.{exact}"
    )


def alike(both: Beside) -> bool:
    """Whether the two regions are entangled by the same number of bits, within a fifth, as far as known."""
    if both.monitored is None or both.monitored.entropy is None:
        return True
    there = both.monitored.entropy.bits.value
    here = both.entropy.bits.value if both.entropy is not None else -(both.sideways.log2_purity or -there)
    return abs(here - there) <= 0.2 * here


def _monitored(one: Monitored | None, shot_time: float) -> dict[str, str]:
    if one is None:
        return dict.fromkeys(_NAMES, "—")
    record = one.record
    runs, time = runs_and_time(record.again.value, shot_time)
    pairs, pairs_time = runs_and_time(record.any_twice.value, shot_time)
    entropy = "not observed" if one.entropy is None else f"{number(one.entropy.bits)} bits"
    measured = 0.0 if record.measurements is None else record.measurements
    gates = "—" if one.gates is None else f"{one.gates:,.0f}"
    values = [
        f"{one.ensemble.sites // 2} sites",
        entropy,
        f"{one.ensemble.sites}",
        f"{record.layer}",
        gates,
        "0",
        f"{measured:,.0f}",
        "0",
        f"{number(record.again)}",
        f"{runs} ({time})",
        f"{pairs} ({pairs_time})",
    ]
    return dict(zip(_NAMES, values, strict=True))


def _sideways(both: Beside, shot_time: float) -> dict[str, str]:
    circuit = both.sideways
    values = [
        f"{circuit.window} slices",
        _entropy(both),
        f"{circuit.chain} + {circuit.window} held",
        f"{circuit.layers}",
        f"{circuit.gates:,} + {circuit.taken_out} swaps",
        f"{circuit.bell_pairs}",
        "0",
        _projected(circuit),
        f"0, or up to {circuit.final_legs} if projected",
        f"1, or up to {repetitions(circuit.final_legs)}",
        "2",
    ]
    return dict(zip(_NAMES, values, strict=True))


_NAMES = (
    "region",
    "entropy of the region",
    "qubits",
    "layers",
    "two-qubit gates",
    "fresh Bell pairs",
    "measurements in mid-circuit",
    "measurements at the end",
    "post-selected bits",
    "runs for one state again",
    "runs for two equal states",
)


def _projected(circuit: Sideways) -> str:
    return f"none, or {circuit.final_legs} if projected"


def _entropy(both: Beside) -> str:
    if both.entropy is not None:
        return f"{number(both.entropy.bits)} bits"
    purity = both.sideways.log2_purity
    return "not known" if purity is None else f"at least {-purity:.3f} bits"
