"""Sharing the pool between owners by charged core-seconds (start-time fair queueing)."""

from collections import defaultdict
from collections.abc import Collection


class FairShare:
    """A clock per owner that runs with the core-seconds charged to it; the owner whose clock is behind goes next.

    Work under way counts with its predicted cost, so that nobody fills the window before the first result. An owner
    who comes back after a pause starts at the slowest clock among the active: a pause earns no credit.
    """

    def __init__(self) -> None:
        self.clocks: dict[str, float] = {}
        self._under_way: dict[str, int] = defaultdict(int)
        self._active: set[str] = set()

    def choose(self, owners: Collection[str]) -> str:
        """The owner to serve next among those with work."""
        busy = {owner for owner in self._active if self._under_way[owner]}
        self._active = (self._active & set(owners)) | busy
        running = [self.clocks[owner] for owner in self._active]
        start = min(running) if running else max(self.clocks.values(), default=0.0)
        for owner in set(owners) - self._active:
            self.clocks[owner] = max(self.clocks.get(owner, 0.0), start)
            self._active.add(owner)
        return min(owners, key=lambda owner: (self.clocks[owner], owner))

    def charge(self, owner: str, seconds: float) -> None:
        """Count predicted core-seconds of a task that begins."""
        self.clocks[owner] = self.clocks.get(owner, 0.0) + seconds
        self._under_way[owner] += 1

    def correct(self, owner: str, predicted: float, actual: float) -> None:
        """A task ended: replace its predicted by its actual core-seconds."""
        self.clocks[owner] = self.clocks.get(owner, 0.0) + actual - predicted
        self._under_way[owner] -= 1
