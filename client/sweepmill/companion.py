"""A companion of a sweep: the same circuits and observations, read along the layers instead of at the end."""

from typing import Any

from sweepmill.errors import SpecificationError, SweepmillError
from sweepmill.series import COUNT, SHARE
from sweepmill.sweep import Sweep

READINGS = 32  # of the shortest circuit, at least as far as unit cells allow
TRAJECTORIES = 400
_LEFT_OUT = ("histogram", "keep_values", "cumulative")  # costly, or never settling


def companion(sweep: Sweep, trajectories: int = TRAJECTORIES) -> Sweep:
    """The sweep with `at = { every = n }` in every observation that can be a series, and few trajectories.

    Counts from the first layer on are replaced by the share of random outcomes of single layers. Its ensembles are
    those of the sweep, so it reads trajectories that are of the same stream. Raises SweepmillError where no observation
    can be read along the layers.
    """
    layers = min(point.ensemble.layers for point in sweep.points)
    cell = max(point.ensemble.cell for point in sweep.points)
    every = max(cell, layers // READINGS // cell * cell)
    form = sweep.normalized()
    circuits = [{name: value for name, value in one.items() if name != "trajectories"} for one in form["circuit"]]
    observed = _distinct([_series(one, every) for one in form["observe"]])
    stop = {"trajectories": min(trajectories, sweep.stop.trajectories)}
    return _accepted({"circuit": circuits, "observe": observed, "stop": stop})


def _series(observation: dict[str, Any], every: int) -> dict[str, Any]:
    if observation["quantity"] == COUNT:  # grows with every layer: what each of them adds can settle
        return {"quantity": SHARE, "at": {"every": every}}
    kept = {name: value for name, value in observation.items() if name not in _LEFT_OUT}
    return {**kept, "at": {"every": every}}


def _distinct(observed: list[dict[str, Any]]) -> list[dict[str, Any]]:
    """Observations that differed in their times only become one."""
    found: dict[str, dict[str, Any]] = {}
    for one in observed:
        found.setdefault(str(sorted((name, str(v)) for name, v in one.items() if name != "name")), one)
    return list(found.values())


def _accepted(form: dict[str, Any]) -> Sweep:
    """The sweep without the observations that cannot be a series."""
    try:
        return Sweep.parse(form)
    except SpecificationError as error:
        bad = {i for i in range(len(form["observe"])) if any(f.path.startswith(f"observe[{i}]") for f in error.faults)}
        if len(bad) == len(form["observe"]):
            raise SweepmillError(f"no observation can be read along the layers: {error.faults[0]}") from error
        if not bad:
            raise
    return _accepted({**form, "observe": [one for i, one in enumerate(form["observe"]) if i not in bad]})
