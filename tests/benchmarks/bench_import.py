"""Time to import the client, against a bare interpreter and against its dependencies alone.

Run `python tests/benchmarks/bench_import.py`: medians of whole processes, in seconds, and ratios. The order of the
statements alternates, so that a machine that slows down slows all of them.
"""

import json
import statistics
import subprocess
import sys
import time

STATEMENTS = {
    "bare": "pass",
    "dependencies": "import httpx, numpy, pydantic, rfc8785",
    "client": "import sweepmill",
    "command line": "import sweepmill.cli",
}
RUNS = 15


def seconds(statement: str) -> float:
    """Wall-clock time of one interpreter, in seconds."""
    started = time.perf_counter()
    subprocess.run([sys.executable, "-c", statement], check=True)
    return time.perf_counter() - started


def main() -> None:
    """Print the results as JSON."""
    times: dict[str, list[float]] = {name: [] for name in STATEMENTS}
    for _ in range(RUNS + 1):
        for name, statement in STATEMENTS.items():
            times[name].append(seconds(statement))
    medians = {name: statistics.median(runs[1:]) for name, runs in times.items()}  # the first run fills the disk cache
    ratios = {f"client / {name}": medians["client"] / medians[name] for name in ("bare", "dependencies")}
    print(json.dumps({"median_seconds": medians, "ratios": ratios, "runs": RUNS}, indent=2))


if __name__ == "__main__":
    main()
