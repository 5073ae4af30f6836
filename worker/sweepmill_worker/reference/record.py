"""What a signed trajectory remembers: its measurements, and how probable they were."""

from dataclasses import dataclass, field


@dataclass(frozen=True)
class Measurement:
    """One recorded measurement of a Pauli product."""

    layer: int
    """Number of the layer; 0 and below in the layers before the numbered ones."""
    sites: tuple[int, ...]
    letters: str
    """One of X, Y, Z per site."""
    outcome: int
    """0 for the eigenvalue +1, 1 for -1."""
    random: bool
    """Whether both outcomes were possible; each then had probability 1/2."""


@dataclass
class Record:
    """All measurements so far, in their order, and the forced outcomes apart from them."""

    measurements: list[Measurement] = field(default_factory=list)
    halved: int = 0
    """Forced outcomes +1 that had probability 1/2."""
    impossible: int = 0
    """Forced outcomes +1 that had probability 0; -1 took their place."""

    @property
    def log2_probability(self) -> int:
        """Of the recorded outcomes, given the circuit and its forced outcomes: minus the number of random ones."""
        return -sum(one.random for one in self.measurements)

    @property
    def log2_forced(self) -> int:
        """Of the forced outcomes; an impossible one counts as certain, as it is in another Pauli frame."""
        return -self.halved
