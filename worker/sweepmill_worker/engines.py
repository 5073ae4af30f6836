"""Which engine samples an ensemble: the cheapest that is exact. All draw the same words for the same decisions."""

from collections.abc import Callable, Sequence
from decimal import Decimal
from typing import NamedTuple

from sweepmill.ensemble import Ensemble
from sweepmill.presets import layered_form
from sweepmill_worker.clifford.engine import HybridChain, Readings, run_probes
from sweepmill_worker.clusters.engine import run_cluster_probes
from sweepmill_worker.clusters.ensembles import cluster_chain
from sweepmill_worker.crossed import fill_chi
from sweepmill_worker.observables.probes import Probes
from sweepmill_worker.program.compile import Program, compile_program
from sweepmill_worker.program.run import run_probes as run_program_probes
from sweepmill_worker.reference.engine import run_reference

Read = Callable[[Ensemble, int, int, Sequence[int], Probes], Readings]


class Engine(NamedTuple):
    """A way to sample ensembles."""

    kernels: str
    """The job of `warm` that compiles what it calls."""
    read: Read
    """(ensemble, first, count, layers to read in ascending order, probes) to what was read off the trajectories."""


def engine_of(ensemble: Ensemble) -> Engine:
    """The engine of an ensemble."""
    if ensemble.parameters["engine"] == "reference":
        return SIGNED
    if ensemble.family == "projective-ising":
        return CLUSTERS
    if ensemble.family == "hybrid-clifford" and not _prepared(ensemble):
        return CHAIN
    return PROGRAM


def _prepared(ensemble: Ensemble) -> bool:
    return bool(ensemble.parameters["references"] or ensemble.parameters["scrambling_layers"])


def program_of(ensemble: Ensemble) -> Program:
    """The compiled circuit of an ensemble of any family."""
    return compile_program(layered_form(ensemble))


def hybrid_chain(ensemble: Ensemble) -> HybridChain:
    """The law of a hybrid-clifford ensemble without reference qubits and scrambling layers."""
    rate = Decimal(repr(ensemble.parameters["measurement_rate"]))
    return HybridChain(
        sites=ensemble.sites,
        layers=ensemble.layers,
        periodic=ensemble.periodic,
        mixed=ensemble.parameters["initial_state"] == "mixed",
        threshold=int(rate * 2**32),
    )


def _read_chain(ensemble: Ensemble, first: int, count: int, layers: Sequence[int], probes: Probes) -> Readings:
    found = run_probes(hybrid_chain(ensemble), ensemble.key_words, first, count, layers, probes)
    fill_chi(found, ensemble, first, layers, probes)
    return found


def _read_program(ensemble: Ensemble, first: int, count: int, layers: Sequence[int], probes: Probes) -> Readings:
    found = run_program_probes(program_of(ensemble), ensemble.key_words, first, count, layers, probes)
    fill_chi(found, ensemble, first, layers, probes)
    return found


def _read_clusters(ensemble: Ensemble, first: int, count: int, layers: Sequence[int], probes: Probes) -> Readings:
    return run_cluster_probes(cluster_chain(ensemble), ensemble.key_words, first, count, layers, probes)


def _read_signed(ensemble: Ensemble, first: int, count: int, layers: Sequence[int], probes: Probes) -> Readings:
    return run_reference(program_of(ensemble), ensemble.key_words, first, count, layers, probes)


CHAIN = Engine("chains", _read_chain)
PROGRAM = Engine("programs", _read_program)
CLUSTERS = Engine("clusters", _read_clusters)
SIGNED = Engine("programs", _read_signed)
