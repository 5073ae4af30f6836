"""sweepmill dispatch"""

import typer

from sweepmill.cli.settings import Database, Scheduler, Workers, settings_from
from sweepmill.extras import needing


def dispatch(database: Database = None, workers: Workers = None, scheduler: Scheduler = None) -> None:
    """Run a dispatcher and its pool without a service.

    It works beside services started with --no-dispatch, on the same database. On Postgres a second dispatcher
    waits until the first one ends. One line is printed when the pool is ready. Needs the extra `server`.

    Example: sweepmill dispatch --database postgresql+psycopg:///sweepmill --workers 8
    """
    settings = settings_from(database=database, workers=workers, scheduler=scheduler)
    with needing("sweepmill dispatch", "server"):
        from sweepmill_service import serve as service
    raise typer.Exit(service.dispatch(settings))
