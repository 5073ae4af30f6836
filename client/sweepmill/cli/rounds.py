"""sweepmill rounds"""

from typing import Annotated

import typer

from sweepmill.cli.options import Key, Url
from sweepmill.client import Client
from sweepmill.messages import Round
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
    print(aligned(HEADERS, [_row(one) for one in found]))
    for one in found if places else ():
        rows = [
            [*(names.get(place.ordinal, {}).get(axis) for axis in axes), place.judged, place.target]
            for place in one.places
        ]
        print(f"\nround {one.number}\n" + aligned((*axes, "trajectories", "next round"), rows))


def _row(one: Round) -> list[str]:
    answers = "; ".join(answer_text(answer, with_round=False) for answer in one.answers)
    reasons = "; ".join(dict.fromkeys(answer.reason for answer in one.answers if answer.reason))
    used = sum(place.judged > 0 for place in one.places)
    decided = f"settled{f': {reasons}' if reasons else ''}" if one.settled else reasons
    return [str(one.number), count(used), count(one.trajectories), duration(one.core_seconds), answers, decided]
