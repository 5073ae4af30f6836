"""Writes keys.json. Run it for a new case, or to change keys on purpose: that orphans every stored result."""

import json
import sys
from pathlib import Path
from typing import Any

sys.path.insert(0, str(Path(__file__).parents[1]))

from support.specs import small, transition
from sweepmill.sweep import Sweep

CASES: dict[str, dict[str, Any]] = {
    "the example": transition(),
    "four quick ensembles": small(),
    "one ensemble, every quantity": small(
        circuit__sites=16,
        circuit__measurement_rate=0.16,
        observe=[
            {"quantity": "entropy", "region": "every-cut", "at": {"every": 4}},
            {"quantity": "mutual-information", "at": "end"},
            {"quantity": "tripartite-information", "average_translations": True},
            {"quantity": "global-entropy", "at": [1, 2, 4, 8]},
            {"quantity": "record-bits", "histogram": True},
            {"quantity": "outcome-randomness", "cumulative": True, "at": {"log_spaced": 5}},
            {
                "quantity": "entropy",
                "name": "late",
                "region": [0, 5, 3],
                "at": {"average_over": {"last": 0.5, "every": 4}},
            },
        ],
    ),
    "quantities of the state's structure": small(
        circuit__sites=16,
        circuit__initial_state="mixed",
        observe=[
            {"quantity": "entropy", "region": "every-interval", "average_translations": True},
            {"quantity": "site-environment-information", "at": {"every": 4}},
            {"quantity": "negativity", "region": "every-cut", "histogram": True},
            {"quantity": "generator-lengths", "at": "end"},
        ],
    ),
    "a union with replicates": small(
        circuit=[
            {
                "family": "hybrid-clifford",
                "sites": 8,
                "measurement_rate": [0.1, 0.123456789012345],
                "replicate": [0, 1],
            },
            {"family": "hybrid-clifford", "sites": 9, "measurement_rate": 1, "boundary": "open", "trajectories": 100},
        ],
        observe=[{"quantity": "entropy", "at": "end"}],
    ),
    "mixed state, rules and budget": small(
        circuit__initial_state="mixed",
        stop__standard_error=[{"of": "i3", "below": 0.05}],
        stop__budget=60,
        stop__at_least=100,
    ),
    "every preset": small(
        circuit=[
            {"family": "hybrid-clifford", "sites": 8, "measurement_rate": 0.1, "references": 2, "scrambling_layers": 3},
            {"family": "hybrid-clifford-square", "width": 4, "measurement_rate": [0.1, 0.2], "engine": "reference"},
            {"family": "hybrid-clifford-square", "width": 4, "height": 6, "measurement_rate": 0.1, "layers": 8},
            {"family": "hybrid-clifford-long-range", "sites": 8, "exponent": 2.5, "measurement_rate": 0.1},
            {"family": "projective-ising", "sites": 8, "bond_rate": [0.4, 0.6], "boundary": "open"},
            {"family": "edge-bath", "sites": 8},
            {"family": "rotated-clifford", "sites": 8, "layers": 9, "ends": ["open", "product", "ring"]},
        ],
        observe=[{"quantity": "entropy", "at": "end"}],
    ),
    "a circuit written as data": small(
        circuit={
            "family": "layered",
            "sites": [8, 16],
            "boundary": ["periodic", "open"],
            "initial_state": "plus",
            "layers": {"per_site": 1},
            "before": [[{"swap-in": "reference", "on": {"sublattice": {"every": 4}}}]],
            "repeat": [
                [
                    {"apply": "Uniform_Clifford", "on": {"blocks": {"width": 2, "every": 2}}, "fixed": "trajectory"},
                    {"measure": "z", "on": "sites", "rate": {"parameter": "p"}},
                ],
                [
                    {
                        "choose": [
                            {"weight": {"parameter": "p"}, "steps": [{"measure": "ZZ", "recorded": False}]},
                            {"weight": {"parameter": "p", "complement": True}, "steps": [{"apply": "CNOT"}]},
                        ],
                        "on": "bonds-from-1",
                    },
                    {
                        "reset": True,
                        "on": {"random_sequential": {"count": {"per_site": 0.5}, "of": "sites"}},
                        "rate": {"profile": "list", "by": "layer", "values": [0.1, 0.2, 0.1, 0.2]},
                    },
                ],
            ],
            "after": [[{"measure": "Z", "on": "sites", "rate": {"disorder": "uniform", "from": 0, "to": 0.5}}]],
            "parameters": {"p": {"from": 0.25, "to": 0.75, "step": 0.25}},
        },
        observe=[{"quantity": "reference-entropy", "at": "end"}],
    ),
    "records and signs": small(
        circuit__engine=["auto", "reference"],
        circuit__initial_state="mixed",
        observe=[
            {"quantity": "cross-entropy", "against": "plus"},
            {"quantity": "cross-entropy", "against": "zeros", "at": {"every": 4}, "name": "zeros"},
        ],
    ),
}


def case(title: str, specification: dict[str, Any]) -> dict[str, Any]:
    sweep = Sweep.parse(specification)
    return {
        "title": title,
        "specification": specification,
        "canonical": sweep.canonical(),
        "key": sweep.key,
        "ensembles": [point.ensemble.key for point in sweep.points][:20],
        "observations": {item.name: item.observation.key for item in sweep.observations},
    }


if __name__ == "__main__":
    target = Path(__file__).with_name("keys.json")
    target.write_text(json.dumps([case(*item) for item in CASES.items()], indent=1) + "\n")
