"""Compile all kernels once, so that other processes only load them from the cache.

A cache entry written by several processes at once can crash them, so each compiled entry point belongs to one job, a
job runs in one process, and a file lock lets one command compile while others wait.  Jobs run side by side.

    python -m sweepmill_worker.warm [--sites-up-to N]
"""

import argparse
import os
import subprocess
import sys
import time
from collections.abc import Callable, Mapping
from contextlib import nullcontext
from pathlib import Path
from typing import Final

from filelock import FileLock
from llvmlite.binding import get_host_cpu_name  # type: ignore[import-untyped]

from sweepmill_worker.clifford.engine import MAX_SITES, HybridChain, run
from sweepmill_worker.clusters.engine import ClusterChain, run_clusters
from sweepmill_worker.jit import cache_directory
from sweepmill_worker.program.compile import compile_program
from sweepmill_worker.program.listing import operations
from sweepmill_worker.program.run import run_program
from sweepmill_worker.words import GATE, words

SIZES: Final = (2, 66, 130, 258)
"""One chain for each width of vectors: a kernel is compiled once for all sizes that share a width."""


def _sizes(sites_up_to: int) -> list[int]:
    return [sites for sites in SIZES if sites <= max(2 * sites_up_to, 2)]  # a mixed state has twice the rows


def _chains(sites_up_to: int) -> None:
    for sites in _sizes(sites_up_to):
        chain = HybridChain(sites, layers=1, periodic=True, mixed=False, threshold=2**31)
        run(chain, (0, 0), first=0, count=1, read_layers=[1], regions=[(0,)])


def _programs(sites_up_to: int) -> None:
    for sites in _sizes(sites_up_to):
        form = {"sites": sites, "layers": 1, "repeat": [[{"measure": "Z", "on": "sites"}]]}
        program = compile_program(form)
        run_program(program, (0, 0), first=0, count=1, read_layers=[1], regions=[(0,)])
        list(operations(program, (0, 0), 0))


def _clusters(_: int) -> None:
    run_clusters(ClusterChain(2, 1, False, 2**31, 2**31), (0, 0), first=0, count=1, read_layers=[1], regions=[(0,)])


JOBS: Final[Mapping[str, Callable[[int], None]]] = {"chains": _chains, "programs": _programs, "clusters": _clusters}
"""What has entry points of its own; each takes the largest number of sites."""


def warm(sites_up_to: int = MAX_SITES) -> float:
    """Load all kernels of systems up to a size into this process; the seconds it took.

    Several processes load side by side if a :func:`compile_all` has ended before, else one after the other.
    """
    begin = time.monotonic()
    with nullcontext() if _all_compiled(sites_up_to) else _lock():
        for job in JOBS.values():
            job(sites_up_to)
    return time.monotonic() - begin


def compile_all(sites_up_to: int = MAX_SITES) -> float:
    """Compile what the cache lacks, each job in a process of its own; the seconds it took. Raises RuntimeError."""
    begin = time.monotonic()
    with _lock():
        words((0, 0), GATE, 1, 0, 1)  # common to all jobs, so it must be there before they start
        running = [subprocess.Popen(_command(job, sites_up_to), env=os.environ) for job in JOBS]  # noqa: S603
        codes = [process.wait() for process in running]
        if any(codes):
            raise RuntimeError("a kernel could not be compiled; its message stands above")
        _note(sites_up_to)
    return time.monotonic() - begin


def _command(job: str, sites_up_to: int) -> list[str]:
    return [sys.executable, "-m", "sweepmill_worker.warm", "--job", job, "--sites-up-to", str(sites_up_to)]


def _mark() -> Path:
    """Says how many widths are compiled for this kind of processor: a shared cache serves several kinds."""
    return cache_directory() / f"compiled-{get_host_cpu_name()}"


def _all_compiled(sites_up_to: int) -> bool:
    try:
        return int(_mark().read_text()) >= len(_sizes(sites_up_to))
    except (OSError, ValueError):
        return False


def _note(sites_up_to: int) -> None:
    if not _all_compiled(sites_up_to):
        _mark().write_text(str(len(_sizes(sites_up_to))))


def _lock() -> FileLock:
    directory = cache_directory()
    directory.mkdir(parents=True, exist_ok=True)
    return FileLock(directory / "warm.lock")


def main() -> None:
    """Command line."""
    parser = argparse.ArgumentParser(description="Compile the kernels into the cache.")
    parser.add_argument("--sites-up-to", type=int, default=MAX_SITES, metavar="N")
    parser.add_argument("--job", choices=JOBS, help=argparse.SUPPRESS)
    given = parser.parse_args()
    if given.job:
        JOBS[given.job](given.sites_up_to)
        return
    print(f"kernels ready in {compile_all(given.sites_up_to):.1f} s: {cache_directory()}")


if __name__ == "__main__":
    main()
