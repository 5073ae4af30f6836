"""Shows how far a sweep is: a brickwork of gates that fills up, in a terminal or a notebook; plain lines elsewhere.

Solid bricks are settled ensembles, pale ones what is sampled beyond them, dots what may still be needed.
"""

import sys
import time
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from html import escape
from typing import Any, TextIO

from sweepmill.messages import Answer, SweepStatus
from sweepmill.text import count, duration, short, with_error

Show = Callable[[SweepStatus], None]
SETTLED, SAMPLED, OPEN = "#3d6fb6", "#9db4d4", "#8a8a8a"
WIDTH = 32  # bricks
ANSWERS = 3  # shown at most in one line
INTERVAL = 30.0  # seconds between plain lines, unless the state changes


def bricks(status: SweepStatus, width: int = WIDTH) -> tuple[str, str, str]:
    """The settled, the sampled and the open part of the brickwork, `width` characters together."""
    settled = width * status.settled // max(1, status.ensembles)
    sampled = max(settled, width * status.trajectories // max(1, status.trajectories_cap))
    pattern = ("▀▄" * width)[:width]
    return pattern[:settled], pattern[settled:sampled], "·" * (width - sampled)


def sentence(status: SweepStatus) -> str:
    """State and numbers in one line."""
    parts = [
        f"{status.state}: {count(status.settled)} of {count(status.ensembles)} ensembles settled",
        f"{count(status.trajectories)} trajectories",
    ]
    if status.state in ("waiting", "sampling") and status.seconds_left is not None:
        left = duration(status.seconds_left)
        parts.append(f"{left} left" if left.startswith("under") else f"about {left} left")
    if status.state == "settled" and not all(answer.met for answer in status.answers):
        parts.append("the goal is not met")
    parts += [answer_text(answer) for answer in status.answers[:ANSWERS]]
    return ", ".join(parts) + (f" ({status.reason})" if status.reason else "")


def answer_text(answer: Answer, with_round: bool = True) -> str:
    """What a round found, as in `p_c = 0.1597(6), 0.0005 asked (round 4)`."""
    where = "".join(f"{name} = {value}: " for name, value in answer.where.items())
    found = "no answer"
    if answer.value is not None:
        found = f"{answer.value:.5g} (no error bar)" if answer.error is None else with_error(answer.value, answer.error)
    said = f"{where}{answer.quantity} = {found}, {answer.below:g} asked"
    return f"{said} (round {answer.round})" if with_round else said


@contextmanager
def shown(progress: bool | Show, stream: TextIO | None = None) -> Iterator[Show]:
    """A function to call with every status: nothing, the caller's own, or what suits the place of output."""
    stream = stream or sys.stderr
    if callable(progress):
        yield progress
    elif not progress:
        yield lambda status: None
    elif _in_notebook():
        yield _notebook()
    elif stream.isatty():
        with _terminal(stream) as show:
            yield show
    else:
        yield Lines(stream)


class Lines:
    """Plain lines for logs: at every change of state, and otherwise at intervals."""

    def __init__(self, stream: TextIO, clock: Callable[[], float] = time.monotonic) -> None:
        self.stream = stream
        self.clock = clock
        self.last: tuple[str, int, float] | None = None

    def __call__(self, status: SweepStatus) -> None:
        now = self.clock()
        if self.last is not None:
            state, commit, at = self.last
            if status.state == state and (status.commit == commit or now - at < INTERVAL):
                return
        self.last = status.state, status.commit, now
        print(f"{short(status.key)}  {sentence(status)}", file=self.stream, flush=True)


@contextmanager
def _terminal(stream: TextIO) -> Iterator[Show]:
    from rich.console import Console
    from rich.live import Live
    from rich.text import Text

    def line(status: SweepStatus) -> Text:
        parts = zip(bricks(status), (SETTLED, SAMPLED, OPEN), strict=True)
        drawn = Text.assemble(short(status.key), "  ", *parts, "  ", sentence(status))
        drawn.no_wrap, drawn.overflow = True, "ellipsis"
        return drawn

    with Live(console=Console(file=stream), refresh_per_second=4) as live:
        yield lambda status: live.update(line(status))


def _in_notebook() -> bool:
    """Whether output goes to a notebook: its kernel has loaded IPython already and runs a shell of this kind."""
    ipython = sys.modules.get("IPython")
    return ipython is not None and type(ipython.get_ipython()).__name__ == "ZMQInteractiveShell"


def _notebook() -> Show:
    from IPython import display  # type: ignore[import-not-found,unused-ignore]

    handle: Any = display.display(display.HTML(""), display_id=True)
    return lambda status: handle.update(display.HTML(fragment(status)))


def fragment(status: SweepStatus) -> str:
    """The line as HTML."""
    parts = zip(bricks(status), (SETTLED, SAMPLED, OPEN), strict=True)
    drawn = "".join(f'<span style="color:{color}">{text}</span>' for text, color in parts)
    return f"<div><code>{short(status.key)}</code> <code>{drawn}</code> {escape(sentence(status))}</div>"
