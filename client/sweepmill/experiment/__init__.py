"""What a laboratory would pay to see the same physics: repetitions, qubits, layers, measurements.

from sweepmill.experiment import cost_of, page, read_source

cost = cost_of(read_source(["3b9f6c1e"], client))
cost.to_dict()
Path("report.html").write_text(page(cost))

A record of r random outcomes of a Clifford circuit has probability 2^-r, whatever the outcomes were. Everything here
follows from the law of r over trajectories. Needs the extra `analysis`.
"""

from sweepmill.extras import needing

with needing("sweepmill.experiment", "analysis"):
    import scipy  # noqa: F401

from sweepmill.experiment.companion import companion
from sweepmill.experiment.cost import Cost, Options, cost_of
from sweepmill.experiment.laboratory import held_sites, laboratory, laboratory_sweep
from sweepmill.experiment.law import Law
from sweepmill.experiment.markdown import markdown
from sweepmill.experiment.page import page
from sweepmill.experiment.record import Record
from sweepmill.experiment.sideways import Sideways, sideways_circuit, window_purity
from sweepmill.experiment.source import Source, read_source
from sweepmill.experiment.spots import NoRecordBits

__all__ = [
    "Cost",
    "Law",
    "NoRecordBits",
    "Options",
    "Record",
    "Sideways",
    "Source",
    "companion",
    "cost_of",
    "held_sites",
    "laboratory",
    "laboratory_sweep",
    "markdown",
    "page",
    "read_source",
    "sideways_circuit",
    "window_purity",
]
