"""The laboratory's circuit written as data: what `Sideways` counts, ready to be sampled or exported."""

from typing import Any

from sweepmill.experiment.sideways import Sideways

Step = dict[str, Any]


def laboratory(circuit: Sideways) -> dict[str, Any]:
    """A block of the family `layered`: sites 0 .. D are the chain, edge first, then the held slices in order."""
    layers = [_layer(circuit, number) for number in range(1, circuit.layers + 1)]
    return {
        "family": "layered",
        "sites": circuit.qubits,
        "boundary": "open",
        "before": [_start(circuit)],
        "repeat": layers,
        "layers": len(layers),
    }


def laboratory_sweep(circuit: Sideways) -> dict[str, Any]:
    """A specification, as plain data, that samples the entropy of the held slices in the laboratory's circuit."""
    observed = {"quantity": "entropy", "region": held_sites(circuit), "at": "end", "histogram": True}
    return {"circuit": [laboratory(circuit)], "observe": [observed], "stop": {"trajectories": 2000}}


def held_sites(circuit: Sideways) -> list[int]:
    """Sites of the block that hold the slices."""
    return list(range(circuit.chain, circuit.qubits))


def _start(circuit: Sideways) -> list[Step]:
    """A chain in the maximally mixed state, but for the half of a Bell pair at the edge if slice 0 is held."""
    mixed = [[site] for site in range(1 if 0 in circuit.held else 0, circuit.chain)]
    return [{"depolarise": True, "on": {"places": mixed}}, *_entering(circuit, 0)]


def _layer(circuit: Sideways, number: int) -> list[Step]:
    bonds = [[left, left + 1] for left in range((number + 1) % 2, circuit.columns, 2)]
    gates = [{"apply": "uniform-clifford", "on": {"places": bonds}}] if bonds else []
    if number % 2 == 0:
        return gates
    return [*gates, *_leaving(circuit, number), *_fresh(circuit, number)]


def _leaving(circuit: Sideways, slice_: int) -> list[Step]:
    """The output is swapped out of the edge, which leaves |0> there, or it is lost."""
    if slice_ in circuit.held:
        return [{"apply": "swap", "on": {"places": [[0, _site(circuit, slice_)]]}}]
    return [{"reset": True, "on": {"places": [[0]]}}]


def _fresh(circuit: Sideways, number: int) -> list[Step]:
    """What enters the next odd layer."""
    if number == circuit.layers:
        return []
    if number + 1 in circuit.held:
        return _entering(circuit, number + 1)
    return [{"depolarise": True, "on": {"places": [[0]]}}]


def _entering(circuit: Sideways, slice_: int) -> list[Step]:
    """Half of a Bell pair at the edge, which is in |0>; its partner is held."""
    if slice_ not in circuit.held:
        return []
    site = _site(circuit, slice_)
    return [{"apply": "h", "on": {"places": [[site]]}}, {"apply": "cx", "on": {"places": [[site, 0]]}}]


def _site(circuit: Sideways, slice_: int) -> int:
    return circuit.chain + slice_ - circuit.first
