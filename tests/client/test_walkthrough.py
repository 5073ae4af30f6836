"""The walkthrough: its specifications are valid, its commands exist, and the page is of the source it is made from."""

import re
from pathlib import Path

import pytest
from typer.main import get_command

from sweepmill import Sweep
from sweepmill.cli.application import app

DOCS = Path(__file__).parents[2] / "docs"
SOURCE, PAGE = ((DOCS / name).read_text(encoding="utf-8") for name in ("walkthrough.in.md", "walkthrough.md"))
BLOCKS = re.findall(r"^```(\w+) ([^\n]+)\n(.*?)^```\n", SOURCE, re.MULTILINE | re.DOTALL)
WRITTEN = {what.removeprefix("write="): body.format() for _, what, body in BLOCKS if what.startswith("write=")}
FIGURES = re.findall(r"!\[[^]]+\]\((figures/[^)]+)\)", SOURCE)


@pytest.mark.parametrize("name", WRITTEN)
def test_a_specification_of_the_walkthrough_is_valid_and_its_key_is_on_the_page(name: str, tmp_path: Path) -> None:
    path = tmp_path / name
    path.write_text(WRITTEN[name])
    key = Sweep.read(path).key
    used = f"{{{path.stem}}}" in SOURCE
    assert (key[:12] in PAGE) == used or name in PAGE


def test_every_command_of_the_walkthrough_exists_and_was_run() -> None:
    commands = [line.split()[2] for _, _, body in BLOCKS for line in body.splitlines() if line.startswith("$ ")]
    assert set(commands) <= set(get_command(app).commands)  # type: ignore[attr-defined]
    assert PAGE.count("\n$ sweepmill ") == len(commands)


def test_all_prose_of_the_source_is_on_the_page() -> None:
    prose = re.split(r"^```.*?^```\n", SOURCE, flags=re.MULTILINE | re.DOTALL)
    assert all(part.strip() in PAGE for part in prose)
    assert not re.search(r"^```\w+ ", PAGE, re.MULTILINE)


@pytest.mark.parametrize("name", FIGURES)
def test_a_figure_is_there_and_small(name: str) -> None:
    assert 1000 < (DOCS / name).stat().st_size < 150_000
