"""Gates by stim's names in OpenQASM 3: those of stdgates.inc, and definitions of the others in terms of them."""

from collections.abc import Mapping
from functools import cache
from typing import Any, Final

import stim

_STANDARD: Final[Mapping[str, str]] = {
    "I": "id",
    "X": "x",
    "Y": "y",
    "Z": "z",
    "H": "h",
    "S": "s",
    "S_DAG": "sdg",
    "SQRT_X": "sx",
    "CX": "cx",
    "CY": "cy",
    "CZ": "cz",
    "SWAP": "swap",
}
_RENAMED: Final[Mapping[str, str]] = {"SQRT_X_DAG": "sxdg", "SQRT_Y": "sy", "SQRT_Y_DAG": "sydg"}
_PAIR_BODIES: Final[Mapping[str, str]] = {
    "XCX": "h a; cx a, b; h a;",
    "XCY": "h a; cy a, b; h a;",
    "XCZ": "cx b, a;",
    "YCX": "sdg a; h a; cx a, b; h a; s a;",
    "YCY": "sdg a; h a; cy a, b; h a; s a;",
    "YCZ": "cy b, a;",
}
_LETTERS: Final = ("H", "S", "S_DAG", "SQRT_X", "X", "Y", "Z")
"""One-qubit gates that the others are made of."""


def qasm_name(name: str) -> str:
    """The name in OpenQASM of a gate of stim."""
    return _STANDARD.get(name) or _RENAMED.get(name) or name.lower()


def definition(name: str) -> str | None:
    """The line that defines a gate; None for those of stdgates.inc. Equal up to a global phase."""
    if name in _STANDARD:
        return None
    if name in _PAIR_BODIES:
        return f"gate {qasm_name(name)} a, b {{ {_PAIR_BODIES[name]} }}"
    body = " ".join(f"{_STANDARD[letter]} a;" for letter in _words()[str(stim.gate_data(name).tableau)])
    return f"gate {qasm_name(name)} a {{ {body} }}"


@cache
def _words() -> dict[str, tuple[str, ...]]:
    """A shortest product of standard gates for each of the 24 one-qubit Clifford gates, by its tableau as text."""
    found: dict[str, tuple[str, ...]] = {str(stim.Tableau(1)): ()}
    latest: list[tuple[tuple[str, ...], Any]] = [((), stim.Tableau(1))]
    while latest:
        longer = [
            ((*word, letter), gate.then(stim.gate_data(letter).tableau)) for word, gate in latest for letter in _LETTERS
        ]
        latest = []
        for word, gate in longer:
            if str(gate) not in found:
                found[str(gate)] = word
                latest.append((word, gate))
    return found
