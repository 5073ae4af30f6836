"""``sample`` on every family: the engine it takes, one total for any split, and presets as their layered form."""

from typing import Any

import numpy as np
import pytest

from sweepmill.accumulate import merged
from sweepmill.ensemble import Ensemble
from sweepmill.observation import (
    ClusterOrder,
    Entropy,
    GeneratorLengths,
    GlobalEntropy,
    OutcomeRandomness,
    PauliExpectation,
    RecordBits,
    ReferenceEntropy,
    SiteEnvironmentInformation,
)
from sweepmill_worker.engines import CHAIN, CLUSTERS, PROGRAM, SIGNED, engine_of, program_of
from sweepmill_worker.observables.probes import of_regions
from sweepmill_worker.program.run import run_program
from sweepmill_worker.sample import sample, trajectory_values

FLOQUET = [
    [{"apply": "uniform-clifford", "on": "bonds", "fixed": "trajectory"}, {"measure": "Z", "on": "sites", "rate": 0.2}]
]
ENSEMBLES = [
    (Ensemble.of("hybrid-clifford", sites=8, measurement_rate=0.2, layers=16), CHAIN),
    (Ensemble.of("hybrid-clifford", sites=8, measurement_rate=0.2, layers=8, initial_state="mixed"), CHAIN),
    (
        Ensemble.of("hybrid-clifford", sites=8, measurement_rate=0.2, layers=8, references=2, scrambling_layers=4),
        PROGRAM,
    ),
    (Ensemble.of("hybrid-clifford-square", width=4, height=2, measurement_rate=0.3, layers=8), PROGRAM),
    (Ensemble.of("hybrid-clifford-long-range", sites=8, exponent=1.5, measurement_rate=0.2, layers=8), PROGRAM),
    (Ensemble.of("edge-bath", sites=6, layers=8), PROGRAM),
    (Ensemble.of("rotated-clifford", sites=6, layers=5), PROGRAM),
    (Ensemble.of("rotated-clifford", sites=6, layers=5, ends="product"), PROGRAM),
    (Ensemble.of("projective-ising", sites=8, bond_rate=0.5, layers=8), CLUSTERS),
    (Ensemble.of("layered", sites=6, layers=7, repeat=FLOQUET), PROGRAM),
    (Ensemble.of("hybrid-clifford", sites=4, measurement_rate=0.2, layers=4, engine="reference"), SIGNED),
]


def label(value: Any) -> str:
    return f"{value.family}-{value.parameters['engine']}" if isinstance(value, Ensemble) else ""


@pytest.mark.parametrize(("ensemble", "engine"), ENSEMBLES, ids=label)
def test_any_split_of_a_range_gives_the_same_total(ensemble: Ensemble, engine: Any) -> None:
    assert engine_of(ensemble) is engine
    observations = [
        Entropy(quantity="entropy", region="every-cut", at="end"),
        RecordBits(quantity="record-bits", at="end"),
    ]
    whole = sample(ensemble, observations, 0, 12)
    parts = [sample(ensemble, observations, first, count) for first, count in ((0, 5), (5, 1), (6, 6))]
    for item in observations:
        pieces = [part.accumulators[item.key] for part in parts]
        assert merged(pieces).digest == whole.accumulators[item.key].digest


@pytest.mark.parametrize(("ensemble", "engine"), ENSEMBLES, ids=label)
def test_presets_sample_what_their_layered_form_samples_with_the_same_words(ensemble: Ensemble, engine: Any) -> None:
    regions = [tuple(range(x)) for x in range(1, ensemble.sites + 1)]
    layers = list(range(1, ensemble.layers + 1))
    probes = of_regions(ensemble.sites, regions, ensemble.references)
    preset = engine.read(ensemble, 3, 4, layers, probes)
    general = run_program(program_of(ensemble), ensemble.key_words, 3, 4, layers, regions)
    np.testing.assert_array_equal(preset.entropies, general.entropies)
    np.testing.assert_array_equal(preset.random, general.random)
    np.testing.assert_array_equal(preset.measured, general.measured)


def test_quantities_of_single_engines_are_sampled() -> None:
    """By hand: all bonds and no fields make one cluster; at rate 0 a reference keeps its bit, a chain its Z signs."""
    ising = Ensemble.of("projective-ising", sites=6, bond_rate=1, layers=2)
    assert values(ising, ClusterOrder(quantity="cluster-order")) == [1.0]
    kept = Ensemble.of("hybrid-clifford", sites=4, measurement_rate=0, layers=4, references=3)
    assert values(kept, ReferenceEntropy(quantity="reference-entropy")) == [3.0]
    signs = Ensemble.of("hybrid-clifford", sites=4, measurement_rate=1, layers=2, engine="reference")
    (value,) = values(signs, PauliExpectation(quantity="pauli-expectation", pauli="Z", sites=(1,), at="end"))
    assert abs(value) == 1.0
    measured = Ensemble.of("hybrid-clifford", sites=4, measurement_rate=1, layers=2)
    assert values(measured, GeneratorLengths(quantity="generator-lengths", at="end")) == [4.0, 0.0, 0.0, 0.0]
    assert values(measured, SiteEnvironmentInformation(quantity="site-environment-information", at="end")) == [0.0]


def test_an_edge_bath_fills_up_and_measures_nothing() -> None:
    bath = Ensemble.of("edge-bath", sites=4, layers=200)
    assert values(bath, GlobalEntropy(quantity="global-entropy")) == [4.0]
    (row,) = trajectory_values(bath, [OutcomeRandomness(quantity="outcome-randomness", cumulative=True)], 0)[0][
        "values"
    ]
    assert (row["numerator"], row["denominator"]) == (0, 0)


def values(ensemble: Ensemble, observation: Any) -> list[float]:
    return [row["value"] for row in trajectory_values(ensemble, [observation], 0)[0]["values"]]
