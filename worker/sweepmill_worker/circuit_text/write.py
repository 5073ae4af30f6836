"""The circuit of one trajectory of an ensemble, in a language of choice."""

from importlib.metadata import version
from typing import Final

from sweepmill.ensemble import Ensemble
from sweepmill.messages import CircuitFormat
from sweepmill.presets import layered_form
from sweepmill.revisions import FAMILY_REVISIONS
from sweepmill_worker.circuit_text.qasm_text import qasm_text
from sweepmill_worker.circuit_text.script import Script
from sweepmill_worker.circuit_text.stim_text import stim_text
from sweepmill_worker.program.compile import Program, compile_program
from sweepmill_worker.program.listing import operations

_WRITERS: Final = {"stim": stim_text, "openqasm3": qasm_text}


class TooLong(ValueError):
    """A circuit of more operations than are wanted."""


def circuit_text(ensemble: Ensemble, k: int, language: CircuitFormat, most: int | None = None) -> str:
    """Trajectory k as a stim circuit or an OpenQASM 3 program.

    Measurements have Born's outcomes again when the text is run: the circuit is the one that was sampled, entropies
    and everything else that does not depend on outcomes are the sampled ones.  Raises TooLong beyond `most`
    operations (gates and measurements of the circuit, each a few words of text), ValueError for an ensemble of
    another family revision or a circuit that this code does not compile.
    """
    if ensemble.revision != (current := FAMILY_REVISIONS[ensemble.family]):
        raise ValueError(f"{ensemble.family} has revision {current} here, the ensemble {ensemble.revision}")
    program = compile_program(layered_form(ensemble))
    return _WRITERS[language](script_of(program, ensemble.key_words, k, most), _title(ensemble, k))


def script_of(program: Program, key_words: tuple[int, int], k: int, most: int | None = None) -> Script:
    """The instructions of trajectory k. Raises TooLong beyond `most` operations."""
    script, count = Script(program.sites, program.references, program.initial_state), 0
    for layer in operations(program, key_words, k):
        count += len(layer.rows)
        if most is not None and count > most:
            raise TooLong(f"the circuit has more than {most} operations")
        name = f"layer {layer.number}" if layer.number > 0 else f"layer {layer.number + program.before} of those before"
        script.layer(layer.rows, name)
    return script


def _title(ensemble: Ensemble, k: int) -> tuple[str, ...]:
    scalars = {name: value for name, value in ensemble.parameters.items() if isinstance(value, int | float | str)}
    return (
        f"trajectory {k} of ensemble {ensemble.key}",
        ", ".join([ensemble.family, *(f"{name} {value}" for name, value in scalars.items())]),
        f"written by sweepmill {version('sweepmill')}",
    )
