"""Make docs/walkthrough.md from docs/walkthrough.in.md: run its commands and its Python, and write down what came out.

    python docs/make_walkthrough.py [DIRECTORY]

DIRECTORY keeps the database, so that a second run samples nothing. Fenced blocks of the source are

    console run       lines beginning with "$ " are run; their output follows (lines=N: the first N of them)
    python run        run in one namespace for the page; what is printed follows
    toml write=FILE   written to FILE where the commands run
    toml include      the named file of the repository

and {ring}, {law} … in it are short keys: of the sweep in the file of that name once it is there.
"""

import contextlib
import io
import os
import re
import shlex
import shutil
import subprocess
import sys
import tempfile
from collections.abc import Iterator
from pathlib import Path
from typing import Any

from sweepmill import Client, Sweep
from sweepmill.demo import EXAMPLE, service
from sweepmill.text import short

HERE = Path(__file__).parent
BLOCK = re.compile(r"^```(?P<head>\w+ [^\n]+)\n(?P<body>.*?)^```\n", re.MULTILINE | re.DOTALL)
SETTINGS = {"SWEEPMILL_KERNELS": '["chains"]', "COLUMNS": "120"}


class Page:
    """The page as far as it has been made, in a directory of its own, against one service."""

    def __init__(self, directory: Path) -> None:
        self.directory = directory
        self.names: dict[str, Any] = {}

    def made(self, source: str) -> str:
        """The page."""
        return BLOCK.sub(lambda found: self._block(found["head"].split(), found["body"]), source)

    def _block(self, head: list[str], body: str) -> str:
        language, what, *options = head
        if what == "include":
            return _fenced(language, (HERE.parent / body.strip()).read_text())
        if what.startswith("write="):
            body = body.format()
            (self.directory / what.removeprefix("write=")).write_text(body)
            return _fenced(language, body)
        if language == "console":
            return _fenced(language, "\n".join(self._ran(line, options) for line in body.splitlines()) + "\n")
        body = body.format(**self._keys())
        return _fenced(language, body) + "\n" + _fenced("text", self._executed(body))

    def _keys(self) -> dict[str, str]:
        """Short keys of the sweeps in the files that are there by now, and of the first ensemble of the example."""
        files = [*self.directory.glob("*.toml"), *self.directory.glob("*.json")]
        sweeps = {path.stem: Sweep.read(path) for path in files}
        ring = Sweep.read(EXAMPLE)
        first = {"ring": short(ring.key), "ensemble": short(ring.points[0].ensemble.key)}
        return first | {stem: short(sweep.key) for stem, sweep in sweeps.items()}

    def _ran(self, line: str, options: list[str]) -> str:
        line = line.format(**self._keys())
        command = shlex.split(line.removeprefix("$ "))
        arguments = [sys.executable, "-m", *command]
        done = subprocess.run(arguments, cwd=self.directory, capture_output=True, text=True, check=False)  # noqa: S603
        if done.returncode:
            raise SystemExit(f"{line}\n{done.stdout}{done.stderr}")
        shown = (done.stderr + done.stdout).rstrip().splitlines()
        most = next((int(one.removeprefix("lines=")) for one in options if one.startswith("lines=")), len(shown))
        shown = shown[:most] + ["…"] * (len(shown) > most)
        return "\n".join([line] if "quiet" in options else [line, *shown])

    def _executed(self, body: str) -> str:
        printed = io.StringIO()
        with contextlib.redirect_stdout(printed), contextlib.chdir(self.directory):
            exec(compile(body, "walkthrough", "exec"), self.names)  # noqa: S102
        return _wrapped(printed.getvalue())


def _wrapped(text: str, width: int = 120) -> str:
    """Long lines broken between words; tables, which are shorter, stay as they are."""
    lines = []
    for line in text.splitlines():
        while len(line) > width:
            cut = line.rfind(" ", 0, width)
            lines.append(line[:cut])
            line = line[cut + 1 :]
        lines.append(line)
    return "\n".join(lines) + "\n"


def _fenced(language: str, text: str) -> str:
    return f"```{language}\n{text.strip(chr(10))}\n```\n"


@contextlib.contextmanager
def _directory(given: list[str]) -> Iterator[Path]:
    if given:
        Path(given[0]).mkdir(parents=True, exist_ok=True)
        yield Path(given[0]).resolve()
        return
    with tempfile.TemporaryDirectory() as made:
        yield Path(made)


def main() -> None:
    """Write docs/walkthrough.md and its figures."""
    with _directory(sys.argv[1:]) as directory:
        shutil.copy(EXAMPLE, directory)
        (directory / "figures").mkdir(exist_ok=True)
        with service(f"sqlite:///{directory / 'walkthrough.sqlite'}", SETTINGS) as url, Client(url):
            os.environ |= {"SWEEPMILL_URL": url, "SWEEPMILL_OWNER": "skerry"}
            text = Page(directory).made((HERE / "walkthrough.in.md").read_text())
        (HERE / "walkthrough.md").write_text(text)
        for figure in sorted((directory / "figures").glob("*.png")):
            shutil.copy(figure, HERE / "figures")


if __name__ == "__main__":
    main()
