"""Error bars of the whole service: 200 replicates settle by a standard-error rule, and their pulls have unit width.

The exact value is that of ``tests/worker/test_pulls.py``: entropy of two neighboring sites of a periodic chain of four
after its second layer at p = 0.16, from the Markov chain on all 2,295 stabilizer groups. False-alarm probability: the
share ``error-bars`` of the suite's budget, split over two comparisons.
"""

from pathlib import Path

import numpy as np
from scipy import stats

from support.budget import SHARES, z_limit
from support.services import service
from sweepmill import Client, Sweep
from sweepmill.ladder import rungs

EXACT = 0.718846198397  # bits
REPLICATES = 200
SWEEP = {
    "circuit": {
        "family": "hybrid-clifford",
        "sites": 4,
        "measurement_rate": 0.16,
        "layers": 2,
        "replicate": {"from": 0, "to": REPLICATES - 1, "points": REPLICATES},
    },
    "observe": [{"quantity": "entropy", "at": [2]}],
    "stop": {"trajectories": 4000, "at_least": 475, "standard_error": {"of": "entropy", "below": 0.0265}},
}


def test_replicates_that_settle_by_a_rule_have_pulls_of_unit_width_and_no_bias(tmp_path: Path) -> None:
    with service(f"sqlite:///{tmp_path / 'replicates.sqlite'}", workers="1") as running, Client(running.url) as client:
        remote = client.submit(Sweep.parse(SWEEP))
        assert remote.wait(progress=False, timeout=120).state == "settled"
        table = remote.table()
    assert len(table) == REPLICATES
    assert set(table.values("met_by")) == {"error"}
    assert set(table.values("trajectories")) <= set(rungs(475, 4000))
    assert len(set(table.values("trajectories"))) > 1
    pulls = (table["mean"] - EXACT) / table["standard_error"]
    tail = SHARES["error-bars"] / 2 / 2
    assert stats.chi2.ppf(tail, REPLICATES) < (pulls**2).sum() < stats.chi2.isf(tail, REPLICATES)
    assert abs(pulls.mean()) * np.sqrt(REPLICATES) < z_limit("error-bars", 2)
