"""What a batch takes of a worker's memory stays below what is said."""

import tracemalloc
from typing import Any

import pytest

from sweepmill.ensemble import Ensemble
from sweepmill.observation import CrossEntropy, Entropy, GeneratorLengths, TripartiteInformation
from sweepmill_worker.memory import BLOCK_BYTES, block_size, engine_bytes, peak_bytes, trajectory_bytes
from sweepmill_worker.sample import sample

CUTS = Entropy(quantity="entropy", region="every-cut", average_translations=True, at={"every": 2})
HALF = Entropy(quantity="entropy", at={"every": 1, "single_layers": True})
CHI = CrossEntropy(quantity="cross-entropy", against="plus", at={"every": 2})
TRIPARTITE = TripartiteInformation(quantity="tripartite-information", average_translations=True)
CASES: list[tuple[Ensemble, list[Any], int]] = [
    (Ensemble.of("hybrid-clifford", sites=32, measurement_rate=0.2, layers=64), [CUTS, TRIPARTITE], 2000),
    (Ensemble.of("hybrid-clifford", sites=60, measurement_rate=0.2, layers=600), [HALF], 3000),
    (Ensemble.of("edge-bath", sites=30, layers=100), [HALF, GeneratorLengths(quantity="generator-lengths")], 2000),
    (Ensemble.of("projective-ising", sites=20_000, bond_rate=0.5, layers=4), [HALF], 10),
    (Ensemble.of("hybrid-clifford", sites=6, measurement_rate=0.2, layers=6, engine="reference"), [HALF], 10),
    (Ensemble.of("hybrid-clifford", sites=6, measurement_rate=0.2, layers=6, engine="reference"), [CHI], 10),
    (Ensemble.of("hybrid-clifford", sites=30, measurement_rate=0.2, layers=600), [CHI], 500),
]


@pytest.mark.parametrize(("ensemble", "observations", "count"), CASES, ids=lambda value: getattr(value, "family", ""))
def test_a_batch_allocates_no_more_than_is_said(ensemble: Ensemble, observations: list[Any], count: int) -> None:
    sample(ensemble, observations, 0, 1)  # compiled kernels and tables stay
    tracemalloc.start()
    sample(ensemble, observations, 0, count)
    _, peak = tracemalloc.get_traced_memory()
    tracemalloc.stop()
    assert peak <= peak_bytes(ensemble, observations)


def test_readings_are_made_in_blocks_that_fit() -> None:
    ensemble, observations, _ = CASES[1]
    assert block_size(ensemble, observations) * trajectory_bytes(ensemble, observations) <= BLOCK_BYTES
    assert block_size(ensemble, observations) > 1


def test_the_memory_of_an_engine_grows_with_the_square_of_the_sites_and_of_clusters_with_the_sites() -> None:
    def bytes_at(family: str, sites: int, **parameters: Any) -> int:
        return engine_bytes(Ensemble.of(family, sites=sites, layers=2, **parameters))

    chains = [bytes_at("hybrid-clifford", sites, measurement_rate=0.1) for sites in (512, 1024)]
    assert 3 < chains[1] / chains[0] < 4.5
    rings = [bytes_at("projective-ising", sites, bond_rate=0.5) for sites in (10_000, 20_000)]
    assert 1.8 < rings[1] / rings[0] <= 2
