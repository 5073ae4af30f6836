"""Where rounds are judged: one thread beside the dispatcher's, which goes on handing out work meanwhile."""

import logging
from collections.abc import Callable, Iterable, Iterator
from concurrent.futures import Future, ThreadPoolExecutor

from sweepmill_service.rounds.decide import decide
from sweepmill_service.store import Store
from sweepmill_service.store.rounds import Decision, Evidence

log = logging.getLogger(__name__)


class Rounds:
    """Sweeps whose round is being judged. Evidence is read and decisions are stored by the dispatcher's thread."""

    def __init__(self, store: Store, wake: Callable[[], None]) -> None:
        self._store = store
        self._wake = wake
        self._executor = ThreadPoolExecutor(max_workers=1, thread_name_prefix="sweepmill-rounds")
        self._judged: dict[str, tuple[Evidence, Future[Decision]]] = {}

    def begin(self, keys: Iterable[str]) -> None:
        """Have the rounds of these sweeps judged, those under way excepted."""
        for key in keys:
            if key not in self._judged:
                known = self._store.evidence(key)
                future = self._executor.submit(decide, known)
                self._judged[key] = known, future
                future.add_done_callback(lambda _: self._wake())

    def ended(self) -> Iterator[tuple[Evidence, Decision | str]]:
        """Decisions that are ready, or why there is none."""
        for key, (known, future) in list(self._judged.items()):
            if not future.done():
                continue
            del self._judged[key]
            error = future.exception()
            if error is not None:
                log.error("round %d of sweep %s could not be judged", known.rounds + 1, key, exc_info=error)
                yield known, f"round {known.rounds + 1} could not be judged: {type(error).__name__}: {error}"
            else:
                yield known, future.result()

    def close(self) -> None:
        """Forget what is under way."""
        self._executor.shutdown(wait=False, cancel_futures=True)
