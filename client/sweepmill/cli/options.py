"""Arguments and options that several commands share."""

from pathlib import Path
from typing import Annotated

import typer

Specification = Annotated[
    Path, typer.Argument(metavar="FILE", exists=True, dir_okay=False, readable=True, help="A .toml or .json file.")
]
Key = Annotated[str, typer.Argument(metavar="KEY", help="Key of the sweep, or at least 8 of its first digits.")]
Url = Annotated[str | None, typer.Option(metavar="URL", help="Address of the service, in place of SWEEPMILL_URL.")]
Owner = Annotated[str | None, typer.Option(metavar="NAME", help="Whose request this is, in place of SWEEPMILL_OWNER.")]
