"""The display of progress, in its three places."""

import io
import sys
from types import ModuleType
from typing import Any

import pytest

from sweepmill.messages import SweepStatus
from sweepmill.progress import INTERVAL, WIDTH, Lines, bricks, fragment, sentence, shown
from sweepmill.text import count, duration


def status(state: str = "sampling", settled: int = 3, trajectories: int = 1500, **more: Any) -> SweepStatus:
    fields: dict[str, Any] = {
        "key": "3b9f6c1e" * 8,
        "state": state,
        "families": ["hybrid-clifford"],
        "axes": ["sites"],
        "names": ["entropy"],
        "requests": [],
        "ensembles": 12,
        "settled": settled,
        "trajectories": trajectories,
        "trajectories_cap": 3000,
        "core_seconds": 1.0,
        "created_at": 0.0,
        "commit": trajectories,
    }
    return SweepStatus.model_validate(fields | more)


@pytest.mark.parametrize(("settled", "trajectories"), [(0, 0), (0, 1), (3, 1500), (11, 2999), (12, 3000), (12, 700)])
def test_the_brickwork_is_as_wide_as_it_should_be_and_never_fuller_than_the_sweep(
    settled: int, trajectories: int
) -> None:
    solid, pale, dots = bricks(status(settled=settled, trajectories=trajectories))
    assert len(solid + pale + dots) == WIDTH
    assert len(solid) / WIDTH <= settled / 12
    assert (dots == "") == (settled == 12 or trajectories == 3000)


def test_the_sentence_says_state_numbers_and_time_left() -> None:
    said = sentence(status(seconds_left=200.0))
    assert said == "sampling: 3 of 12 ensembles settled, 1,500 trajectories, about 3 min 20 s left"
    assert sentence(status("stuck", reason="budget spent")).endswith("(budget spent)")
    assert "left" not in sentence(status("settled", 12, seconds_left=0.0))


@pytest.mark.parametrize(
    ("seconds", "said"),
    [(None, ""), (0.2, "under 1 s"), (42.4, "42 s"), (60, "1 min"), (3599, "59 min 59 s"), (90000, "1 d 1 h")],
)
def test_times_are_said_in_at_most_two_units(seconds: float | None, said: str) -> None:
    assert duration(seconds) == said


def test_counts_are_grouped_in_threes() -> None:
    assert [count(n) for n in (7, 1234, 10_000_000)] == ["7", "1,234", "10,000,000"]


def test_plain_lines_come_at_changes_of_state_and_at_intervals() -> None:
    out, now = io.StringIO(), 0.0
    lines = Lines(out, clock=lambda: now)
    lines(status("waiting", 0, 0))
    lines(status("sampling", 0, 10))
    lines(status("sampling", 0, 20))
    now = INTERVAL + 1
    lines(status("sampling", 0, 20, commit=10))  # nothing has changed
    lines(status("sampling", 1, 30))
    lines(status("settled", 12, 3000))
    assert [line.split()[1] for line in out.getvalue().splitlines()] == [
        "waiting:",
        "sampling:",
        "sampling:",
        "settled:",
    ]


def test_output_that_is_no_terminal_gets_plain_lines() -> None:
    out = io.StringIO()
    with shown(True, out) as show:
        show(status())
    assert out.getvalue() == f"3b9f6c1e3b9f  {sentence(status())}\n"


def test_a_terminal_gets_the_brickwork() -> None:
    class Terminal(io.StringIO):
        def isatty(self) -> bool:
            return True

    out = Terminal()
    with shown(True, out) as show:
        show(status())
        show(status("settled", 12, 3000))
    assert "▀▄▀▄" in out.getvalue()
    assert "12 of 12" in out.getvalue()


def test_a_function_of_the_caller_gets_every_status_and_false_shows_nothing() -> None:
    seen: list[SweepStatus] = []
    out = io.StringIO()
    with shown(seen.append, out) as show:
        show(status())
    with shown(False, out) as show:
        show(status())
    assert seen == [status()]
    assert out.getvalue() == ""


def test_a_notebook_gets_one_line_of_html_that_is_updated(monkeypatch: pytest.MonkeyPatch) -> None:
    """A stand-in for the notebook's own display, which is not installed here."""
    written: list[str] = []

    class ZMQInteractiveShell:
        pass

    class Handle:
        def update(self, html: str) -> None:
            written.append(html)

    display: Any = ModuleType("IPython.display")
    display.HTML = str
    display.display = lambda html, display_id: Handle()
    ipython: Any = ModuleType("IPython")
    ipython.get_ipython = ZMQInteractiveShell
    ipython.display = display
    monkeypatch.setitem(sys.modules, "IPython", ipython)
    monkeypatch.setitem(sys.modules, "IPython.display", display)
    with shown(True) as show:
        show(status())
    assert written == [fragment(status())]
    assert sentence(status()) in written[0]
