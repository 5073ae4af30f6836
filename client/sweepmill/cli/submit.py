"""sweepmill submit"""

import sys
from typing import Annotated, Any

import typer

from sweepmill.cli.options import Owner, Specification, Url
from sweepmill.cli.watch import wait_for
from sweepmill.client import Client
from sweepmill.messages import Submitted
from sweepmill.sweep import Sweep
from sweepmill.text import count, short


def submit(
    file: Specification,
    watch: Annotated[bool, typer.Option("--watch", help="Wait until the sweep settles.")] = False,
    label: Annotated[str | None, typer.Option(help="A label for your request.")] = None,
    priority: Annotated[int | None, typer.Option(min=-10, max=10, help="Higher is sampled earlier.")] = None,
    url: Url = None,
    owner: Owner = None,
) -> None:
    """Submit a sweep, or join it if it is there already.

    Prints the key on standard output and everything else on standard error. An invalid specification is refused
    as a whole, its faults one per line, and the exit code is 1.

    Example: sweepmill submit transition.toml --watch
    """
    changes: dict[str, Any] = {"label": label, "priority": priority}
    sweep = Sweep.read(file).model_copy(update={k: v for k, v in changes.items() if v is not None})
    with Client(url, owner=owner) as client:
        remote = client.submit(sweep)
        print(remote.key, flush=True)
        if remote.submitted is not None:
            print(_found(remote.submitted), file=sys.stderr)
        if watch:
            wait_for(remote)


def _found(answer: Submitted) -> str:
    status = answer.status
    sampled = f"{count(answer.sampled_trajectories)} of {count(status.trajectories_cap)} trajectories"
    return (
        f"{'new' if answer.created else 'there already'}, {count(status.ensembles)} ensembles, {sampled} sampled "
        f"before; to watch it: sweepmill watch {short(answer.key)}"
    )
