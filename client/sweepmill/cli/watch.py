"""sweepmill watch"""

from typing import Annotated

import typer

from sweepmill.cli.options import Key, Url
from sweepmill.client import Client
from sweepmill.remote import RemoteSweep


def watch(
    key: Key,
    timeout: Annotated[float | None, typer.Option(min=0, help="Seconds to wait at most.")] = None,
    url: Url = None,
) -> None:
    """Wait until a sweep settles, and show how far it is.

    The exit code is 1 if the sweep is stuck, withdrawn, or did not settle in time. Ctrl-C ends the watching, not
    the sweep.

    Example: sweepmill watch 3b9f6c1e
    """
    with Client(url) as client:
        wait_for(client.sweep(key), timeout)


def wait_for(sweep: RemoteSweep, timeout: float | None = None) -> None:
    """Wait with a display; an interrupt, which has been explained, becomes exit code 1."""
    try:
        sweep.wait(timeout=timeout)
    except KeyboardInterrupt:
        raise typer.Exit(1) from None
