"""A monitored circuit and a unitary one read sideways, side by side: the same region, about the same entanglement."""

import math
from collections.abc import Container, Iterable, Mapping, Sequence
from dataclasses import dataclass
from itertools import product
from typing import Any, NamedTuple

from sweepmill import observation
from sweepmill.analysis.estimate import Estimate
from sweepmill.ensemble import Ensemble
from sweepmill.experiment.counted import gates_until
from sweepmill.experiment.record import Record
from sweepmill.experiment.sideways import Sideways, sideways_circuit
from sweepmill.experiment.source import Source

ROTATED = "rotated-clifford"
OTHERS = (ROTATED, "hybrid-clifford-square")
"""Families that are no monitored chain."""


class Entropy(NamedTuple):
    """Mean entropy of half the system over so many trajectories."""

    bits: Estimate
    trajectories: int

    def to_dict(self) -> dict[str, Any]:
        """Plain values."""
        return self.bits.to_dict() | {"trajectories": self.trajectories}


@dataclass(frozen=True)
class Monitored:
    """A monitored circuit at its last depth: its record, its two-qubit gates, and the entropy of half of it."""

    ensemble: Ensemble
    record: Record
    gates: float | None
    entropy: Entropy | None

    def to_dict(self) -> dict[str, Any]:
        """Plain values."""
        return {
            "ensemble": self.record.key,
            **self.record.labels,
            "region": self.ensemble.sites // 2,
            "entropy": None if self.entropy is None else self.entropy.to_dict(),
            "qubits": self.ensemble.sites,
            "layers": self.record.layer,
            "two_qubit_gates": self.gates,
            "mid_circuit_measurements": self.record.measurements,
            "post_selected_bits": self.record.again.value,
        }


@dataclass(frozen=True)
class Beside:
    """Both circuits; the monitored one may be missing.

    `rotated` is the sampled ensemble that the sideways circuit prepares, `entropy` that of its half; None where only
    the exact mean purity is known.
    """

    monitored: Monitored | None
    sideways: Sideways
    rotated: Ensemble | None
    entropy: Entropy | None

    def to_dict(self) -> dict[str, Any]:
        """Plain values."""
        return {
            "monitored": None if self.monitored is None else self.monitored.to_dict(),
            "sideways": self.sideways.to_dict() | {"entropy": None if self.entropy is None else self.entropy.to_dict()},
        }


def beside(source: Source, records: Sequence[Record]) -> Beside | None:
    """The largest rotated circuit of the sweep, or the smallest patch for half of its largest monitored chain.

    Of the monitored circuits of that size the one whose half is entangled most alike is taken. None where the source
    tells of no circuit.
    """
    entropies = half_entropies(source)
    rotated = max(_rotated(source.ensembles.values()), key=lambda one: one.sites, default=None)
    measured = [one for one in records if one.measurements and source.ensembles[one.key].family not in OTHERS]
    if rotated is not None:
        circuit = Sideways(rotated.layers, rotated.sites - 1, 0, rotated.sites // 2)
        entropy = entropies.get(rotated.key)
    elif measured:
        circuit, entropy = sideways_circuit(max(source.ensembles[one.key].sites for one in measured) // 2), None
    else:
        return None
    return Beside(_alike(source, measured, circuit, entropy, entropies), circuit, rotated, entropy)


def half_entropies(source: Source) -> dict[str, Entropy]:
    """Entropy of half the system at the last depth, by ensemble key.

    The laboratory of a rotated circuit holds the slices after the last column alone: only what was observed at the
    end counts there, not the mean over a unit cell. Of the others the mean over the last cell is preferred.
    """
    if source.table is None:
        return {}
    at_end = {name for name, key in source.table.metadata.get("observations", {}).items() if key in _AT_THE_END}
    found: dict[str, Entropy] = {}
    for one in source.table.ensembles:
        began, ended = one["rows"]
        rows = [{name: source.table.values(name)[i] for name in source.table.columns} for i in range(began, ended)]
        halves = [row for row in rows if row["quantity"] == "entropy" and row["region"] == "half"]
        ensemble = source.ensembles.get(str(one["key"]))
        if ensemble is not None and ensemble.family == ROTATED:
            halves = [row for row in halves if row["name"] in at_end]
        if halves:
            found[str(one["key"])] = _last(halves, at_end)
    return found


def _last(rows: Sequence[Mapping[str, Any]], at_end: Container[str]) -> Entropy:
    last = max(rows, key=lambda row: (row["layer"] is None, row["layer"] or 0, row["name"] not in at_end))
    return Entropy(Estimate(last["mean"], last["standard_error"] or math.nan), last["trajectories"])


_AT_THE_END = {
    observation.Entropy(quantity="entropy", at="end", histogram=histogram, keep_values=keep).key
    for histogram, keep in product((False, True), repeat=2)
}
"""Keys of the observations of half the system after the last layer."""


def _rotated(ensembles: Iterable[Ensemble]) -> list[Ensemble]:
    """Those with open ends: other ends are no circuit of this kind."""
    return [one for one in ensembles if one.family == ROTATED and one.parameters["ends"] == "open"]


def _alike(
    source: Source,
    measured: Sequence[Record],
    circuit: Sideways,
    entropy: Entropy | None,
    entropies: Mapping[str, Entropy],
) -> Monitored | None:
    """The monitored circuit next in size of its half, and then in entropy."""
    if not measured:
        return None
    bits = entropy.bits.value if entropy is not None else -(circuit.log2_purity or 0.0)

    def distance(one: Record) -> tuple[float, float]:
        size = abs(source.ensembles[one.key].sites / 2 - circuit.window)
        return size, abs(entropies[one.key].bits.value - bits) if one.key in entropies else float("inf")

    nearest = min(measured, key=distance)
    ensemble = source.ensembles[nearest.key]
    gates = gates_until(ensemble, nearest.layer or ensemble.layers)
    return Monitored(ensemble, nearest, gates, entropies.get(nearest.key))
