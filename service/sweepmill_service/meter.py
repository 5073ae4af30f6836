"""Throughput over the last minute."""

import threading
import time
from collections import deque
from collections.abc import Callable

WINDOW = 60.0
MEMORY = 300.0  # seconds with enough work after which older ones count half
LEAST = 20.0  # such seconds that tell a pace


class Meter:
    """Sums of what landed within the window; may be read from any thread."""

    def __init__(self, clock: Callable[[], float] = time.monotonic) -> None:
        self._clock = clock
        self._lock = threading.Lock()
        self._since = clock()
        self._landed: deque[tuple[float, float, int]] = deque()
        self.batches = 0
        self._watched, self._full = clock(), False
        self._offered = self._given = 0.0  # core-seconds while there was enough work

    def note(self, seconds: float, trajectories: int) -> None:
        """A batch of so many core-seconds and trajectories was stored."""
        with self._lock:
            self.batches += 1
            self._landed.append((self._clock(), seconds, trajectories))
            self._given += seconds if self._full else 0.0

    def watch(self, cores: int, full: bool) -> None:
        """Whether every core has work now; to be called often."""
        with self._lock:
            now = self._clock()
            if self._full:
                self._offered += cores * (now - self._watched)
            self._watched, self._full = now, full
            if self._offered > cores * MEMORY:
                self._offered, self._given = self._offered / 2, self._given / 2

    def pace(self, cores: int) -> float | None:
        """Core-seconds of sampling per core and second while there was enough work, at most 1; None if unknown.

        Other programs on the same machines make it small.
        """
        with self._lock:
            return min(self._given / self._offered, 1.0) if self._offered > max(cores, 1) * LEAST else None

    def trajectories_per_second(self) -> float:
        """Mean over the window."""
        return sum(count for _, _, count in self._recent()) / self._span()

    def busy_fraction(self, cores: int) -> float:
        """Core-seconds of sampling per core and second, over the window."""
        return sum(seconds for _, seconds, _ in self._recent()) / self._span() / cores if cores else 0.0

    def _recent(self) -> list[tuple[float, float, int]]:
        with self._lock:
            while self._landed and self._landed[0][0] < self._clock() - WINDOW:
                self._landed.popleft()
            return list(self._landed)

    def _span(self) -> float:
        return max(min(WINDOW, self._clock() - self._since), 1e-3)
