"""When and how patiently a request is repeated."""

import random
import time
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from datetime import UTC, datetime
from email.utils import parsedate_to_datetime
from typing import TypeVar

from sweepmill.errors import Unavailable, Unreachable

Answer = TypeVar("Answer")


@dataclass(frozen=True)
class Retry:
    """Exponential backoff with jitter; times in seconds.

    `attempts` counts the first one too. The pause before repetition n is drawn from the upper half of
    `first * 2**n`, capped at `longest`, so that many clients of a restarted service do not return together.
    A `Retry-After` of the service is honored up to `obeyed`.
    """

    attempts: int = 5
    first: float = 0.25
    longest: float = 8.0
    obeyed: float = 60.0

    def pauses(self) -> Iterator[float]:
        """Pauses between attempts: one fewer than attempts."""
        for n in range(self.attempts - 1):
            yield min(self.longest, self.first * 2**n) * random.uniform(0.5, 1.0)  # noqa: S311 - not a secret

    def run(self, action: Callable[[], Answer], sleep: Callable[[float], None] = time.sleep) -> Answer:
        """Run an idempotent action until it succeeds, fails for good, or the attempts are used up."""
        for pause in self.pauses():
            try:
                return action()
            except Unreachable:
                sleep(pause)
            except Unavailable as error:
                sleep(max(pause, min(self.obeyed, error.retry_after or 0.0)))
        return action()


def retry_after(header: str | None, now: datetime | None = None) -> float | None:
    """Seconds meant by a `Retry-After` header (RFC 9110, section 10.2.3): a number, or a date."""
    if header is None:
        return None
    if header.strip().isdigit():
        return float(header)
    try:
        date = parsedate_to_datetime(header)
    except ValueError:
        return None
    date = date if date.tzinfo else date.replace(tzinfo=UTC)
    return max(0.0, (date - (now or datetime.now(UTC))).total_seconds())
