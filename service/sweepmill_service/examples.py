"""Examples of the OpenAPI document: one small sweep of an invented group, its keys computed, its numbers made up."""

from typing import Any

from sweepmill.messages import (
    Answer,
    EnsembleProgress,
    EnsembleRecord,
    Estimate,
    ExpectedError,
    PoolStatus,
    ProgressPage,
    Range,
    Round,
    RoundList,
    RoundPlace,
    Submitted,
    SweepList,
    SweepStatus,
    Trajectory,
)
from sweepmill.revisions import all_revisions
from sweepmill.sweep import Sweep

_AT = 1767607200.0
SPECIFICATION: dict[str, Any] = {
    "circuit": {
        "family": "hybrid-clifford",
        "sites": [16, 32],
        "measurement_rate": {"from": 0.12, "to": 0.2, "points": 3},
        "layers": {"per_site": 4},
    },
    "observe": [
        {"quantity": "entropy", "region": "half", "average_translations": True},
        {"name": "i3", "quantity": "tripartite-information"},
    ],
    "stop": {"trajectories": 4000, "at_least": 200, "standard_error": [{"of": "i3", "below": 0.01}]},
    "label": "lantern project, first look",
}
SPECIFICATIONS: Any = {
    "crossing": {"summary": "Two sizes, three rates, an early stop", "value": SPECIFICATION},
    "plain": {
        "summary": "One ensemble, a fixed number of trajectories",
        "value": {
            "circuit": {"family": "hybrid-clifford", "sites": 64, "measurement_rate": 0.16},
            "observe": [{"quantity": "entropy", "region": "every-cut"}],
            "stop": {"trajectories": 1000},
        },
    },
    "layered": {
        "summary": "A circuit written as data: gates drawn once per trajectory, a measurement rate as an axis",
        "value": {
            "circuit": {
                "family": "layered",
                "sites": [32, 64],
                "layers": {"per_site": 4},
                "repeat": [
                    [
                        {"apply": "uniform-clifford", "on": bricks, "fixed": "trajectory"},
                        {"measure": "Z", "on": "sites", "rate": {"parameter": "p"}},
                    ]
                    for bricks in ("bonds-from-0", "bonds-from-1")
                ],
                "parameters": {"p": {"from": 0.02, "to": 0.1, "points": 5}},
            },
            "observe": [{"quantity": "entropy"}],
            "stop": {"trajectories": 1000},
        },
    },
}
AMENDMENTS: Any = {
    "both": {"value": {"label": "lantern project, for the poster", "priority": 3}},
    "label removed": {"value": {"label": None}},
}

_SWEEP = Sweep.parse(SPECIFICATION)
_POINT = _SWEEP.points[0]
_PARAMETERS = dict(_POINT.ensemble.parameters)
NORMAL_FORM = _SWEEP.normalized()
_ENTROPY, _I3 = (item.observation for item in _SWEEP.observations)
_VERSIONS = {"python": "3.12.4", "sweepmill": "0.1.0", "numpy": "2.3.1", "numba": "0.61.2"}
_DIGEST = "7d0c" * 16

_STATUS = SweepStatus.model_validate(
    {
        "key": _SWEEP.key,
        "state": "sampling",
        "families": ["hybrid-clifford"],
        "axes": list(_SWEEP.axes),
        "names": ["entropy", "i3"],
        "requests": [
            {"owner": "mara", "label": SPECIFICATION["label"], "priority": 0, "at": _AT, "core_seconds": 41.5}
        ],
        "ensembles": 6,
        "settled": 2,
        "trajectories": 9136,
        "trajectories_cap": 24000,
        "core_seconds": 41.5,
        "created_at": _AT,
        "commit": 57,
    }
)
STATUS = _STATUS.model_dump()
SWEEP_LIST = SweepList(sweeps=[_STATUS]).model_dump()
SUBMITTED = Submitted(
    key=_SWEEP.key,
    created=True,
    status=_STATUS,
    sampled_ensembles=0,
    sampled_trajectories=9136,
    revisions=all_revisions(),
).model_dump()
ESTIMATE = Estimate(
    key=_SWEEP.key,
    ensembles=6,
    trajectories_cap=24000,
    sampled_ensembles=0,
    sampled_trajectories=9136,
    trajectories_expected=13_400,
    core_seconds=67.2,
    core_seconds_range=Range(low=59.8, high=75.5),
    core_seconds_expected=19.3,
    core_seconds_expected_range=Range(low=16.6, high=22.5),
    core_seconds_from="measured",
    cores=8,
    seconds=6.4,
    seconds_range=Range(low=5.2, high=7.9),
    queued_core_seconds=41.0,
    accumulator_bytes=6720,
    kept_bytes=0,
    worker_bytes=48_400_000,
    standard_errors=[
        ExpectedError(
            name="entropy",
            largest=0.013,
            largest_range=Range(low=0.010, high=0.017),
            median=0.0087,
            source="learned",
        ),
        ExpectedError(
            name="i3",
            largest=0.0099,
            largest_range=Range(low=0.0095, high=0.0103),
            median=0.0096,
            below=0.01,
            met=6,
            source="sampled",
        ),
    ],
).model_dump()
_PROGRESS = EnsembleProgress(
    ordinal=0,
    ensemble=_POINT.ensemble.key,
    parameters=_PARAMETERS,
    trajectories=1345,
    cap=4000,
    met_by="error",
    changed=31,
)
PROGRESS = ProgressPage(sweep=_SWEEP.key, commit=57, ensembles=[_PROGRESS]).model_dump()
ROUNDS = RoundList(
    sweep=_SWEEP.key,
    rounds=[
        Round(
            number=1,
            trajectories=1200,
            core_seconds=3.1,
            answers=[
                Answer(
                    quantity="p_c",
                    of="i3",
                    round=1,
                    value=0.1587,
                    error=0.0031,
                    statistical=0.0029,
                    spread=0.0011,
                    below=0.001,
                    met=False,
                    predicted_error=0.0022,
                )
            ],
            places=[RoundPlace(ordinal=0, judged=200, cost=0.00048828125, target=400)],
            settled=False,
            at=1.79e9,
        )
    ],
).model_dump()
EVENT = f'id: 57\nevent: progress\ndata: {{"status":{{"key":"{_SWEEP.key}","state":"sampling"}},"ensembles":[]}}\n\n'
TABLE: dict[str, Any] = {
    "columns": {
        "sites": [16],
        "measurement_rate": [0.12],
        "layers": [64],
        "name": ["i3"],
        "quantity": ["tripartite-information"],
        "region": ["quarters"],
        "layer": [None],
        "position": [None],
        "trajectories": [1345],
        "mean": [-0.6208],
        "standard_error": [0.0098],
        "variance": [0.1292],
        "minimum": [-2.0],
        "maximum": [0.0],
        "met_by": ["error"],
    },
    "metadata": {
        "sweep": _SWEEP.key,
        "axes": ["sites", "measurement_rate", "layers"],
        "constants": {"family": "hybrid-clifford"}
        | {
            name: _PARAMETERS[name]
            for name in ("boundary", "initial_state", "references", "scrambling_layers", "replicate", "engine")
        },
        "observations": {"i3": _I3.key},
        "folds": {"i3": [64]},
        "version": "0.1.0",
        "revisions": all_revisions(),
        "ensembles": [
            {
                "key": _POINT.ensemble.key,
                "ordinal": 0,
                "rows": [0, 1],
                "frozen": True,
                "digest": _DIGEST,
                "observations": {_I3.key: {"trajectories": [0, 1345], "digest": _DIGEST}},
            }
        ],
    },
}
HISTOGRAMS: dict[str, Any] = {
    "columns": {
        "sites": [16, 16],
        "name": ["entropy", "entropy"],
        "quantity": ["entropy", "entropy"],
        "region": ["half", "half"],
        "layer": [None, None],
        "position": [None, None],
        "value": [1, 2],
        "occurrences": [811, 534],
    },
    "metadata": TABLE["metadata"],
}
_PLACE = ("sites", "measurement_rate", "layers", "name", "quantity", "region", "layer", "position", "trajectories")
FOLDS: dict[str, Any] = {
    "columns": {
        **{name: TABLE["columns"][name] for name in (*_PLACE, "mean", "standard_error")},
        "numerators": [[-12.5, -13.25, -14.0, -12.75]],
        "denominators": [[21.0, 21.0, 21.0, 20.0]],
    },
    "metadata": TABLE["metadata"],
}
VALUES = """\
sites,layer,position,trajectory,value
16,,,0,2
16,,,1,1.5
"""
ENSEMBLE = EnsembleRecord.model_validate(
    {
        "key": _POINT.ensemble.key,
        "family": "hybrid-clifford",
        "parameters": _PARAMETERS,
        "revision": 1,
        "observations": [{"key": _I3.key, "observation": _I3.normal_form(), "trajectories": 1345, "digest": _DIGEST}],
        "batches": 1,
        "core_seconds": 3.9,
        "latest": [
            {
                "observation": _I3.key,
                "first": 0,
                "count": 1345,
                "digest": _DIGEST,
                "seconds": 3.9,
                "worker": "0",
                "versions": _VERSIONS,
                "at": _AT,
            }
        ],
        "faults": [],
    }
).model_dump()
CIRCUIT = """\
# trajectory 17 of an ensemble of 4 sites (shortened)
# qubits 0 .. 3: the chain
XCZ 0 1
CX 2 3
S 0
C_XYZ 1 2
M 1
TICK # layer 1 done
"""
TRAJECTORY = Trajectory.model_validate(
    {
        "ensemble": _POINT.ensemble.key,
        "trajectory": 17,
        "parameters": _PARAMETERS,
        "observations": [
            {
                "observation": _ENTROPY.normal_form(),
                "values": [{"layer": None, "position": None, "value": 1.46875}],
            }
        ],
        "versions": _VERSIONS,
        "circuit": {"format": "stim", "text": CIRCUIT},
    }
).model_dump()
POOL = PoolStatus.model_validate(
    {
        "ready": True,
        "workers": [
            {
                "name": "0",
                "address": "tcp://127.0.0.1:41217",
                "threads": 1,
                "computing": [f"{_POINT.ensemble.key[:8]}:1345+400"],
            }
        ],
        "cores": 1,
        "in_flight": 2,
        "window": 2,
        "batches_committed": 57,
        "trajectories_per_second": 355.0,
        "busy_fraction": 0.97,
    }
).model_dump()
INDEX = {
    "sweeps": "/v1/sweeps",
    "pool": "/v1/pool",
    "interface": "/openapi.json",
    "health": "/healthz",
    "readiness": "/readyz",
    "metrics": "/metrics",
}
