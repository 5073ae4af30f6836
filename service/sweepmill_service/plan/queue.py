"""Ensembles of one sweep ordered by how far they are from their rule."""

from collections.abc import Callable
from heapq import heapify, heappop, heappush
from typing import NamedTuple

SLACK = 64  # stale items tolerated beyond four times the live ones


class Item(NamedTuple):
    """An ensemble at one state of its entry; lowest covered / needed first, then in table order."""

    ratio: float
    ordinal: int
    version: int
    ensemble: str


class LazyQueue:
    """A heap in which outdated items are dropped when they come up."""

    def __init__(self, is_current: Callable[[Item], bool]) -> None:
        self._items: list[Item] = []
        self._is_current = is_current

    def push(self, item: Item, live: int) -> None:
        """Add an item; ``live`` is the number of ensembles that can be current."""
        heappush(self._items, item)
        if len(self._items) > 4 * live + SLACK:
            self._items = [old for old in self._items if self._is_current(old)]
            heapify(self._items)

    def peek(self) -> Item | None:
        """The current item that comes first."""
        while self._items:
            if self._is_current(self._items[0]):
                return self._items[0]
            heappop(self._items)
        return None
