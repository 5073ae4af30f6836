"""The compilation policy of all kernels: one decorator for entry points, one for their parts, one cache directory."""

import hashlib
import os
from collections.abc import Callable
from importlib.metadata import PackageNotFoundError, version
from pathlib import Path
from typing import Any, TypeVar

import numba
from numba.core import config as numba_config
from platformdirs import user_cache_path

from sweepmill_worker.parts import PartCompiler

F = TypeVar("F", bound=Callable[..., Any])

KERNEL_FOLDERS = ("clifford", "clusters", "program")
"""Packages whose files hold compiled code."""


def kernel_sources() -> list[Path]:
    """All files that compiled code is made from."""
    package = Path(__file__).parent
    folders = [path for name in KERNEL_FOLDERS for path in sorted((package / name).glob("*.py"))]
    return [package / "jit.py", package / "parts.py", package / "words.py", *folders]


def _sources_digest() -> str:
    """numba notices a change of an entry point's own file only, not of the parts it calls: hash all kernel files."""
    digest = hashlib.sha256()
    for path in kernel_sources():
        digest.update(path.read_bytes())
    return digest.hexdigest()[:12]


def cache_directory() -> Path:
    """Where compiled kernels are kept: NUMBA_CACHE_DIR if set, else per user, version and kernel sources."""
    chosen = os.environ.get("NUMBA_CACHE_DIR")
    if chosen:
        return Path(chosen)
    try:
        release = version("sweepmill")
    except PackageNotFoundError:
        release = "source"
    return user_cache_path("sweepmill") / "kernels" / f"{release}-{_sources_digest()}"


numba_config.CACHE_DIR = str(cache_directory())


# No reference counts (an atomic operation per array and call): kernels borrow every array and allocate none.  No
# wrappers where nobody calls from Python or C: making them took 40 % of the time to compile.
_OPTIONS = {"nogil": True, "error_model": "numpy", "_nrt": False, "no_cfunc_wrapper": True}
_INNER = {**_OPTIONS, "no_cpython_wrapper": True, "pipeline_class": PartCompiler}


def entry(function: F) -> F:
    """Compile a function called from Python: cached on disk, runs without the GIL, allocates nothing."""
    compiled: F = numba.njit(cache=True, **_OPTIONS)(function)
    return compiled


def part(function: F) -> F:
    """Compile a function called from kernels only: always inlined, so that vectors stay in registers."""
    compiled: F = numba.njit(forceinline=True, **_INNER)(function)
    return compiled


def step(function: F) -> F:
    """Compile a function called from kernels only, large or rare enough to stay a call of its own."""
    compiled: F = numba.njit(**_INNER)(function)
    return compiled
