"""All commands, in the order of the help."""

from importlib.metadata import version
from typing import Annotated

import typer

from sweepmill.cli import check, demo, dispatch, listing, pool, replay, serve, submit, table, watch, withdraw

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


app.command()(check.check)
app.command()(submit.submit)
app.command("list")(listing.list_sweeps)
app.command()(watch.watch)
app.command()(table.table)
app.command()(withdraw.withdraw)
app.command()(replay.replay)
app.command()(pool.pool)
app.command()(demo.demo)
app.command()(serve.serve)
app.command()(dispatch.dispatch)
