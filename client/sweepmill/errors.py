"""Everything this package raises, one base class to catch.

SweepmillError
├── SpecificationError     a sweep that cannot be accepted: every fault with its path
├── AccumulatorOverflow    a sum beyond 127 bits: nothing is stored
├── AccumulatorMismatch    totals of different shapes cannot be merged
├── MissingExtra           an optional dependency is not installed
├── BadSettings            an address, token or owner that cannot be used
├── NotAKey                what stands for a key is not 8 to 64 hexadecimal digits
├── Unreachable            no service answers, or the connection broke: worth another try
├── TimedOut               the service took the request and did not answer in time
├── UnexpectedAnswer       what answered does not speak as a Sweepmill service does
├── ServiceError           the service refused: status, title, detail, faults
│   ├── NotAllowed         a token is missing, unknown or not sufficient (401, 403)
│   ├── UnknownKey         nothing has this key (404)
│   ├── AmbiguousKey       a shortened key that fits several (409)
│   └── Unavailable        the service is there but cannot answer now (502, 503, 504): worth another try
├── KeyMismatch            client and service compute different keys for one specification
├── SweepStuck             the sweep cannot proceed, with the reason
├── SweepWithdrawn         nobody requests the sweep any more, so it will not settle
├── WaitTimeout            the sweep did not settle in the time given
└── SharedTrajectories     tables that rest on the same trajectories were to be used as independent ones
"""

from collections.abc import Iterable, Mapping
from typing import NamedTuple


class SweepmillError(Exception):
    """Base of all errors of this package."""


class Fault(NamedTuple):
    """One thing wrong with a specification: where, and what would pass."""

    path: str
    message: str

    def __str__(self) -> str:
        return f"{self.path}: {self.message}" if self.path else self.message


class SpecificationError(SweepmillError):
    """A specification refused as a whole, with every fault listed."""

    def __init__(self, faults: Iterable[Fault]) -> None:
        self.faults = tuple(faults)
        super().__init__("\n".join(map(str, self.faults)))


class AccumulatorOverflow(SweepmillError):
    """A sum left the range of 127-bit integers."""


class AccumulatorMismatch(SweepmillError):
    """Two accumulators do not describe the same coordinates."""


class MissingExtra(SweepmillError):
    """A feature needs an optional dependency."""

    def __init__(self, feature: str, extra: str) -> None:
        self.extra = extra
        super().__init__(f'{feature} needs an optional dependency: pip install "sweepmill[{extra}]"')


class BadSettings(SweepmillError):
    """The address, token or owner given to the client cannot be used."""


class NotAKey(SweepmillError):
    """What stands for a key cannot be one."""

    def __init__(self, key: str) -> None:
        super().__init__(f"{key!r} is not a key: a key is 64 hexadecimal digits, or at least the first 8 of them")


class Unreachable(SweepmillError):
    """No service answers at the address, or the connection broke."""

    def __init__(self, url: str, reason: str) -> None:
        self.url = url
        self.reason = reason
        super().__init__(
            f"no Sweepmill service answers at {url} ({reason}): is `sweepmill serve` running there, "
            "and is SWEEPMILL_URL or --url right?"
        )


class TimedOut(SweepmillError):
    """The service accepted the request and did not answer in time."""

    def __init__(self, url: str, reason: str) -> None:
        self.url = url
        super().__init__(f"the service at {url} did not answer in time ({reason}); a larger `timeout` may help")


class UnexpectedAnswer(SweepmillError):
    """What answered is not a Sweepmill service, or one of a version this client cannot read."""

    def __init__(self, url: str, reason: str) -> None:
        self.url = url
        super().__init__(f"{url} did not answer as a Sweepmill service does: {reason}")


class ServiceError(SweepmillError):
    """The service refused a request; `faults` lists what is wrong with it, if the service said."""

    def __init__(self, status: int, title: str, detail: str = "", faults: Iterable[Fault] = ()) -> None:
        self.status = status
        self.title = title
        self.detail = detail
        self.faults = tuple(faults)
        said = detail or title
        lines = [said, *(str(fault) for fault in self.faults if fault.message not in said)]
        super().__init__("\n".join(lines))


class NotAllowed(ServiceError):
    """The token is missing, unknown, or does not allow this."""


class UnknownKey(ServiceError):
    """Nothing the service holds has this key."""


class AmbiguousKey(ServiceError):
    """Several keys begin like this."""


class Unavailable(ServiceError):
    """The service cannot answer now; `retry_after` is its own advice in seconds."""

    def __init__(self, status: int, title: str, detail: str = "", retry_after: float | None = None) -> None:
        self.retry_after = retry_after
        super().__init__(status, title, detail)


class KeyMismatch(SweepmillError):
    """One specification, two keys: client and service are of different revisions."""

    def __init__(self, local: str, remote: str, here: Mapping[str, int], there: Mapping[str, int]) -> None:
        self.local = local
        self.remote = remote
        self.revisions = {
            name: (here.get(name), there.get(name))
            for name in sorted({*here, *there})
            if here.get(name) != there.get(name)
        }
        super().__init__(
            f"the service computes key {remote[:12]} for this sweep, this client {local[:12]}; "
            f"{_differing(self.revisions)}: install the same version of sweepmill on both sides"
        )


def _differing(revisions: Mapping[str, tuple[int | None, int | None]]) -> str:
    if not revisions:
        return "their revisions agree, so their normal forms differ"
    each = (f"{name} is {here} here and {there} there" for name, (here, there) in revisions.items())
    return "revisions differ: " + ", ".join(each).replace("None", "absent")


class SweepStuck(SweepmillError):
    """The sweep cannot proceed."""

    def __init__(self, key: str, reason: str) -> None:
        self.key = key
        self.reason = reason
        super().__init__(f"sweep {key[:12]} is stuck: {reason}")


class SweepWithdrawn(SweepmillError):
    """Nobody requests the sweep any more."""

    def __init__(self, key: str) -> None:
        self.key = key
        super().__init__(f"sweep {key[:12]} is withdrawn; submitting it again restores it")


class WaitTimeout(SweepmillError):
    """The sweep did not settle in the time given; it goes on."""

    def __init__(self, key: str, seconds: float) -> None:
        self.key = key
        super().__init__(f"sweep {key[:12]} did not settle within {seconds:g} s; it goes on without being watched")


class SharedTrajectories(SweepmillError):
    """Tables that rest on the same trajectories are not independent of each other."""

    def __init__(self, ensembles: Iterable[str]) -> None:
        self.ensembles = tuple(ensembles)
        shown = ", ".join(key[:12] for key in self.ensembles[:5])
        super().__init__(
            f"{len(self.ensembles)} ensembles occur in more than one table ({shown}): their trajectories are "
            "the same, so the tables are not independent; circuit.replicate gives an independent copy"
        )
