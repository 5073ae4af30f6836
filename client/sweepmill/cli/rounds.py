"""sweepmill rounds"""

from typing import Annotated

import typer

from sweepmill.cli.options import Key, Url
from sweepmill.client import Client
from sweepmill.messages import Answer, Round
from sweepmill.progress import answer_text
from sweepmill.text import aligned, count, duration

HEADERS = ("round", "ensembles", "trajectories", "core time", "found", "decided")


def rounds(
    key: Key,
    places: Annotated[bool, typer.Option("--places", help="List what every ensemble had and was given.")] = False,
    url: Url = None,
) -> None:
    """Show how the goal of a sweep was approached.

    Each round with what it found, what it had, and what was decided.

    Example: sweepmill rounds 3b9f6c1e
    """
    with Client(url) as client:
        sweep = client.sweep(key)
        found = sweep.rounds()
        axes = sweep.status().axes
        names = {one.ordinal: one.parameters for one in sweep.ensembles()} if places else {}
    if not found:
        print("no round was judged yet, or the sweep has no goal")
        return
    print(aligned(HEADERS, [row for one in found for row in _rows(one)]))
    for one in found if places else ():
        rows = [
            [*(names.get(place.ordinal, {}).get(axis) for axis in axes), place.judged, place.target]
            for place in one.places
        ]
        print(f"\nround {one.number}\n" + aligned((*axes, "trajectories", "next round"), rows))


def _rows(one: Round) -> list[list[str]]:
    """A line for each answer, the numbers of the round on the first."""
    used = sum(place.judged > 0 for place in one.places)
    numbers = [str(one.number), count(used), count(one.trajectories), duration(one.core_seconds)]
    lines = [[answer_text(answer, with_round=False), _decided(one, answer)] for answer in one.answers]
    return [[*(numbers if index == 0 else [""] * len(numbers)), *line] for index, line in enumerate(lines)]


def _decided(one: Round, answer: Answer) -> str:
    return ": ".join(part for part in ("settled" if one.settled else "", answer.reason or "") if part)
