"""The main job from end to end on one machine: serve, submit, watch, table, files, figure."""

import os
import signal
import subprocess
import sys
from collections.abc import Iterator, Mapping
from contextlib import contextmanager
from pathlib import Path

from sweepmill.client import Client
from sweepmill.errors import SweepmillError
from sweepmill.extras import needing
from sweepmill.remote import RemoteSweep
from sweepmill.sweep import Sweep
from sweepmill.table import Table

EXAMPLE = Path(__file__).with_name("examples") / "skerry-ring.toml"
ENTROPY, I3 = "S-half", "I3"
LARGEST = 128  # sites of the example
READY = "Sweepmill is ready at "


class DemoFailed(SweepmillError):
    """The service of the demo did not start."""


def run(directory: Path) -> None:
    """Run the example sweep into ``directory``; what an earlier run sampled there is used, not sampled again.

    Raises DemoFailed if the service does not start, MissingExtra without the extras server and analysis.
    """
    with needing("sweepmill demo", "analysis"):
        from sweepmill.demo_figure import draw
    directory.mkdir(parents=True, exist_ok=True)
    database = f"sqlite:///{(directory / 'demo.sqlite').resolve()}"
    sweep = Sweep.read(EXAMPLE)
    print(f"Starting a service on {database} (the first start compiles the kernels) …", flush=True)
    with service(database) as url, Client(url) as client:
        print(f"The API is at {url} (description: {url}/openapi.json) while the demo runs.")
        remote = submit(client, sweep)
        remote.wait()
        table = remote.table()
        for suffix in (".parquet", ".csv"):
            print(f"Wrote {remote.download(directory / f'skerry-ring{suffix}')}")
    print(f"Wrote {draw(table.where(name=I3), directory / 'skerry-ring.png')}\n")
    print(summary(table))
    print(closing(directory, database, sweep.key))


def submit(client: Client, sweep: Sweep) -> RemoteSweep:
    """Submit over HTTP and say what was there already."""
    remote = client.submit(sweep)
    answer = remote.submitted
    assert answer is not None
    print(
        f"Submitted {EXAMPLE.name} as sweep {sweep.key[:8]}: {answer.status.ensembles} ensembles, "
        f"{answer.sampled_trajectories} of at most {answer.status.trajectories_cap} trajectories sampled already."
    )
    return remote


FEW_KERNELS = {"SWEEPMILL_LIMITS__SITES": str(LARGEST), "SWEEPMILL_KERNELS": '["chains"]'}  # few to compile


@contextmanager
def service(database: str, settings: Mapping[str, str] = FEW_KERNELS) -> Iterator[str]:
    """A service process on a free port, with these environment variables; yields its address, ends the process."""
    command = [sys.executable, "-m", "sweepmill", "serve", "--port", "0", "--database", database]
    limited = os.environ | settings
    process = subprocess.Popen(command, stdout=subprocess.PIPE, text=True, env=limited)  # noqa: S603
    try:
        yield _address(process)
    finally:
        process.send_signal(signal.SIGTERM)
        process.wait(timeout=60)


def _address(process: subprocess.Popen[str]) -> str:
    assert process.stdout is not None
    for line in process.stdout:
        if line.startswith(READY):
            return line.removeprefix(READY).strip()
    raise DemoFailed("the service ended before it was ready; its message stands above")


def summary(table: Table) -> str:
    """Sites x rate: half-chain entropy and tripartite information with standard errors, for a terminal."""
    sizes = sorted({int(row["sites"]) for row in table.rows()})
    cells = {(row["sites"], row["measurement_rate"], row["name"]): _cell(row) for row in table.rows()}
    rates = sorted({row["measurement_rate"] for row in table.rows()})
    lines = []
    for name, title in ((ENTROPY, "half-chain entropy, bits"), (I3, "tripartite information I3, bits")):
        lines.append(f"{title} (mean over the last unit cell and all translations)")
        lines.append("  rate p " + "".join(f"{f'L = {size}':>18}" for size in sizes))
        lines += [f"  {rate:<7}" + "".join(f"{cells[size, rate, name]:>18}" for size in sizes) for rate in rates]
        lines.append("")
    return "\n".join(lines)


def _cell(row: dict[str, object]) -> str:
    return f"{row['mean']:.4f} ± {row['standard_error']:.4f}"


def closing(directory: Path, database: str, key: str) -> str:
    """How to read the figure and how to go on."""
    return (
        "Below the transition I3 grows in magnitude with the ring, above it vanishes: the curves of different sizes\n"
        "cross near the critical rate. Estimates for this circuit: 0.154(4), Phys. Rev. B 101, 060301(R) (2020);\n"
        "about 0.16, Phys. Rev. B 100, 134306 (2019) (values quoted from memory).\n\n"
        "To go on:\n"
        f"  sweepmill serve --database {database}\n"
        f"  sweepmill table {key[:8]} -o {directory / 'again.csv'}   (in another terminal: the same table)\n"
        "  sweepmill check my-sweep.toml ; sweepmill submit my-sweep.toml --watch\n"
        "Run the demo again: nothing is sampled twice."
    )
