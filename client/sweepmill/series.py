"""Which observations of a table are series along the layers that can settle."""

from typing import Any

import numpy as np

from sweepmill.folds import Folds
from sweepmill.table import FOLDS, Table

COUNT, SHARE = "record-bits", "outcome-randomness"
NONE = "no {other}observation was read along the layers, so nothing tells whether the circuits were deep enough"


def series_names(table: Table) -> list[str]:
    """Observations that were read at several layers, but not those that count from the first layer on."""
    return [name for name in _read_along(table) if not _counts_on(table.where(name=name))]


def why_none(table: Table) -> str:
    """Why `series_names` is empty."""
    counting = _read_along(table)
    if not counting:
        return NONE.format(other="")
    counts = "counts" if len(counting) == 1 else "count"
    return f"{', '.join(counting)} {counts} from the first layer on and cannot settle; {NONE.format(other='other ')}"


def _read_along(table: Table) -> list[str]:
    layers: dict[str, set[Any]] = {}
    for name, layer in zip(table.values("name"), table.values("layer"), strict=True):
        layers.setdefault(str(name), set()).add(layer)
    return sorted(name for name, found in layers.items() if len(found) > 1)


def _counts_on(rows: Table) -> bool:
    """Whether one observation is of all layers so far: that of a share is known from folds only."""
    quantities = set(rows.values("quantity")) if "quantity" in rows else set()
    return quantities == {COUNT} or (quantities == {SHARE} and isinstance(rows, Folds) and _among_ever_more(rows))


def _among_ever_more(rows: Folds) -> bool:
    """Whether the measurements that a share is counted among grow with the layer, in every fold of every ensemble.

    Of single layers their numbers scatter, or are constant where every site is measured.
    """
    ensembles: dict[tuple[Any, ...], list[tuple[int, list[float]]]] = {}
    for row in rows.rows():
        place = row["layer"], row[FOLDS[1]]
        ensembles.setdefault(tuple(row[axis] for axis in rows.axes), []).append(place)
    among = [np.array([numbers for _, numbers in sorted(one)]) for one in ensembles.values() if len(one) > 1]
    measured = [one for one in among if one.any()]
    return bool(measured) and all(
        (np.diff(one, axis=0) >= 0).all() and one[-1].sum() > one[0].sum() for one in measured
    )
