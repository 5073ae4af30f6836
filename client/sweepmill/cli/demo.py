"""sweepmill demo"""

from pathlib import Path
from typing import Annotated

import typer


def demo(
    directory: Annotated[Path, typer.Argument(metavar="DIRECTORY", file_okay=False, help="Where results go.")] = Path(
        "demo-output"
    ),
) -> None:
    """Run a small sweep on this machine, start to end.

    Needs the extras `server` and `analysis`.

    Example: sweepmill demo demo-output
    """
    from sweepmill.demo import run

    run(directory)
