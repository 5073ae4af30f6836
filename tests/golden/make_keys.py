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
}


def case(title: str, specification: dict[str, Any]) -> dict[str, Any]:
    sweep = Sweep.parse(specification)
    return {
        "title": title,
        "specification": specification,
        "canonical": sweep.canonical(),
        "key": sweep.key,
        "ensembles": [point.ensemble.key for point in sweep.points][:3],
        "observations": {item.name: item.observation.key for item in sweep.observations},
    }


if __name__ == "__main__":
    target = Path(__file__).with_name("keys.json")
    target.write_text(json.dumps([case(*item) for item in CASES.items()], indent=1) + "\n")
