"""The pure core: ``sample`` depends on nothing but its arguments.

No database, no network, no clock in the result, no global state. Trajectory k draws all its randomness from
(ensemble key, k), so any split into batches accumulates the same integers.
"""

import platform
import time
from collections.abc import Mapping, Sequence
from functools import cache
from importlib.metadata import version
from typing import Any

import numpy as np
from numpy.typing import NDArray

from sweepmill.accumulate import Accumulator, merged
from sweepmill.coordinates import coordinates
from sweepmill.ensemble import Ensemble
from sweepmill.observation import observation_from_normal_form
from sweepmill.revisions import FAMILY_REVISIONS, results_revision
from sweepmill_worker.batch import Batch
from sweepmill_worker.engines import PROGRAM, engine_of
from sweepmill_worker.kept import narrowed, pack
from sweepmill_worker.memory import block_size, plan_of, read_layers, times_of
from sweepmill_worker.observables.plan import ProbePlan
from sweepmill_worker.observables.values import Values, values_of
from sweepmill_worker.warm import load


def sample(ensemble: Ensemble, observations: Sequence[Any], first: int, count: int) -> Batch:
    """Sample trajectories [first, first + count) and accumulate every observation exactly, keeping values where asked.

    Raises ValueError for a range that is empty or negative, for an ensemble of another family revision and for an
    observation the ensemble does not have.
    """
    _check(ensemble, observations, first, count)
    plan, block = plan_of(ensemble, observations), block_size(ensemble, observations)
    parts: list[list[Accumulator]] = [[] for _ in observations]
    kept: list[list[NDArray[np.signedinteger]]] = [[] for _ in observations]
    for start in range(first, first + count, block):
        read = _read(ensemble, observations, plan, start, min(start + block, first + count) - start)
        for item, part, values, held in zip(observations, parts, read, kept, strict=True):
            part.append(Accumulator.from_values(values.raw, start, values.single))
            if item.keep_values:
                held.append(narrowed(values.raw))
    accumulators = {item.key: merged(part) for item, part in zip(observations, parts, strict=True)}
    chunks = {item.key: pack(np.concatenate(held)) for item, held in zip(observations, kept, strict=True) if held}
    return Batch(ensemble.key, first, count, accumulators, chunks)


def sample_plain(
    ensemble_form: Mapping[str, Any], observation_forms: Sequence[Mapping[str, Any]], first: int, count: int
) -> dict[str, Any]:
    """``sample`` with plain values in and out: what the pool runs, imported by name.

    ``seconds`` is the CPU time this process spent, in seconds.
    """
    started = time.process_time()
    observations = [observation_from_normal_form(form) for form in observation_forms]
    batch = sample(Ensemble.from_normal_form(ensemble_form), observations, first, count)
    return {
        "ensemble": batch.ensemble,
        "first": first,
        "count": count,
        "accumulators": {key: item.to_bytes() for key, item in batch.accumulators.items()},
        "digests": {key: item.digest for key, item in batch.accumulators.items()},
        "values": {key: tuple(chunk) for key, chunk in batch.values.items()},
        "seconds": time.process_time() - started,
        "versions": versions(),
        "results_revision": results_revision(),
    }


def trajectory_values(ensemble: Ensemble, observations: Sequence[Any], k: int) -> list[dict[str, Any]]:
    """Values of one trajectory, recomputed: per observation and coordinate a value, or numerator and denominator."""
    _check(ensemble, observations, k, 1)
    plan = plan_of(ensemble, observations)
    return [
        {"observation": item.normal_form(), "values": _coordinate_values(ensemble, item, values)}
        for item, values in zip(observations, _read(ensemble, observations, plan, k, 1), strict=True)
    ]


@cache
def versions() -> dict[str, str]:
    """Versions of everything that could change a result, for provenance."""
    names = ("sweepmill", "numpy", "numba", "stim")
    return {"python": platform.python_version(), **{name: version(name) for name in names}}


def _check(ensemble: Ensemble, observations: Sequence[Any], first: int, count: int) -> None:
    if first < 0 or count < 1:
        raise ValueError(f"a batch starts at 0 or later and has at least one trajectory, got {first} and {count}")
    if not observations:
        raise ValueError("a batch needs at least one observation")
    if ensemble.revision != FAMILY_REVISIONS[ensemble.family]:
        current = FAMILY_REVISIONS[ensemble.family]
        raise ValueError(f"{ensemble.family} has revision {current} here, the ensemble {ensemble.revision}")
    for item in observations:
        if fault := item.fault(ensemble):
            raise ValueError(f"{item.quantity}.{fault[0]}: {fault[1]}")


def _read(ensemble: Ensemble, observations: Sequence[Any], plan: ProbePlan, first: int, count: int) -> list[Values]:
    times = times_of(ensemble, observations)
    layers = read_layers(times, plan)
    engine = engine_of(ensemble)
    for job in {engine.kernels, PROGRAM.kernels} if plan.probes.against else {engine.kernels}:
        load(job, ensemble.sites + ensemble.references)
    counts = engine.read(ensemble, first, count, layers, plan.probes)
    index = {n: i for i, n in enumerate(layers)}
    return [
        values_of(item, counts, when, index, indices, signs)
        for item, when, indices, signs in zip(observations, times, plan.indices, plan.signs, strict=True)
    ]


def _coordinate_values(ensemble: Ensemble, item: Any, values: Values) -> list[dict[str, Any]]:
    rows = []
    for place, raw in zip(coordinates(ensemble, item), values.raw[0].tolist(), strict=True):
        row: dict[str, Any] = {"layer": place.layer, "position": place.position}
        if item.COMPONENTS == 2:
            row |= {"numerator": raw[0], "denominator": raw[1]}
        else:
            row["value"] = raw / place.scale
        rows.append(row)
    return rows
