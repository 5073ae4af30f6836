"""The command line: one command a file."""

import sys

from sweepmill.cli.application import app
from sweepmill.errors import SpecificationError, SweepmillError


def main() -> None:
    """Run a command. Exit codes: 0 done, 1 failed, 2 misuse of the command line."""
    try:
        app(prog_name="sweepmill")
    except SpecificationError as error:
        print(error, file=sys.stderr)  # one fault a line, as `path: message`
        sys.exit(1)
    except (SweepmillError, OSError) as error:
        print(f"sweepmill: {error}", file=sys.stderr)
        sys.exit(1)
