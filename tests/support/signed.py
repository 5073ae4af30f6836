"""Entropies of signed stabilizer rows, by ranks of what they are outside a region."""

from collections.abc import Sequence

import numpy as np
import stim

from support.stim_oracle import rank


def entropies(stabilizers: Sequence[stim.PauliString], qubits: int, regions: Sequence[Sequence[int]]) -> list[int]:
    """In bits. `stabilizers`: independent generators on `qubits` qubits of a pure or mixed state.

    A region's entropy is its size minus the generators that live on it alone, which are all of them less the rank of
    their restrictions to the rest. Source: Entanglement in the stabilizer formalism, quant-ph/0406168.
    """
    columns = [_integers(bits) for bits in zip(*(one.to_numpy() for one in stabilizers), strict=True)]
    if not columns:
        return [len(region) for region in regions]
    return [
        len(region)
        - len(stabilizers)
        + rank(part[site] for part in columns for site in range(qubits) if site not in set(region))
        for region in regions
    ]


def _integers(bits: Sequence[np.ndarray]) -> list[int]:
    return [int.from_bytes(np.packbits(column).tobytes(), "big") for column in np.array(bits).T]
