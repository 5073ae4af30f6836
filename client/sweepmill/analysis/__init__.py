"""From tables to physics: critical points, entanglement laws, exponents, and whether a circuit was deep enough.

from sweepmill.analysis import Points, fit_collapse

points = Points.from_table(table.where(name="i3"), x="measurement_rate")
print(fit_collapse(points))

Everything works on `Points`: means with errors and, where there are any, jackknife replicas over folds of
trajectories. A fit that does not describe its data says so and withholds its error bar. Needs the extra `analysis`.
"""

from sweepmill.extras import needing

with needing("sweepmill.analysis", "analysis"):
    import scipy  # noqa: F401

from sweepmill.analysis.collapse import Collapse, fit_collapse
from sweepmill.analysis.compare import Candidate, Comparison, fit_growth, fit_laws
from sweepmill.analysis.crossings import Crossings, fit_crossings
from sweepmill.analysis.distribution import Distribution, distributions, distributions_of_values
from sweepmill.analysis.estimate import Estimate
from sweepmill.analysis.free_energy import CentralCharge, fit_central_charge
from sweepmill.analysis.goodness import Goodness
from sweepmill.analysis.histogram import Average, average_of, purity
from sweepmill.analysis.jackknife import jackknife_covariance, jackknife_error, replicas_from_folds
from sweepmill.analysis.laws import DECAY, ENTANGLEMENT, GROWTH, TIMES, Law, chord_length
from sweepmill.analysis.model_free import ModelFree, fit_model_free
from sweepmill.analysis.points import Points
from sweepmill.analysis.purities import Purities, mean_purities
from sweepmill.analysis.random_states import ExactLaw, random_stabilizer_entropy, stabilizer_law_of
from sweepmill.analysis.same_law import Agreement, against_law, between
from sweepmill.analysis.scaling import Scaling
from sweepmill.analysis.shapes import NaturalSpline, Polynomial
from sweepmill.analysis.steady import Steadiness, steady_yet
from sweepmill.analysis.steady_sweep import SweepSteadiness, steady_sweep
from sweepmill.analysis.tell import Need
from sweepmill.analysis.times import fit_decay, fit_times, purification_times, settling_depths, times_by_size

__all__ = [
    "DECAY",
    "ENTANGLEMENT",
    "GROWTH",
    "TIMES",
    "Agreement",
    "Average",
    "Candidate",
    "CentralCharge",
    "Collapse",
    "Comparison",
    "Crossings",
    "Distribution",
    "Estimate",
    "ExactLaw",
    "Goodness",
    "Law",
    "ModelFree",
    "NaturalSpline",
    "Need",
    "Points",
    "Polynomial",
    "Purities",
    "Scaling",
    "Steadiness",
    "SweepSteadiness",
    "against_law",
    "average_of",
    "between",
    "chord_length",
    "distributions",
    "distributions_of_values",
    "fit_central_charge",
    "fit_collapse",
    "fit_crossings",
    "fit_decay",
    "fit_growth",
    "fit_laws",
    "fit_model_free",
    "fit_times",
    "jackknife_covariance",
    "jackknife_error",
    "mean_purities",
    "purification_times",
    "purity",
    "random_stabilizer_entropy",
    "replicas_from_folds",
    "settling_depths",
    "stabilizer_law_of",
    "steady_sweep",
    "steady_yet",
    "times_by_size",
]
