"""Revisions of what the keys stand for.

A number is raised whenever the same key would give other values, so that old and new results never mix.
"""

FAMILY_REVISIONS: dict[str, int] = {
    "edge-bath": 1,
    "hybrid-clifford": 1,
    "hybrid-clifford-long-range": 1,
    "hybrid-clifford-square": 1,
    "layered": 1,
    "projective-ising": 1,
    "rotated-clifford": 1,
}

QUANTITY_REVISIONS: dict[str, int] = {
    "cluster-order": 1,
    "cross-entropy": 1,
    "entropy": 1,
    "generator-lengths": 1,
    "global-entropy": 1,
    "mutual-information": 1,
    "negativity": 1,
    "outcome-randomness": 1,
    "pauli-expectation": 1,
    "record-bits": 1,
    "reference-entropy": 1,
    "site-environment-information": 1,
    "tripartite-information": 1,
}


def all_revisions() -> dict[str, int]:
    """Family and quantity revisions in one table, families prefixed with ``family:``."""
    families = {f"family:{name}": number for name, number in FAMILY_REVISIONS.items()}
    return families | {f"quantity:{name}": number for name, number in QUANTITY_REVISIONS.items()}


def results_revision() -> str:
    """One line that changes with any revision: compared between a service and its pool."""
    return ",".join(f"{name}={number}" for name, number in sorted(all_revisions().items()))
