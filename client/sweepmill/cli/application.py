"""All commands, in the order of the help."""

from importlib.metadata import version
from typing import Annotated

import typer

from sweepmill.cli.check import check
from sweepmill.cli.cost import cost
from sweepmill.cli.demo import demo
from sweepmill.cli.dispatch import dispatch
from sweepmill.cli.fit import fit
from sweepmill.cli.folds import folds
from sweepmill.cli.histogram import histogram
from sweepmill.cli.listing import list_sweeps
from sweepmill.cli.pool import pool
from sweepmill.cli.replay import replay
from sweepmill.cli.reproduce import reproduce
from sweepmill.cli.rounds import rounds
from sweepmill.cli.serve import serve
from sweepmill.cli.steady import steady
from sweepmill.cli.submit import submit
from sweepmill.cli.table import table
from sweepmill.cli.values import values
from sweepmill.cli.watch import watch
from sweepmill.cli.withdraw import withdraw

app = typer.Typer(add_completion=False, no_args_is_help=True, rich_markup_mode=None, pretty_exceptions_enable=False)


def _print_version(wanted: bool) -> None:
    if wanted:
        print(f"sweepmill {version('sweepmill')}")
        raise typer.Exit


@app.callback()
def _options(
    shown: Annotated[
        bool, typer.Option("--version", callback=_print_version, is_eager=True, help="Print the version.")
    ] = False,
) -> None:
    """Ensemble averages over monitored quantum circuits, sampled once.

    Exit codes: 0 done, 1 failed (an invalid specification and a stuck sweep included), 2 misuse of the command line.
    SWEEPMILL_URL and SWEEPMILL_TOKEN say where the service is and who asks; --url overrides the first.
    """


app.command()(check)
app.command()(submit)
app.command("list")(list_sweeps)
app.command()(watch)
app.command()(rounds)
app.command()(table)
app.command()(folds)
app.command()(values)
app.command()(histogram)
app.command()(fit)
app.command()(steady)
app.command()(cost)
app.command()(withdraw)
app.command()(replay)
app.command()(pool)
app.command()(demo)
app.command()(reproduce)
app.command()(serve)
app.command()(dispatch)
