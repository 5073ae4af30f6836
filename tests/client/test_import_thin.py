"""What importing the client brings onto a laptop."""

import subprocess
import sys
from types import ModuleType

import sweepmill

SERVER = {"alembic", "dask", "distributed", "fastapi", "numba", "sqlalchemy", "starlette", "stim", "uvicorn"}
ANALYSIS = {"matplotlib", "pandas", "pyarrow", "scipy", "xarray"}
OURS = {"sweepmill_worker", "sweepmill_service"}


def brought_by(module: str) -> set[str]:
    """Top-level packages that importing a module loads, beyond those its four thin dependencies load.

    Where rich happens to be installed together with httpx's own command line, httpx loads it by itself.
    """
    loaded = "{name.partition('.')[0] for name in sys.modules}"
    script = (
        f"import sys, httpx, numpy, pydantic, rfc8785; before = {loaded}; import {module}; print(*{loaded} - before)"
    )
    done = subprocess.run([sys.executable, "-c", script], capture_output=True, text=True, check=True)
    return set(done.stdout.split())


def test_the_import_brings_no_heavy_package() -> None:
    brought = brought_by("sweepmill")
    assert "sweepmill" in brought
    assert not (SERVER | ANALYSIS | OURS | {"rich", "typer"}) & brought


def test_the_command_line_brings_neither_server_nor_analysis() -> None:
    brought = brought_by("sweepmill.cli")
    assert "typer" in brought
    assert not (SERVER | ANALYSIS | OURS) & brought


def test_all_is_the_sorted_list_of_public_names() -> None:
    names = vars(sweepmill).items()
    public = [name for name, value in names if not name.startswith("_") and not isinstance(value, ModuleType)]
    assert sweepmill.__all__ == sorted(public)
