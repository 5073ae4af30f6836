"""The false-alarm budget of the statistical tests.

All statistical tests of the suite together fail by chance with probability at most 1e-3 (seeds are fixed, so this is
the probability that a correct program was given an unlucky seed).  Each test spends one named share, divided evenly
among its comparisons (Bonferroni's inequality, common practice).
"""

from typing import Final

from scipy.stats import chi2, norm

TOTAL: Final = 1e-3

SHARES: Final[dict[str, float]] = {
    "exact-chains": 1e-4,
    "tripartite": 5e-5,
    "purification": 5e-5,
    "purity-recursion": 5e-5,
    "page-law": 5e-5,
    "monte-carlo": 5e-5,
    "word-frequencies": 5e-5,
    "pulls": 1e-4,
    "sample": 5e-5,
    "error-bars": 5e-5,
    "ising": 8e-5,
    "edge-bath": 5e-5,
    "rotated": 1e-4,
    "square-and-long-range": 5e-5,
    "references": 5e-5,
    "cross-entropy": 1e-6,
    "paid": 2e-6,
    "averaged-state": 5e-7,
    "crossed-percolation": 5e-7,
    "random-stabilizer-states": 2e-6,
    "analysis": 6e-5,  # spent by the thresholds stated in tests/client/analysis
    "design": 1.8e-6,  # spent by the thresholds stated in tests/client/analysis/test_design_*.py
    "published": 2e-6,  # spent by the thresholds stated in tests/client/**/test_published*.py
}


def z_limit(share: str, comparisons: int) -> float:
    """Largest |z| that passes when `comparisons` normal deviates are compared under one share."""
    return float(norm.isf(SHARES[share] / comparisons / 2))


def chi_square_limit(share: str, comparisons: int, degrees: int) -> float:
    """Largest chi-square with so many degrees of freedom that passes under one share."""
    return float(chi2.isf(SHARES[share] / comparisons, degrees))
