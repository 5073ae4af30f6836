"""The published results that come with the package: a specification and what is known, side by side."""

from dataclasses import dataclass
from pathlib import Path
from typing import Any

from sweepmill.errors import SweepmillError
from sweepmill.published.models import Published
from sweepmill.sweep import Sweep

DIRECTORY = Path(__file__).parents[1] / "examples" / "published"


class NoSuchResult(SweepmillError):
    """No published result has this name."""


@dataclass(frozen=True)
class Entry:
    """One result: its `name`, the file of its `specification`, what is `known` of it."""

    name: str
    specification: Path
    published: Published

    def sweep(self, cap: int | None = None) -> Sweep:
        """The sweep as it stands in the file, or with this cap per ensemble and no other stopping rule."""
        if cap is None:
            return Sweep.read(self.specification)
        given = Sweep.read(self.specification)
        stop = {"trajectories": min(cap, given.stop.trajectories)}
        form = given.normalized() | {"stop": stop, "label": given.label}
        return Sweep.parse(form | {"circuit": [_without_cap(block) for block in form["circuit"]]})


def catalogue() -> list[Entry]:
    """All results, by name."""
    return [_entry(path) for path in sorted(DIRECTORY.glob("*.json"))]


def named(name: str) -> Entry:
    """The result of this name. Raises NoSuchResult."""
    path = DIRECTORY / f"{name}.json"
    if path not in DIRECTORY.glob("*.json"):
        raise NoSuchResult(f"no published result {name!r}: one of {', '.join(one.name for one in catalogue())}")
    return _entry(path)


def _entry(path: Path) -> Entry:
    known = Published.model_validate_json(path.read_bytes())
    return Entry(path.stem, path.with_suffix(".toml"), known)


def _without_cap(block: dict[str, Any]) -> dict[str, Any]:
    return {name: value for name, value in block.items() if name != "trajectories"}
