"""What a measured Ising chain records of one encoded qubit is bond percolation.

ZZ on bonds and X on sites never tell GHZ states from product states but by the parity of all X, and that they record
if no cluster of sites joins the encoded state to the end. Then half of the records from |0...0> disagree with the GHZ
state: chi = 1 with a crossing, 1/2 without, so that its mean is (1 + crossing probability) / 2.
Source: Universality of the cross entropy in Z2 symmetric monitored quantum circuits, arXiv:2306.00058.
"""

import numpy as np
import pytest
from scipy.sparse import coo_array
from scipy.sparse.csgraph import connected_components

from support.budget import z_limit
from support.rectangles import crossing_probability
from sweepmill.coordinates import coordinates
from sweepmill.ensemble import Ensemble
from sweepmill.observation import observation_from_normal_form
from sweepmill.statistics import summarize
from sweepmill_worker.engines import program_of
from sweepmill_worker.program import operations as op
from sweepmill_worker.program.listing import operations
from sweepmill_worker.sample import sample, trajectory_values

CHI = observation_from_normal_form({"quantity": "cross-entropy", "revision": 1, "against": "plus", "at": "end"})


def chain(sites: int, rate: float, layers: int | None = None) -> Ensemble:
    """Site 0 begins in |0> or |+>, all others in |0>; encoded in the two states |0...0> and GHZ."""
    others = {"places": [[site] for site in range(1, sites)]}
    encoder = {"apply": "cx", "on": {"places": [[site, site + 1] for site in range(sites - 1)]}}
    bonds, fields = {"measure": "ZZ", "on": "bonds"}, {"measure": "X", "on": "sites"}
    return Ensemble.of(
        "layered",
        sites=sites,
        boundary="open",
        layers=layers or sites,
        before=[[{"reset": True, "on": others}], [encoder]],
        repeat=[[{**bonds, "rate": rate}, {**fields, "rate": round(1 - rate, 12)}]],
    )


def crosses(ensemble: Ensemble, k: int) -> bool:
    """Whether open bonds of trajectory k join the first row to the last one; row n is the chain after n layers."""
    sites, layers = ensemble.sites, ensemble.layers
    joined = {(site, site + 1) for site in range(sites - 1)}  # the encoded state is one cluster
    for layer in operations(program_of(ensemble), ensemble.key_words, k):
        if layer.number > 0:
            here = (layer.number - 1) * sites
            measured = [tuple(row[op.SITE : op.SITE + row[op.SITES]]) for row in layer.rows.tolist()]
            joined |= {(here + place[0], here + place[1]) for place in measured if len(place) == 2}
            kept = set(range(sites)) - {place[0] for place in measured if len(place) == 1}
            joined |= {(here + site, here + sites + site) for site in kept}
    graph = coo_array((np.ones(len(joined)), np.array(sorted(joined)).T), shape=(sites * (layers + 1),) * 2)
    labels = connected_components(graph, directed=False)[1]
    return bool(set(labels[:sites]) & set(labels[-sites:]))


@pytest.mark.parametrize(("sites", "layers", "rate"), [(4, 4, 0.5), (5, 3, 0.4), (3, 6, 0.6)])
def test_chi_of_a_trajectory_is_whether_a_cluster_crosses(sites: int, layers: int, rate: float) -> None:
    ensemble = chain(sites, rate, layers)
    found = [trajectory_values(ensemble, [CHI], k)[0]["values"][0]["value"] for k in range(25)]
    assert found == [1.0 if crosses(ensemble, k) else 0.5 for k in range(25)]
    assert len(set(found)) == 2


@pytest.mark.parametrize(("sites", "rate"), [(2, 0.4), (3, 0.4), (3, 0.45), (8, 0.5)])
def test_the_mean_of_chi_is_the_crossing_probability_of_a_self_dual_rectangle(sites: int, rate: float) -> None:
    """At rate 1/2 it is 3/4 for every size."""
    ensemble = chain(sites, rate)
    (found,) = summarize(sample(ensemble, [CHI], 0, 4000).accumulators[CHI.key], coordinates(ensemble, CHI))
    crossing = 0.5 if rate == 0.5 else crossing_probability(sites, rate)
    assert abs(found.mean - (1 + crossing) / 2) < z_limit("crossed-percolation", 4) * found.standard_error
