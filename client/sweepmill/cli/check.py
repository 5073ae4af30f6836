"""sweepmill check"""

from typing import Annotated

import typer

from sweepmill.cli.estimate_text import estimate_text
from sweepmill.cli.options import Specification, Url
from sweepmill.client import Client
from sweepmill.errors import Unreachable
from sweepmill.language.written import circuit_toml
from sweepmill.presets import layered_form
from sweepmill.retry import Retry
from sweepmill.sweep import Sweep
from sweepmill.text import count


def check(
    file: Specification,
    ensembles: Annotated[bool, typer.Option("--ensembles", help="List every ensemble with its key.")] = False,
    layered: Annotated[
        bool, typer.Option("--layered", help="Write the circuit of the first ensemble as data, and nothing else.")
    ] = False,
    url: Url = None,
) -> None:
    """Validate a specification, expand it, and estimate its cost.

    Faults are printed one per line as `path: message`, and the exit code is 1. The estimate needs a service;
    without one the check is local. With --layered the circuit is printed as a block of the family `layered`,
    to start a circuit of one's own from.

    Example: sweepmill check transition.toml
    """
    sweep = Sweep.read(file)
    if layered:
        print(circuit_toml(layered_form(sweep.points[0].ensemble)))
        return
    print(_expanded(sweep))
    if ensembles:
        for point in sweep.points:
            parameters = ", ".join(f"{name} = {value}" for name, value in point.ensemble.columns.items())
            print(f"{point.ensemble.key}  {parameters}")
    with Client(url, retry=Retry(attempts=1)) as client:
        try:
            print(estimate_text(client.estimate(sweep)))
        except Unreachable as error:
            print(f"checked locally only, without an estimate: no service answers at {error.url}")


def _expanded(sweep: Sweep) -> str:
    names = (observation.name for observation in sweep.observations)
    cap = sum(point.cap for point in sweep.points)
    first = [point for point in sweep.points if point.ensemble.key in sweep.starting]
    placed = f", of which {count(len(first))} are sampled first" if len(first) < len(sweep.points) else ""
    return "\n".join(
        [
            f"sweep         {sweep.key}",
            f"axes          {' × '.join(sweep.axes) or 'none'}",
            f"ensembles     {count(len(sweep.points))}{placed}",
            f"observations  {', '.join(names)}",
            f"trajectories  {count(cap)} at most",
        ]
    )
