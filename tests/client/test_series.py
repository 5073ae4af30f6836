"""Counts from the first layer on are no series that could settle; their companion reads single layers."""

import numpy as np
import pytest

from support.folds import Made, folds_of
from sweepmill import Folds, Sweep, Table
from sweepmill.analysis import steady_sweep
from sweepmill.companion import companion
from sweepmill.coordinates import Coordinate
from sweepmill.series import series_names, why_none

LAYERS, TRAJECTORIES = 16, 640


def counted(quantity: str, cumulative: bool, name: str) -> Folds:
    """Invented measurements, four in five of them random, of single layers or of all so far."""
    rng = np.random.default_rng(7)
    among = rng.binomial(16, 0.25, (TRAJECTORIES, LAYERS))
    random = rng.binomial(among, 0.8)
    if cumulative:
        among, random = np.cumsum(among, axis=1), np.cumsum(random, axis=1)
    values = np.stack([random, among], axis=2) if quantity == "outcome-randomness" else random
    places = [Coordinate(layer, None, 1) for layer in range(1, LAYERS + 1)]
    folds = folds_of([Made({"sites": 16}, places, values.astype(np.int64))], name)
    columns = {column: folds.values(column) for column in folds.columns}
    return Folds(columns | {"quantity": [quantity] * LAYERS}, folds.metadata)


def together(*several: Table) -> Table:
    return Table({name: [value for one in several for value in one.values(name)] for name in several[0].columns})


def test_counts_from_the_first_layer_on_are_no_series() -> None:
    assert series_names(counted("record-bits", True, "bits")) == []
    assert series_names(counted("outcome-randomness", True, "share")) == []
    assert series_names(counted("outcome-randomness", False, "share")) == ["share"]


def test_beside_a_series_counts_are_not_offered() -> None:
    both = together(counted("record-bits", True, "bits"), counted("outcome-randomness", False, "share"))
    assert series_names(both) == ["share"]


def test_where_only_counts_were_read_along_the_layers_it_says_so() -> None:
    folds = counted("record-bits", True, "bits")
    assert why_none(folds).startswith("bits counts from the first layer on and cannot settle; no other observation")
    with pytest.raises(ValueError, match="bits counts from the first layer on"):
        steady_sweep(folds)
    assert why_none(folds.taken([0])).startswith("no observation was read along the layers")


def test_the_companion_of_counts_reads_single_layers() -> None:
    circuit = {"family": "hybrid-clifford", "sites": 16, "measurement_rate": 0.2, "layers": 64}
    observe = [
        {"quantity": "record-bits", "name": "bits", "at": {"every": 2}, "histogram": True},
        {"quantity": "outcome-randomness", "name": "share", "at": {"every": 2}, "cumulative": True},
    ]
    (item,) = companion(
        Sweep.parse({"circuit": circuit, "observe": observe, "stop": {"trajectories": 900}})
    ).observations
    form = item.observation.normal_form()
    assert {name: form[name] for name in form if name != "revision"} == {
        "quantity": "outcome-randomness",
        "at": {"every": 2},
    }
