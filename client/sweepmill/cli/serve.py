"""sweepmill serve"""

from typing import Annotated

import typer

from sweepmill.cli.settings import Database, Scheduler, Workers, settings_from
from sweepmill.extras import needing


def serve(
    host: Annotated[str | None, typer.Option(help="Address to listen on.")] = None,
    port: Annotated[int | None, typer.Option(min=0, max=65535, help="0 picks a free port.")] = None,
    database: Database = None,
    workers: Workers = None,
    scheduler: Scheduler = None,
    no_dispatch: Annotated[
        bool, typer.Option("--no-dispatch", help="Answer requests only; another process dispatches.")
    ] = False,
    show_settings: Annotated[
        bool, typer.Option("--show-settings", help="Print the settings, secrets masked, and stop.")
    ] = False,
) -> None:
    """Run the service with its dispatcher and local pool.

    Options come before SWEEPMILL_* variables, these before the file that SWEEPMILL_SETTINGS names. One line with
    the address is printed when the service is ready. Needs the extra `server`.

    Example: sweepmill serve --port 8765 --workers 4
    """
    settings = settings_from(
        host=host,
        port=port,
        database=database,
        workers=workers,
        scheduler=scheduler,
        dispatch=False if no_dispatch else None,
    )
    with needing("sweepmill serve", "server"):
        from sweepmill_service import serve as service
    if show_settings:
        print(service.show_settings(settings))
        return
    raise typer.Exit(service.serve(settings))
