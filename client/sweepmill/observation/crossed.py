"""Do two initial states leave the same records?"""

from typing import Final, Literal

from sweepmill.ensemble import Ensemble
from sweepmill.observation.base import BaseObservation
from sweepmill.observation.engines import CLUSTERS
from sweepmill.observation.regions import Fault

CHI_UNIT: Final = 2**30
"""Without signs chi is counted in this fraction of 1; a smaller power of two is 0, an error below 1e-9."""

NO_RECORDS = "outcomes are forced, so that the record has no probability in which two initial states could differ"


class CrossEntropy(BaseObservation):
    """chi = sum_m p(m) q(m) / sum_m q(m)^2 over records m: p from the circuit's initial state, q from ``against``.

    Source: Cross entropy benchmark for measurement-induced phase transitions, Physical Review Letters 130, 220404
    (2023). The record is that of all measurements up to the layer that is read. Gates and measured places are given:
    every circuit has its chi, and the mean over trajectories averages it over circuits.

    The records that a Clifford circuit allows from a stabilizer state are equally probable, 2^-b each for b random
    outcomes, so that q(m) / sum_m q(m)^2 is 1 for the records that are possible from ``against`` and 0 for all others:
    chi is the probability that a record is possible from ``against``, too.

    - engine = "reference" has a record m: its value is 1 if every outcome that is certain from ``against`` agrees with
      m, else 0. Its mean over records is chi, as an experiment would estimate it.
    - Without signs there is no record, and the value is chi itself. The possible records are an affine space over
      GF(2), as large as the parities of outcomes that the initial state fixes leave it: a parity is fixed if it is,
      carried back to the start, a Pauli product that stabilizes the initial state. Products of Z and products of X
      have only the identity in common. So among the records from zeros those that are possible from plus are a
      fraction 2^-n, where n counts the parities that plus fixes beyond those that every initial state fixes:
      n = (random outcomes from the maximally mixed state) - (random outcomes from plus).
      The same n, in bits, is what the record tells about which of the 2^L product states of the basis of ``against``
      the circuit began with. From a maximally mixed initial state chi is the same.

    Whatever ``before`` resets is alike in both: with all sites reset but one, the two states are those of one encoded
    qubit, and chi is 1 or 1/2.
    """

    quantity: Literal["cross-entropy"]
    against: Literal["zeros", "plus"]

    def region_label(self) -> str:
        return f"against {self.against}"

    def _region_fault(self, ensemble: Ensemble) -> Fault | None:
        if self.against == ensemble.initial_state:
            return "against", f"the circuit begins in {self.against}, too: two different initial states are compared"
        if ensemble.forcing:
            return "quantity", NO_RECORDS
        if ensemble.signed:
            return None
        if ensemble.family == CLUSTERS:
            return "quantity", 'clusters begin in plus only: cross-entropy needs engine = "reference" or a layered form'
        if ensemble.measures_before:
            return "quantity", 'the record begins in `before`: cross-entropy needs engine = "reference"'
        return None
