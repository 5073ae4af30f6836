"""Circuits written as data, for tests."""

from typing import Any

from sweepmill.ensemble import Ensemble
from sweepmill.errors import SpecificationError
from sweepmill.sweep import Sweep

REST: dict[str, Any] = {"observe": [{"quantity": "entropy", "at": "end"}], "stop": {"trajectories": 300}}
Z: dict[str, Any] = {"measure": "Z", "on": "sites"}
GATES: dict[str, Any] = {"apply": "uniform-clifford", "on": "bonds-from-0"}


def specification(**circuit: Any) -> dict[str, Any]:
    """A sweep of one circuit block."""
    return {"circuit": circuit, **REST}


def layered(*layers: list[dict[str, Any]], **fields: Any) -> dict[str, Any]:
    """A sweep of one circuit written as data: `layers` in turn."""
    return specification(**{"family": "layered", "sites": 8, "layers": 4, "repeat": list(layers), **fields})


def ensembles(spec: dict[str, Any]) -> list[Ensemble]:
    """The ensembles of a specification."""
    return [point.ensemble for point in Sweep.parse(spec).points]


def only(spec: dict[str, Any]) -> dict[str, Any]:
    """The normal form of its only ensemble."""
    (ensemble,) = ensembles(spec)
    return ensemble.normal_form()


def step(**fields: Any) -> Any:
    """The normal form of a step that stands alone in its layer."""
    return only(layered([fields]))["repeat"][0][0]


def faults(spec: dict[str, Any]) -> dict[str, str]:
    """What is wrong with a specification: messages by path, several of one path joined."""
    try:
        Sweep.parse(spec)
    except SpecificationError as error:
        found: dict[str, str] = {}
        for path, message in error.faults:
            found[path] = f"{found[path]}; {message}" if path in found else message
        return found
    return {}
