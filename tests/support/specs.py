"""Specifications used by many tests."""

from copy import deepcopy
from typing import Any

TRANSITION: dict[str, Any] = {
    "circuit": {
        "family": "hybrid-clifford",
        "boundary": "periodic",
        "initial_state": "zeros",
        "sites": [32, 64, 128],
        "measurement_rate": {"from": 0.13, "to": 0.19, "points": 7},
        "layers": {"per_site": 4},
    },
    "observe": [
        {"quantity": "entropy", "region": "half", "average_translations": True, "histogram": True},
        {"name": "i3", "quantity": "tripartite-information", "at": "last-cell"},
    ],
    "stop": {
        "trajectories": 4000,
        "at_least": 200,
        "budget": 7200,
        "standard_error": [{"of": "i3", "below": 0.01}],
    },
}


def transition(**changes: Any) -> dict[str, Any]:
    """The example of the README; keyword arguments ``circuit__sites=…`` replace nested fields."""
    return changed(deepcopy(TRANSITION), changes)


def small(**changes: Any) -> dict[str, Any]:
    """A sweep of four quick ensembles without rules."""
    spec: dict[str, Any] = {
        "circuit": {
            "family": "hybrid-clifford",
            "sites": [8, 12],
            "measurement_rate": [0.1, 0.2],
            "layers": {"per_site": 2},
        },
        "observe": [{"quantity": "entropy"}, {"name": "i3", "quantity": "tripartite-information"}],
        "stop": {"trajectories": 300},
    }
    return changed(spec, changes)


def changed(spec: dict[str, Any], changes: dict[str, Any]) -> dict[str, Any]:
    """``spec`` with nested fields replaced: ``circuit__sites`` is the field sites of circuit."""
    for path, value in changes.items():
        *parents, last = path.split("__")
        target = spec
        for parent in parents:
            target = target[parent]
        target[last] = value
    return spec
