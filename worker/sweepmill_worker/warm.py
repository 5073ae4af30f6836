"""Compile kernels once, so that other processes only load them from the cache.

A cache entry written by several processes at once can crash them.  So each compiled entry point belongs to one job,
and a job's entries are compiled under a file lock.  Different jobs compile side by side.

    python -m sweepmill_worker.warm [--sites-up-to N]
"""

import argparse
import hashlib
import os
import subprocess
import sys
import time
from collections.abc import Callable, Iterable, Mapping
from contextlib import AbstractContextManager, nullcontext
from functools import cache
from pathlib import Path
from typing import Final

from filelock import FileLock
from llvmlite.binding import get_host_cpu_name  # type: ignore[import-untyped]

from sweepmill_worker.clifford.engine import MAX_SITES, HybridChain, run
from sweepmill_worker.clusters.engine import ClusterChain, run_clusters
from sweepmill_worker.jit import cache_directory, kernel_sources
from sweepmill_worker.program.compile import compile_program
from sweepmill_worker.program.listing import operations
from sweepmill_worker.program.run import run_program
from sweepmill_worker.words import GATE, words

SIZES: Final = (2, 66, 130, 258)
"""One chain for each width of vectors: a kernel is compiled once for all sizes that share a width."""


def widths(sites_up_to: int) -> int:
    """How many widths systems up to a size need: a mixed state has twice the rows."""
    return sum(sites <= max(2 * sites_up_to, 2) for sites in SIZES)


def _chain(sites: int) -> None:
    chain = HybridChain(sites, layers=1, periodic=True, mixed=False, threshold=2**31)
    run(chain, (0, 0), first=0, count=1, read_layers=[1], regions=[(0,)])


def _program(sites: int) -> None:
    program = compile_program({"sites": sites, "layers": 1, "repeat": [[{"measure": "Z", "on": "sites"}]]})
    run_program(program, (0, 0), first=0, count=1, read_layers=[1], regions=[(0,)])
    list(operations(program, (0, 0), 0))


def _clusters(sites: int) -> None:
    chain = ClusterChain(sites, 1, False, 2**31, 2**31)
    run_clusters(chain, (0, 0), first=0, count=1, read_layers=[1], regions=[(0,)])


def _words(_: int) -> None:
    words((0, 0), GATE, 1, 0, 1)


COMMON: Final = "words"
"""The job whose entry points the others call: compiled before them."""
JOBS: Final[Mapping[str, Callable[[int], None]]] = {
    COMMON: _words,
    "chains": _chain,
    "programs": _program,
    "clusters": _clusters,
}
"""What has entry points of its own; each runs a system of so many sites."""


def load(job: str, sites_up_to: int) -> None:
    """Load the kernels of a job into this process, compiling those that are missing."""
    _load(job, widths(sites_up_to))


@cache
def _load(job: str, number: int) -> None:
    with _turn(job, number):
        for sites in SIZES[:number]:
            JOBS[job](sites)
        _note(job, number)


def warm(sites_up_to: int = MAX_SITES, jobs: Iterable[str] = JOBS) -> float:
    """:func:`load` the kernels of these jobs and the common ones; the seconds it took."""
    begin = time.monotonic()
    for job in dict.fromkeys([COMMON, *jobs]):
        load(job, sites_up_to)
    return time.monotonic() - begin


def all_compiled(sites_up_to: int = MAX_SITES, jobs: Iterable[str] = JOBS) -> bool:
    """Whether :func:`warm` would find everything in the cache."""
    return all(_compiled(job) >= widths(sites_up_to) for job in (COMMON, *jobs))


def compile_ahead(sites_up_to: int = MAX_SITES, jobs: Iterable[str] = JOBS) -> float:
    """Compile what the cache lacks, each job in a process of its own; the seconds it took. Raises RuntimeError."""
    begin = time.monotonic()
    load(COMMON, sites_up_to)
    missing = [job for job in jobs if _compiled(job) < widths(sites_up_to)]
    running = [subprocess.Popen(_command(job, sites_up_to), env=os.environ) for job in missing]  # noqa: S603
    codes = [process.wait() for process in running]
    if any(codes):
        raise RuntimeError("a kernel could not be compiled; its message stands above")
    return time.monotonic() - begin


def _command(job: str, sites_up_to: int) -> list[str]:
    return [sys.executable, "-m", "sweepmill_worker.warm", "--job", job, "--sites-up-to", str(sites_up_to)]


def _turn(job: str, number: int) -> AbstractContextManager[object]:
    """Nobody waits for a lock to load what is there."""
    if _compiled(job) >= number:
        return nullcontext()
    cache_directory().mkdir(parents=True, exist_ok=True)
    return FileLock(cache_directory() / f"{job}.lock")


@cache
def _mark(job: str) -> Path:
    """Says how many widths are compiled, of these very files, for this kind of processor.

    numba takes a cached kernel only for the path and the time of change of the file it was compiled from.
    """
    files = "".join(f"{path}{path.stat().st_mtime_ns}" for path in kernel_sources())
    return cache_directory() / f"{job}-{get_host_cpu_name()}-{hashlib.sha256(files.encode()).hexdigest()[:12]}"


def _compiled(job: str) -> int:
    try:
        return int(_mark(job).read_text())
    except (OSError, ValueError):
        return 0


def _note(job: str, number: int) -> None:
    if _compiled(job) < number:
        _mark(job).write_text(str(number))


def main() -> None:
    """Command line."""
    parser = argparse.ArgumentParser(description="Compile the kernels into the cache.")
    parser.add_argument("--sites-up-to", type=int, default=MAX_SITES, metavar="N")
    parser.add_argument("--job", choices=JOBS, help="the kernels of this engine only")
    given = parser.parse_args()
    if given.job:
        warm(given.sites_up_to, [given.job])
        return
    print(f"kernels ready in {compile_ahead(given.sites_up_to):.1f} s: {cache_directory()}")


if __name__ == "__main__":
    main()
