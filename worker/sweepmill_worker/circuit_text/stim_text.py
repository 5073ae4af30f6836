"""A script as a stim circuit."""

from collections.abc import Iterator, Sequence
from itertools import groupby
from typing import Final

from sweepmill_worker.circuit_text.script import FORCED, LAYER, MEASURE, Instruction, Script

_ONE_SITE: Final = {"X": "MX", "Y": "MY", "Z": "M"}
_FORCED_NOTE: Final = "forced: keep runs with 0 here"


def stim_text(script: Script, title: Sequence[str]) -> str:
    """The text, comments included."""
    return "\n".join([*_head(script, title), *_body(script)]) + "\n"


def _head(script: Script, title: Sequence[str]) -> Iterator[str]:
    yield from (f"# {line}" for line in title)
    yield f"# qubits 0 .. {script.sites - 1}: the chain"
    first = script.sites
    for count, what in ((script.references, "references"), (script.discarded, "discarded, not part of the state")):
        if count:
            yield f"# qubits {first} .. {first + count - 1}: {what}"
        first += count


def _body(script: Script) -> Iterator[str]:
    for kind, group in groupby(script.instructions, key=_kind):
        name, letters, note = kind
        targets = " ".join(_target(one) for one in group)
        if name == LAYER:
            yield f"TICK # {note} done"
        elif name in (MEASURE, FORCED):
            word = _ONE_SITE[letters] if len(letters) == 1 else "MPP"
            yield f"{word} {targets}" + (f" # {_FORCED_NOTE}" if name == FORCED else "")
        else:
            yield f"{name} {targets}" + (f" # {note}" if note else "")


def _kind(one: Instruction) -> tuple[str, str, str]:
    """Neighbors of one kind share a line; products of several letters do whatever the letters are."""
    return one.name, one.letters if len(one.letters) < 2 else "product", one.note


def _target(one: Instruction) -> str:
    if len(one.letters) > 1:
        return "*".join(f"{letter}{qubit}" for letter, qubit in zip(one.letters, one.qubits, strict=True))
    return " ".join(map(str, one.qubits))
