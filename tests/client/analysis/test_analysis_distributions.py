"""Distributions, their errors, exact laws and tests of agreement. Seeds are fixed; false alarms are stated."""

from fractions import Fraction
from math import prod
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from matplotlib.patches import Rectangle, StepPatch
from scipy import stats

from support.budget import SHARES
from sweepmill import Ensemble, SharedTrajectories, Table
from sweepmill.analysis import (
    Distribution,
    ExactLaw,
    against_law,
    between,
    distributions,
    random_stabilizer_entropy,
    stabilizer_law_of,
)
from sweepmill.analysis.plot_distributions import plot_distributions
from sweepmill.observation import Entropy, OutcomeRandomness
from sweepmill_worker.kept import unpack
from sweepmill_worker.sample import sample

RANDOM = np.random.default_rng(4)


def counted(inside: int, outside: int) -> list[Fraction]:
    """The law by counting isotropic subspaces of both parts and symplectic matchings of the rest.

    Exact entanglement probability distribution of bi-partite randomised stabilizer states, Quantum Information and
    Computation 6, 527 (2006), arXiv:quant-ph/0511119.
    """

    def subspaces(n: int, m: int) -> Fraction:
        return prod((Fraction(2 ** (2 * n - i) - 2**i, 2**m - 2**i) for i in range(m)), start=Fraction(1))

    def matchings(k: int) -> int:
        return int(2 ** (k * k) * prod(4**i - 1 for i in range(1, k + 1)))

    states = prod(2**i + 1 for i in range(1, inside + outside + 1))
    return [
        subspaces(inside, inside - k) * subspaces(outside, outside - k) * matchings(k) / states
        for k in range(min(inside, outside) + 1)
    ]


@pytest.mark.parametrize(("inside", "outside"), [(1, 1), (1, 2), (2, 2), (1, 3), (3, 3), (2, 7), (8, 8), (0, 3)])
def test_the_law_of_random_stabilizer_states_is_the_counted_one(inside: int, outside: int) -> None:
    law = random_stabilizer_entropy(inside, outside)
    exact = counted(inside, outside)
    assert sum(exact) == 1
    np.testing.assert_allclose(law.probabilities, [float(one) for one in exact], rtol=1e-12)
    # mean purity (d_A + d_B)/(d_A d_B + 1) of any 2-design: Typical entanglement of stabilizer states, Physical
    # Review A 74, 062314 (2006), arXiv:quant-ph/0510232 (from memory)
    purity = (2.0**inside + 2.0**outside) / (2.0 ** (inside + outside) + 1)
    assert law.probabilities @ 2.0**-law.values == pytest.approx(purity, rel=1e-12)


def test_means_of_the_law_are_the_quoted_ones() -> None:
    # 2/5, 2/3, 62/51, 14/17 by hand from the formula above; half of a long chain lacks 0.850179831 bits
    for (inside, outside), mean in {(1, 1): 2 / 5, (1, 2): 2 / 3, (2, 2): 62 / 51, (1, 3): 14 / 17}.items():
        assert random_stabilizer_entropy(inside, outside).mean == pytest.approx(mean, rel=1e-13)
    assert 512 - random_stabilizer_entropy(512, 512).mean == pytest.approx(0.850179831, abs=1e-9)


def test_a_deep_circuit_without_measurements_has_the_law_and_a_measured_one_has_not() -> None:
    item = Entropy(quantity="entropy", at="end", keep_values=True)
    p_values = []
    for rate in (0, 0.02):
        ensemble = Ensemble.of("hybrid-clifford", sites=8, measurement_rate=rate, layers=64)
        values = unpack(sample(ensemble, [item], 0, 4000).values[item.key].data)[:, 0, 0]
        p_values.append(against_law(Distribution.of_trajectories(values), stabilizer_law_of(ensemble, item)).p_value)
    assert p_values[0] > SHARES["random-stabilizer-states"] / 2
    assert p_values[1] < 1e-6


def test_the_law_is_refused_where_it_says_nothing() -> None:
    chain = Ensemble.of("hybrid-clifford", sites=8, measurement_rate=0, layers=8)
    mixed = Ensemble.of("hybrid-clifford", sites=8, measurement_rate=0, layers=8, initial_state="mixed")
    cuts = Entropy(quantity="entropy", region="every-cut")
    assert stabilizer_law_of(chain, cuts, 3).name == "random stabilizer states, 3 of 8 qubits"
    assert stabilizer_law_of(chain, Entropy(quantity="entropy", region=[1, 5])).name.startswith("random stabilizer")
    for ensemble, item, said in (
        (chain, OutcomeRandomness(quantity="outcome-randomness"), "entropy of one region"),
        (mixed, Entropy(quantity="entropy"), "pure states"),
        (chain, cuts, "say which position"),
    ):
        with pytest.raises(ValueError, match=said):
            stabilizer_law_of(ensemble, item)
    with pytest.raises(ValueError, match="no fewer than 0 qubits"):
        random_stabilizer_entropy(-1, 3)


def test_shares_have_binomial_errors_where_trajectories_are_read_once() -> None:
    one = Distribution.of_trajectories(RANDOM.binomial(5, 0.4, size=6400))
    assert one.shares.sum() == pytest.approx(1, rel=1e-14)
    binomial = np.sqrt(one.shares * (1 - one.shares) / 6400)
    # 64 folds know an error to 9 %: 6 of that, at each of 6 values
    np.testing.assert_allclose(one.errors, binomial, rtol=0.54)
    assert one.mean().value == pytest.approx(2.0, abs=6 * np.sqrt(1.2 / 6400))


def twice(values: Any) -> Distribution:
    """Every trajectory read two times with the same result: half as many draws as there are readings."""
    one = Distribution.of_trajectories(values)
    return Distribution.of(one.values, 2 * one.occurrences, one.trajectories)


def test_p_values_of_true_laws_are_uniform_also_where_readings_are_correlated() -> None:
    # Kolmogorov's test of 200 p-values each; false-alarm probability 1e-7 each
    law = random_stabilizer_entropy(4, 4)
    draws = [RANDOM.choice(law.values, p=law.probabilities, size=(2, 400)) for _ in range(200)]
    tests = {
        "one": [against_law(Distribution.of_trajectories(a), law) for a, _ in draws],
        "two": [between(Distribution.of_trajectories(a), Distribution.of_trajectories(b)) for a, b in draws],
        "one, read twice": [against_law(twice(a), law) for a, _ in draws],
        "two, read twice": [between(twice(a), twice(b)) for a, b in draws],
    }
    for name, found in tests.items():
        assert stats.kstest([one.p_value for one in found], "uniform").pvalue > 1e-7, name
        assert {one.kind for one in found} == {"Hotelling T2" if "twice" in name else "chi2"}


def test_other_laws_are_told_apart() -> None:
    law, other = random_stabilizer_entropy(4, 4), random_stabilizer_entropy(4, 5)
    a, b = (RANDOM.choice(one.values, p=one.probabilities, size=4000) for one in (law, other))
    assert against_law(Distribution.of_trajectories(b), law).p_value < 1e-10
    assert between(Distribution.of_trajectories(a), Distribution.of_trajectories(b)).p_value < 1e-10
    assert against_law(twice(b), law).p_value < 1e-6


def test_one_value_that_a_law_does_not_have_refutes_it() -> None:
    found = against_law(Distribution.of_trajectories([0, 1, 2, 7, 7]), random_stabilizer_entropy(4, 4))
    assert (found.impossible, found.p_value) == (2, 0.0)
    assert "2 occurrences of values that the law does not have" in str(found)


def test_rare_values_are_put_together_and_a_single_group_says_nothing() -> None:
    law = ExactLaw(np.arange(4.0), np.array([0.001, 0.499, 0.499, 0.001]), "even")
    assert against_law(Distribution.of_trajectories([1, 2] * 50), law).bins == 2
    found = against_law(Distribution.of_trajectories([1, 2]), law)
    assert (found.dof, str(found)) == (0, "only one value is frequent enough: nothing to compare")


def test_distributions_of_one_ensemble_are_not_compared() -> None:
    a, b = (Distribution.of_trajectories([0, 1, 1, 2], key="5a" * 32) for _ in range(2))
    with pytest.raises(SharedTrajectories):
        between(a, b)


@pytest.mark.parametrize(
    ("values", "occurrences", "said"),
    [
        ([0, 1], [[1] * 4], "occurrences must have shape"),
        ([0, 0], [[1] * 4] * 2, "given twice"),
        ([0, 1], [[0] * 4] * 2, "must have occurred"),
        ([0, 1], [[0.5] * 4] * 2, "are counts"),
    ],
)
def test_what_is_no_distribution_is_refused(values: list[int], occurrences: list[list[int]], said: str) -> None:
    with pytest.raises(ValueError, match=said):
        Distribution.of(values, occurrences)


def table(**changes: Any) -> Table:
    columns: dict[str, list[Any]] = {
        "sites": [4, 4, 8],
        "name": ["s", "s", "s"],
        "layer": [2, 3, None],
        "position": [None, None, None],
        "value": [1, 0, 2],
        "occurrences": [8, 8, 16],
        "by_fold": [[2] * 4, [2] * 4, [4] * 4],
    }
    ensembles = [
        {"key": "a" * 64, "rows": [0, 2], "observations": {"k": {"trajectories": [0, 8]}}},
        {"key": "b" * 64, "rows": [2, 3], "observations": {"k": {"trajectories": [0, 8]}}},
    ]
    return Table(columns | changes, {"observations": {"s": "k"}, "ensembles": ensembles})


def test_a_table_of_histograms_by_fold_becomes_distributions() -> None:
    found = list(distributions(table()))
    assert [one.label for one in found] == ["sites = 4, layer = 2", "sites = 4, layer = 3", "sites = 8"]
    assert [one.readings for one in found] == [1, 1, 2]
    with pytest.raises(ValueError, match="choose one observation of s, t"):
        list(distributions(table(name=["s", "t", "s"])))
    plain = table()
    with pytest.raises(ValueError, match="folds=True"):
        list(distributions(Table({n: plain.values(n) for n in plain.columns if n != "by_fold"}, plain.metadata)))


def test_figures_show_the_shares_themselves(tmp_path: Path) -> None:
    law = random_stabilizer_entropy(3, 3)
    a, b = (Distribution.of_trajectories(RANDOM.choice(law.values, p=law.probabilities, size=300)) for _ in range(2))
    figure = plot_distributions([a], tmp_path / "one.png", "S", laws=[law])
    assert (tmp_path / "one.png").stat().st_size > 10_000
    heights = [bar.get_height() for bar in figure.axes[0].patches if isinstance(bar, Rectangle)]
    assert heights == a.shares.tolist()
    assert figure.axes[1].get_title(loc="left") == "difference from the law"
    for found, title in (([a, b], "all trajectories minus all trajectories"), ([a, b, a], "the same, logarithmic")):
        figure = plot_distributions(found, None, "S")
        steps = [patch for patch in figure.axes[0].patches if isinstance(patch, StepPatch)]
        assert len(steps) == len(found)
        assert sum(steps[0].get_data()[0]) == pytest.approx(1)
        assert figure.axes[1].get_title(loc="left") == title
    with pytest.raises(ValueError, match="nothing to draw"):
        plot_distributions([], None, "S")
