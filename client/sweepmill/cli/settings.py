"""The service's settings from the command line, and the options that `serve` and `dispatch` share."""

from __future__ import annotations

from typing import TYPE_CHECKING, Annotated, Any

import typer

from sweepmill.errors import SweepmillError
from sweepmill.extras import needing

if TYPE_CHECKING:
    from sweepmill_service.settings import Settings

Database = Annotated[str | None, typer.Option(metavar="URL", help="Database, as SQLAlchemy writes it.")]
Workers = Annotated[int | None, typer.Option(min=1, help="Local worker processes.")]
Scheduler = Annotated[str | None, typer.Option(metavar="URL", help="An external Dask scheduler instead.")]


def settings_from(**options: Any) -> Settings:
    """Settings with the options that are not None on top. Raises SweepmillError with every fault, MissingExtra."""
    with needing("running a service", "server"):
        from sweepmill_service.settings import SettingsError, load_settings
    try:
        return load_settings(**options)
    except SettingsError as error:
        raise SweepmillError(str(error)) from error
