"""sweepmill list"""

from datetime import UTC, datetime
from itertools import islice
from typing import Annotated, Any

import typer

from sweepmill.cli.options import Url
from sweepmill.client import Client
from sweepmill.messages import SweepState, SweepStatus
from sweepmill.text import aligned, count, short

HEADERS = ("sweep", "state", "settled", "trajectories", "axes", "requested by", "label", "since")


def list_sweeps(
    owner: Annotated[str | None, typer.Option(metavar="NAME", help="Only sweeps this owner requests.")] = None,
    state: Annotated[SweepState | None, typer.Option(help="Only sweeps in this state.")] = None,
    family: Annotated[str | None, typer.Option(help="Only sweeps with circuits of this family.")] = None,
    limit: Annotated[int, typer.Option(min=1, help="At most so many, newest first.")] = 50,
    url: Url = None,
) -> None:
    """List the sweeps of a service, newest first.

    Example: sweepmill list --state sampling
    """
    with Client(url) as client:
        found = client.sweeps(owner, state, family, page=min(limit, 500))
        rows = [_row(status) for status in islice(found, limit)]
    print(aligned(HEADERS, rows) if rows else "no sweeps")


def _row(status: SweepStatus) -> list[Any]:
    labels = dict.fromkeys(request.label for request in status.requests if request.label)
    owners = dict.fromkeys(request.owner for request in status.requests)
    since = datetime.fromtimestamp(status.created_at, UTC).astimezone()
    return [
        short(status.key),
        status.state,
        f"{count(status.settled)} of {count(status.ensembles)}",
        count(status.trajectories),
        " × ".join(status.axes),
        ", ".join(owners),
        ", ".join(labels),
        f"{since:%Y-%m-%d %H:%M}",
    ]
