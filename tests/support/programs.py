"""Normal forms of circuits written as data, and the rows they give, derived again in plain Python."""

from collections.abc import Callable
from typing import Any

import numpy as np

from sweepmill_worker.words import words

Form = dict[str, Any]
Word = Callable[[int, int], int]


def form(sites: int, layers: int, repeat: list[list[dict[str, Any]]], **more: Any) -> Form:
    """A normal form: defaults omitted."""
    return {"family": "layered", "revision": 1, "sites": sites, "layers": layers, "repeat": repeat, **more}


def hybrid(sites: int, layers: int, rate: float, **more: Any) -> Form:
    """The hybrid Clifford chain as layers of gates and measurements."""
    measure: Form = {"measure": "Z", "on": "sites"} | ({} if rate == 1 else {"rate": rate})
    layer = [[{"apply": "uniform-clifford", "on": f"bonds-from-{parity}"}, measure] for parity in (0, 1)]
    return form(sites, layers, layer, **more)


def word_of(key: tuple[int, int], layer: int, k: int) -> Word:
    """The word of a kind and place."""
    return lambda kind, place: int(words(key, kind, layer, k, place + 1)[place])


def gate(word: int, classes: list[int], sites: int) -> tuple[int, int]:
    """Class and frame of a random gate."""
    product = word * len(classes)
    return classes[product >> 32], ((product & 0xFFFFFFFF) * 4**sites) >> 32


def below(word: int, rate: float) -> bool:
    """Does something of this rate happen?"""
    return word < int(np.floor(rate * 2**32))
