"""All probes: the kernel against plain linear algebra on the stabilizers that stim, an independent simulator, finds."""

from dataclasses import replace

import numpy as np
import pytest
from numpy.typing import NDArray

from support.all_probes import all_probes
from support.stim_oracle import Reference
from sweepmill_worker.clifford.engine import HybridChain, describe, run_plan, run_probes
from sweepmill_worker.clifford.roads import Road, plan
from sweepmill_worker.observables.probes import Probes
from sweepmill_worker.observables.rows import read_rows

KEY = (0x5EED, 0xC0FFEE)


def of_stim(chain: HybridChain, k: int, probes: Probes, reads: list[int]) -> NDArray[np.int32]:
    """[reads, integers]; a mixed chain has as many more reference qubits as it has sites."""
    reference = Reference(chain)
    found = []
    behind = replace(probes, references=probes.references + (chain.sites if chain.mixed else 0))
    for number, layer in enumerate(describe(chain, KEY, k), start=1):
        reference.apply(layer)
        if number in reads:
            found.append(read_rows(*reference.rows(), behind))
    return np.array(found)


def compare(chain: HybridChain, k: int, probes: Probes, reads: list[int]) -> None:
    found = run_plan(chain, KEY, k, 1, reads, plan(probes, chain.mixed)).entropies[0]
    expected = of_stim(chain, k, probes, reads)
    for part in probes.layout:
        for one in part if isinstance(part, tuple) else (part,):
            np.testing.assert_array_equal(found[:, one], expected[:, one])


@pytest.mark.parametrize("mixed", [False, True])
@pytest.mark.parametrize(
    ("sites", "periodic", "rate"),
    [(2, True, 0.3), (3, False, 0.2), (5, False, 0.1), (8, True, 0.05), (8, True, 0.4), (11, False, 0.16)],
)
def test_all_probes_agree_on_small_chains(sites: int, periodic: bool, rate: float, mixed: bool) -> None:
    chain = HybridChain(sites, 14, periodic, mixed, int(rate * 2**32))
    for k in range(3):
        compare(chain, k, all_probes(sites, seed=k), [1, 2, 5, 14])


@pytest.mark.parametrize("mixed", [False, True])
@pytest.mark.parametrize(("sites", "references"), [(1, 3), (4, 1), (5, 3), (6, 6)])
def test_the_last_sites_of_a_state_may_be_reference_qubits(sites: int, references: int, mixed: bool) -> None:
    chain = HybridChain(sites + references, 10, False, mixed, int(0.1 * 2**32))
    for k in range(4):
        compare(chain, k, all_probes(sites, references, seed=k) if sites > 1 else Probes(1, references), [3, 10])


@pytest.mark.parametrize("mixed", [False, True])
@pytest.mark.parametrize("sites", [66, 140])
def test_some_probes_agree_on_chains_of_several_words(sites: int, mixed: bool) -> None:
    compare(HybridChain(sites, 30, True, mixed, int(0.08 * 2**32)), 3, all_probes(sites, seed=2, most=8), [30])


@pytest.mark.parametrize("mixed", [False, True])
@pytest.mark.parametrize("sites", [12, 70, 136, 300])
def test_sums_over_intervals_are_the_sums_of_their_entropies(sites: int, mixed: bool) -> None:
    chain = HybridChain(sites, 24, True, mixed, int(0.1 * 2**32))
    sums = run_probes(chain, KEY, 0, 2, [9, 24], Probes(sites, line=True, ring=True))
    first, length = (grid.ravel() for grid in np.meshgrid(np.arange(sites), np.arange(1, sites + 1), indexing="ij"))
    arcs = run_probes(chain, KEY, 0, 2, [9, 24], Probes(sites, arcs=np.stack([first, length], axis=1)))
    each = arcs.entropies.reshape(2, 2, sites, sites)
    np.testing.assert_array_equal(sums.entropies[..., sites:], each.sum(axis=2))
    on_line = (first + length <= sites).reshape(sites, sites)
    np.testing.assert_array_equal(sums.entropies[..., :sites], (each * on_line).sum(axis=2))


@pytest.mark.parametrize("sites", [9, 66])
def test_wrapping_arcs_of_mixed_chains_agree_with_the_commutators(sites: int) -> None:
    chain = HybridChain(sites, 20, False, True, int(0.12 * 2**32))
    arcs = np.array([(first, n) for first in range(1, sites) for n in range(sites - first + 1, sites, 5)])
    probes = Probes(sites, arcs=arcs)
    results = [
        run_plan(chain, KEY, 0, 3, [4, 20], plan(probes, True, roads)).entropies
        for roads in (frozenset(Road), frozenset[Road]())
    ]
    np.testing.assert_array_equal(results[0], results[1])


def test_reading_leaves_the_state_as_it_is() -> None:
    chain = HybridChain(10, 12, True, True, int(0.2 * 2**32))
    probes = all_probes(10)
    often = run_probes(chain, KEY, 0, 5, range(1, 13), probes)
    once = run_probes(chain, KEY, 0, 5, [12], probes)
    np.testing.assert_array_equal(often.entropies[:, -1], once.entropies[:, 0])
    np.testing.assert_array_equal(often.random, once.random)


@pytest.mark.parametrize("mixed", [False, True])
def test_entropies_are_strongly_subadditive(mixed: bool) -> None:
    """S_A + S_B >= S_(A or B) + S_(A and B), for all pairs: Journal of Mathematical Physics 14, 1938 (1973)."""
    sites = 7
    masks = np.arange(2**sites)
    regions = tuple(tuple(np.flatnonzero(mask >> np.arange(sites) & 1).tolist()) for mask in masks)
    chain = HybridChain(sites, 12, False, mixed, int(0.1 * 2**32))
    found = run_probes(chain, KEY, 0, 30, [4, 12], Probes(sites, sets=regions)).entropies
    first, second = masks[:, None], masks[None, :]
    excess = found[..., first] + found[..., second] - found[..., first | second] - found[..., first & second]
    assert excess.min() == 0
    assert excess.max() > 0
