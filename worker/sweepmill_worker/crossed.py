"""chi of circuits without signs: the same circuits again, from other initial states."""

from collections.abc import Sequence
from functools import partial

import numpy as np
from numpy.typing import NDArray

from sweepmill.ensemble import Ensemble
from sweepmill.observation.crossed import CHI_UNIT
from sweepmill.presets import layered_form
from sweepmill_worker.clifford.engine import Readings
from sweepmill_worker.observables.probes import Probes
from sweepmill_worker.program.compile import Program, compile_program
from sweepmill_worker.program.run import run_probes


def program_from(ensemble: Ensemble, initial_state: str) -> Program:
    """The compiled circuit of an ensemble, from another initial state."""
    return compile_program(layered_form(ensemble) | {"initial_state": initial_state})


def fill_chi(readings: Readings, ensemble: Ensemble, first: int, layers: Sequence[int], probes: Probes) -> None:
    """Write chi of the records of layers 1 .. n, for each n of `layers`, where `probes.against` asks for it.

    It is 2^-n, with n as in `sweepmill.observation.CrossEntropy`: outcomes that are random from the maximally mixed
    state, minus those from the other one.  The circuits have the ensemble's words.
    """
    if not probes.against:
        return
    random_from = partial(_random_from, ensemble, first, len(readings.random))
    whole = readings.random if ensemble.initial_state == "mixed" else random_from("mixed")
    rows = [layer - 1 for layer in layers]
    for place, state in enumerate(probes.against, probes.layout.against.start):
        told = np.cumsum(whole - random_from(state), axis=1, dtype=np.int64)[:, rows]
        readings.entropies[:, :, place] = chi_of(told)


def chi_of(told: NDArray[np.int64]) -> NDArray[np.int64]:
    """2^-n in units, rounded down, of so many bits n."""
    return CHI_UNIT >> np.minimum(told, CHI_UNIT.bit_length())


def _random_from(ensemble: Ensemble, first: int, count: int, initial_state: str) -> NDArray[np.int32]:
    program = program_from(ensemble, initial_state)
    nothing = Probes(program.sites, program.references)
    return run_probes(program, ensemble.key_words, first, count, [], nothing).random
