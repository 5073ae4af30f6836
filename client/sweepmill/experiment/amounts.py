"""Numbers of repetitions and their duration, far beyond what floating-point numbers hold."""

import math

YEAR = 365.25 * 86400
_UNITS = ((YEAR, "years"), (86400.0, "days"), (3600.0, "hours"), (60.0, "minutes"), (1.0, "seconds"))
_MOST_PLAIN = 1e6


def repetitions(log2: float) -> str:
    """2^log2 as people write it: 1,234 or 10^12.3."""
    if log2 < math.log2(_MOST_PLAIN):
        return f"{round(2.0**log2, -1 if log2 > 10 else 0):,.0f}"
    return _power(log2 * math.log10(2))


def wall_clock(log2: float, shot_time: float) -> str:
    """Duration of 2^log2 repetitions of `shot_time` seconds each, to two digits."""
    log10 = log2 * math.log10(2) + math.log10(shot_time)
    if log10 < 0:
        return "under 1 second"
    for size, name in _UNITS:
        if log10 >= math.log10(size):
            number = log10 - math.log10(size)
            return f"{_power(number)} {name}" if number > 5 else _plain(10.0**number, name)
    return _plain(10.0**log10, "seconds")


def _power(log10: float) -> str:
    return f"10^{log10:.1f}" if log10 < 99.95 else f"10^{log10:,.0f}"


def _plain(number: float, name: str) -> str:
    digits = 0 if number >= 9.95 else 1
    rounded = round(number, -int(math.log10(number)) + 1) if number >= 100 else round(number, digits)
    return f"{rounded:,.{digits}f} {name}"
