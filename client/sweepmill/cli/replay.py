"""sweepmill replay"""

import sys
from itertools import zip_longest
from pathlib import Path
from typing import Annotated, Any

import typer

from sweepmill.cli.options import Url
from sweepmill.client import Client
from sweepmill.ensemble import Ensemble
from sweepmill.errors import KeyMismatch, SweepmillError
from sweepmill.extras import needing
from sweepmill.messages import CircuitFormat, EnsembleRecord, Trajectory, TrajectoryValue
from sweepmill.observation import observation_from_normal_form
from sweepmill.text import aligned, short


def replay(
    ensemble: Annotated[str, typer.Argument(metavar="ENSEMBLE", help="Key of the ensemble, or its first digits.")],
    k: Annotated[int, typer.Argument(metavar="K", min=0, help="Number of the trajectory, from 0.")],
    circuit: Annotated[
        CircuitFormat | None, typer.Option(help="Write the circuit of the trajectory in this language, too.")
    ] = None,
    output: Annotated[
        Path | None,
        typer.Option(
            "-o",
            "--output",
            metavar="FILE",
            dir_okay=False,
            help="Where the circuit goes; without it to standard output, and the comparison to standard error.",
        ),
    ] = None,
    url: Url = None,
) -> None:
    """Recompute one trajectory here and compare it with the service.

    Needs the extra `server`. The exit code is 1 if a value differs.

    Example: sweepmill replay 5a0c77d2 17 --circuit openqasm3 -o circuit.qasm
    """
    if output is not None and circuit is None:
        raise typer.BadParameter("-o is for the circuit: name a language with --circuit")
    with needing("sweepmill replay", "server"):
        from sweepmill_worker.circuit_text.write import circuit_text
        from sweepmill_worker.sample import trajectory_values
    with Client(url) as client:
        record = client.ensemble(ensemble)
        theirs = client.trajectory(record.key, k)
    local = _ensemble(record)
    if circuit is not None:
        _write(circuit_text(local, k, circuit), output)
    here = trajectory_values(local, _observations(theirs), k)
    rows = [row for mine, remote in zip(here, theirs.observations, strict=True) for row in _compared(mine, remote)]
    report = sys.stderr if circuit is not None and output is None else sys.stdout
    print(aligned(("quantity", "region", "layer", "position", "here", "service", ""), rows), file=report)
    if any(row[-1] for row in rows):
        print(f"trajectory {k} of ensemble {short(record.key)} is different here", file=report)
        raise typer.Exit(1)
    print(f"trajectory {k} of ensemble {short(record.key)} is equal here and there", file=report)


def _write(text: str, output: Path | None) -> None:
    if output is None:
        print(text, end="")
    else:
        output.write_text(text, encoding="utf-8")


def _ensemble(record: EnsembleRecord) -> Ensemble:
    """The ensemble as this machine understands it. Raises KeyMismatch where that is another one."""
    local = Ensemble.of(record.family, **record.parameters)
    if local.key != record.key:
        raise KeyMismatch(local.key, record.key, {record.family: local.revision}, {record.family: record.revision})
    return local


def _observations(trajectory: Trajectory) -> list[Any]:
    try:
        return [observation_from_normal_form(item.observation) for item in trajectory.observations]
    except ValueError as error:
        raise SweepmillError(f"this machine cannot compare with that service: {error}") from error


def _compared(local: dict[str, Any], remote: TrajectoryValue) -> list[list[Any]]:
    """One row per coordinate; the last cell says where the two differ. Values are equal only bit for bit."""
    observation = observation_from_normal_form(remote.observation)
    absent: dict[str, Any] = {}
    return [
        [
            observation.quantity,
            observation.region_label(),
            here.get("layer"),
            here.get("position"),
            _value(here),
            _value(there),
            "" if here == there else "different",
        ]
        for here, there in zip_longest(local["values"], remote.values, fillvalue=absent)
    ]


def _value(row: dict[str, Any]) -> str:
    if "numerator" in row:
        return f"{row['numerator']}/{row['denominator']}"
    return repr(row["value"]) if "value" in row else "missing"
