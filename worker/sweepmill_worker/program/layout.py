"""Which words are made when: those of short layers for several layers in one call, to fill the generator's vectors."""

from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import Final

import numpy as np
from numpy.typing import NDArray

from sweepmill_worker.words import counters

WORDS_AT_ONCE: Final = 512


@dataclass
class Segments:
    """Stretches of words, each beginning a block of its own."""

    blocks: list[NDArray[np.uint32]] = field(default_factory=list)
    layers: list[int] = field(default_factory=list)
    """Per stretch; only of fixed words."""
    size: int = 0
    """Words."""

    def add(self, kind: int, places: int, layer: int = 0) -> int:
        """Position of the first word."""
        at = self.size
        self.blocks.append(counters(kind, places))
        self.layers.append(layer)
        self.size += 4 * len(self.blocks[-1])
        return at

    def counters(self) -> NDArray[np.uint32]:
        """First counter words of all blocks."""
        return np.concatenate(self.blocks) if self.blocks else np.zeros(0, np.uint32)

    def layer_words(self) -> NDArray[np.uint32]:
        """The layer of every block."""
        return np.repeat(np.array(self.layers, np.uint32), [len(block) for block in self.blocks])


class Layout:
    """Tiles of consecutive layers whose words are made together."""

    def __init__(self, base: int) -> None:
        self.base = base
        """Where the words of layers begin, behind the fixed ones."""
        self.sequence: list[list[int]] = []
        self.blocks: list[NDArray[np.uint32]] = []
        self.ahead: list[NDArray[np.uint32]] = []
        self.done = 0
        """Blocks so far."""
        self.largest = 0

    def add(self, numbers: Sequence[int], lists: Sequence[Segments], apart: bool) -> None:
        """Layers in order, with the numbers of their lists.  Apart: every layer is a tile of its own."""
        begin = 0
        while begin < len(lists):
            end, size = begin + 1, lists[begin].size
            while end < len(lists) and not apart and size + lists[end].size <= WORDS_AT_ONCE:
                size += lists[end].size
                end += 1
            self._tile(lists[begin:end], numbers[begin:end])
            begin = end

    def _tile(self, lists: Sequence[Segments], numbers: Sequence[int]) -> None:
        done = self.done
        fill_from, base = done, self.base
        total = sum(segments.size for segments in lists) // 4
        for ahead, (segments, number) in enumerate(zip(lists, numbers, strict=True)):
            self.sequence.append([number, fill_from, done + total if ahead == 0 else fill_from, base])
            self.blocks.append(segments.counters())
            self.ahead.append(np.full(segments.size // 4, ahead, np.uint32))
            base += segments.size
        self.done += total
        self.largest = max(self.largest, base - self.base)


def periods(lists: Sequence[Segments], layers: int) -> int:
    """How often `repeat` is written out, so that its tiles are of good size."""
    size, most = sum(segments.size for segments in lists), -(-layers // len(lists))
    return max(1, min(WORDS_AT_ONCE // max(size, 1), most))
