"""Small sweeps to test with."""

from typing import Any

from sweepmill.sweep import Sweep


def small_sweep(rates: int = 3, sites: int = 8, cap: int = 400, **stop: Any) -> Sweep:
    """A sweep of ``rates`` ensembles and the observations "entropy" and "bits"."""
    return Sweep.parse(
        {
            "circuit": {
                "family": "hybrid-clifford",
                "sites": sites,
                "layers": 8,
                "measurement_rate": {"from": 0.1, "to": 0.4, "points": rates} if rates > 1 else 0.1,
            },
            "observe": [{"quantity": "entropy"}, {"quantity": "record-bits", "name": "bits"}],
            "stop": {"trajectories": cap} | stop,
        }
    )


def keys_of(sweep: Sweep) -> tuple[list[str], list[str]]:
    """Ensemble keys and observation keys of a sweep."""
    return [point.ensemble.key for point in sweep.points], [item.observation.key for item in sweep.observations]
