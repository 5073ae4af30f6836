"""A sweep over the same circuits that observes what the cost of an experiment needs."""

from collections.abc import Iterable, Mapping, Sequence
from itertools import groupby
from math import prod
from typing import Any

from pydantic import TypeAdapter

from sweepmill.axes import normal_number
from sweepmill.coordinates import accumulator_bytes
from sweepmill.ensemble import LAYERED, Ensemble
from sweepmill.errors import SweepmillError
from sweepmill.frozen import thaw
from sweepmill.language.written import circuit_toml
from sweepmill.observation import Observation
from sweepmill.sweep import Sweep

TRAJECTORIES = 2000
DEPTHS = (12, 8, 6)
"""Numbers of depths to try, from most to least, until their histograms fit."""
FITS = 1_048_576
"""Bytes that a total of one ensemble and observation may have where nobody set another limit."""


def companion(ensembles: Iterable[Ensemble]) -> dict[str, Any]:
    """The specification of the companion: the same ensembles by key, random outcomes as a series of depths.

    Plain data. Histograms are kept as far as their totals stay small. Raises SweepmillError without ensembles, and
    where those given are of another revision.
    """
    found = list(ensembles)
    if not found:
        raise SweepmillError("no circuits to observe: give the key of the sweep or its specification")
    blocks = [block for _, group in groupby(found, _alike) for block in _blocks(list(group))]
    sweep = {"circuit": blocks, "observe": _observed(found), "stop": {"trajectories": TRAJECTORIES}}
    if {one.key for one in found} != {point.ensemble.key for point in Sweep.parse(sweep).points}:
        raise SweepmillError("the circuits are of an older revision: submit their sweep again first")
    return sweep


def as_toml(specification: Mapping[str, Any]) -> str:
    """A specification as somebody would write it."""
    blocks = [circuit_toml(block).replace("[circuit]", "[[circuit]]", 1) for block in specification["circuit"]]
    observed = [circuit_toml(one).replace("[circuit]", "[[observe]]", 1) for one in specification["observe"]]
    stop = circuit_toml(specification["stop"]).replace("[circuit]", "[stop]", 1)
    return "\n\n".join([*blocks, *observed, stop]) + "\n"


def _observed(ensembles: Sequence[Ensemble]) -> list[dict[str, Any]]:
    """Laws at all depths if they fit, else at the end, else means alone; and what a region is entangled by."""
    entropy = {"quantity": "entropy", "at": "end" if any(one.layers < one.cell for one in ensembles) else "last-cell"}
    end = {"quantity": "entropy", "name": "entropy-at-the-end", "at": "end"}
    rotated = any(one.family == "rotated-clifford" for one in ensembles)  # whose laboratory holds the end alone
    return [*_records(ensembles), entropy, *([end] if rotated else [])]


def _records(ensembles: Sequence[Ensemble]) -> list[dict[str, Any]]:
    all_series = [{"quantity": "record-bits", "at": {"log_spaced": n, "single_layers": True}} for n in DEPTHS]
    end = {"quantity": "record-bits", "name": "at-the-end", "at": "end", "histogram": True}
    if min(one.layers for one in ensembles) < 2:
        return [{**end, "name": "record-bits"}]
    for series in all_series:
        if _fits(whole := {**series, "histogram": True}, ensembles):
            return [whole]
    return [all_series[0], end] if _fits(end, ensembles) else [all_series[0]]


def _fits(observed: Mapping[str, Any], ensembles: Sequence[Ensemble]) -> bool:
    observation = TypeAdapter[Any](Observation).validate_python(observed)
    return max(accumulator_bytes(one, observation) for one in ensembles) <= FITS


def _alike(ensemble: Ensemble) -> tuple[str, float | None]:
    """What blocks with axes have in common: the family and the layers per site; circuits as data stand alone."""
    if ensemble.family == LAYERED:
        return ensemble.key, None
    return ensemble.family, ensemble.layers / ensemble.sites


def _blocks(ensembles: Sequence[Ensemble]) -> list[dict[str, Any]]:
    """One block with axes if the ensembles are a product, else one for each."""
    forms = [thaw(one.normal_form()) for one in ensembles]
    for form in forms:
        del form["revision"]
    names = list(dict.fromkeys(name for form in forms for name in form))
    if len(forms) == 1 or any(set(form) != set(names) for form in forms):
        return forms
    axes = {name: list(dict.fromkeys(form[name] for form in forms)) for name in names}
    block = {name: values if len(values) > 1 else values[0] for name, values in axes.items()}
    if len(axes["layers"]) > 1 and "sites" in axes:
        block["layers"] = {"per_site": normal_number(ensembles[0].layers / ensembles[0].sites)}
    sizes = [len(value) for value in block.values() if isinstance(value, list)]
    return [block] if prod(sizes) == len(forms) else forms
