"""Compile all kernels once, in one process, so that other processes only load them from the cache.

A cache written by several processes at once can crash them: a file lock lets one compile and the others wait.

    python -m sweepmill_worker.warm [--sites-up-to N]
"""

import argparse
import time
from typing import Final

from filelock import FileLock

from sweepmill_worker.clifford.engine import MAX_SITES, HybridChain, run
from sweepmill_worker.jit import cache_directory

SIZES: Final = (2, 66, 130, 258)
"""One chain for each width of vectors: a kernel is compiled once for all sizes that share a width."""


def warm(sites_up_to: int = MAX_SITES) -> float:
    """Compile, or load, the kernels of chains up to a size, mixed ones included; the seconds it took."""
    begin = time.monotonic()
    directory = cache_directory()
    directory.mkdir(parents=True, exist_ok=True)
    with FileLock(directory / "warm.lock"):
        for sites in SIZES:
            if sites <= max(2 * sites_up_to, 2):  # a mixed chain has twice the rows
                chain = HybridChain(sites, layers=1, periodic=True, mixed=False, threshold=2**31)
                run(chain, (0, 0), first=0, count=1, read_layers=[1], regions=[(0,)])
    return time.monotonic() - begin


def main() -> None:
    """Command line."""
    parser = argparse.ArgumentParser(description="Compile the kernels into the cache.")
    parser.add_argument("--sites-up-to", type=int, default=MAX_SITES, metavar="N")
    print(f"kernels ready in {warm(parser.parse_args().sites_up_to):.1f} s: {cache_directory()}")


if __name__ == "__main__":
    main()
