"""The plain linear algebra of all probes, on states whose values are known by hand, and on random ones.

Values of Bell pairs, GHZ and product states are common knowledge of the trade; the identities are named beside them.
"""

from itertools import combinations

import numpy as np
import pytest
import stim

from sweepmill_worker.observables.probes import Information, Pauli, Probes
from sweepmill_worker.observables.rows import Bits, Group, read_rows


def rows(*paulis: str, sites: int) -> tuple[Bits, Bits]:
    """X and Z parts of generators written as letters; none: the maximally mixed state."""
    strings = [stim.PauliString(pauli) for pauli in paulis]
    parts = [string.to_numpy() for string in strings]
    x, z = (np.array([part[i] for part in parts], dtype=np.uint8).reshape(-1, sites) for i in (0, 1))
    return x, z


def bell_pairs(count: int) -> tuple[Bits, Bits]:
    """Site i with site `count` + i."""
    letters = []
    for first in range(count):
        for letter in "XZ":
            word = ["_"] * (2 * count)
            word[first] = word[first + count] = letter
            letters.append("".join(word))
    return rows(*letters, sites=2 * count)


GHZ = rows("XXXX", "ZZ__", "_ZZ_", "__ZZ", sites=4)


def random_group(sites: int, rank: int, seed: int) -> Group:
    """Some rows of a random stabilizer state: a mixed state of entropy sites - rank."""
    _, _, x, z, _, _ = _scrambled(sites, seed).to_numpy()
    return Group(x[:rank].astype(np.uint8), z[:rank].astype(np.uint8))


def _scrambled(sites: int, seed: int) -> stim.Tableau:
    """A random product of two-site Clifford gates."""
    draw = np.random.default_rng(seed)
    simulator = stim.TableauSimulator(seed=seed)
    simulator.set_num_qubits(sites)
    for _ in range(4 * sites * sites):
        a, b = draw.choice(sites, 2, replace=False).tolist()
        getattr(simulator, draw.choice(["cx", "cz", "swap"]))(a, b)
        getattr(simulator, draw.choice(["h", "s", "sqrt_x"]))(a)
    return simulator.current_inverse_tableau().inverse()


@pytest.mark.parametrize("count", [1, 2, 3])
def test_bell_pairs_across_a_cut_are_worth_one_bit_each(count: int) -> None:
    half = tuple(range(count))
    probes = Probes(2 * count, arcs=np.array([[0, count]]), negativities=(half,), lengths=True)
    values = read_rows(*bell_pairs(count), probes)
    assert values[probes.layout.regions] == [count]
    assert values[probes.layout.negativities] == [count]
    # two rows for each pair, from its first site to its last
    assert values[probes.layout.lengths].tolist() == [
        2 * count * (length == count + 1) for length in range(1, 2 * count + 1)
    ]


def test_a_maximally_mixed_state_has_entropy_and_nothing_else() -> None:
    half = Information((0, 1), (2, 1))
    probes = Probes(4, line=True, ring=True, informations=(half,), negativities=((0, 1), (2,)), lengths=True)
    values = read_rows(*rows(sites=4), probes)
    assert values[probes.layout.line].tolist() == [4, 6, 6, 4]
    assert values[probes.layout.ring].tolist() == [4, 8, 12, 16]
    assert values[probes.layout.informations[0]].tolist() == [2, 2]  # its purifier holds a Bell pair with each site
    assert not values[probes.layout.negativities].any()
    assert not values[probes.layout.lengths].any()


def test_a_ghz_state_has_one_bit_everywhere_and_no_negativity_left_once_a_site_is_lost() -> None:
    whole = Information((0, 1), (1, 1))
    probes = Probes(4, line=True, informations=(whole,), negativities=((0,), (0, 3)))
    values = read_rows(*GHZ, probes)
    assert values[probes.layout.line].tolist() == [4, 3, 2, 0]
    assert values[probes.layout.informations[0]].tolist() == [2]  # S_x + S_A - S_(A without x) = 1 for both sites
    assert values[probes.layout.negativities].tolist() == [1, 1]
    lost = Probes(3, references=1, negativities=((0,), (0, 1)), sets=((3,),))
    values = read_rows(*GHZ, lost)
    assert values.tolist() == [1, 0, 0]


def test_expectations_are_passed_through_and_clusters_refused() -> None:
    probes = Probes(4, paulis=(Pauli("Z", (0,)), Pauli("XX", (0, 1))))
    assert read_rows(*GHZ, probes, [0, -1]).tolist() == [0, -1]
    with pytest.raises(ValueError, match="clusters"):
        read_rows(*GHZ, Probes(4, cluster_order=True))


@pytest.mark.parametrize("rank", [0, 3, 6])
def test_entropy_is_strongly_subadditive(rank: int) -> None:
    """S_AB + S_BC >= S_B + S_ABC: Journal of Mathematical Physics 14, 1938 (1973)."""
    for seed in range(6):
        group = random_group(6, rank, seed)
        entropy = {part: group.entropy(part) for size in range(7) for part in combinations(range(6), size)}
        for first in entropy:
            for second in entropy:
                both = tuple(sorted(set(first) | set(second)))
                shared = tuple(sorted(set(first) & set(second)))
                assert entropy[first] + entropy[second] >= entropy[both] + entropy[shared]


@pytest.mark.parametrize("seed", range(5))
def test_in_a_pure_state_half_the_generators_that_cross_a_cut_count_its_entropy(seed: int) -> None:
    """Clipped gauge: Physical Review X 7, 031016 (2017).  The lengths alone give the sum over all cuts."""
    group = random_group(7, 7, seed)
    probes = Probes(7, arcs=np.array([[0, cut] for cut in range(1, 7)]), lengths=True)
    values = read_rows(group.rows[..., 0], group.rows[..., 1], probes)
    crossings = sum((length - 1) * count for length, count in enumerate(values[probes.layout.lengths], start=1))
    assert values[probes.layout.lengths].sum() == 7
    assert crossings == 2 * values[probes.layout.regions].sum()


@pytest.mark.parametrize("seed", range(5))
def test_negativity_is_that_of_the_partial_transpose(seed: int) -> None:
    """Logarithmic negativity = log2 of the trace norm of the partial transpose: Physical Review A 65, 032314 (2002)."""
    sites, rank = 4, 1 + seed % 4
    group = random_group(sites, rank, seed)
    state = np.eye(2**sites, dtype=complex) / 2**sites
    for x, z in zip(group.rows[..., 0], group.rows[..., 1], strict=True):
        pauli = stim.PauliString.from_numpy(xs=x.astype(bool), zs=z.astype(bool))
        state = state @ (np.eye(2**sites) + pauli.to_unitary_matrix(endian="big"))
    for region in [(0,), (0, 1), (1, 3), (0, 2, 3)]:
        axes = list(range(2 * sites))
        for site in region:
            axes[site], axes[sites + site] = axes[sites + site], axes[site]
        transposed = state.reshape((2,) * (2 * sites)).transpose(axes).reshape(2**sites, 2**sites)
        norm = np.abs(np.linalg.eigvalsh(transposed)).sum()
        assert group.negativity(region) == pytest.approx(np.log2(norm), abs=1e-9)
