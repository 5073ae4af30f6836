"""Kept values: what is packed comes back, and the values of a batch make its accumulators."""

import tracemalloc
import zlib
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from hypothesis.extra.numpy import array_shapes, arrays

from support.specs import small
from sweepmill.accumulate import Accumulator
from sweepmill.coordinates import coordinates, kept_bytes
from sweepmill.ensemble import Ensemble
from sweepmill.observation import Observation
from sweepmill.sweep import Sweep
from sweepmill_worker.kept import BATCH_BYTES, narrowed, pack, unpack
from sweepmill_worker.memory import KEPT_COPIES, peak_bytes
from sweepmill_worker.sample import sample, sample_plain, trajectory_values

LIMITS = [2**7, 2**8, 2**15, 2**16, 2**31, 2**40, 2**62]
OBSERVED: list[dict[str, Any]] = [
    {"quantity": "entropy", "at": "end", "histogram": True},
    {"quantity": "entropy", "name": "cuts", "region": "every-cut", "at": {"every": 4}},
    {"quantity": "entropy", "name": "intervals", "region": "every-interval", "average_translations": True},
    {"quantity": "tripartite-information", "average_translations": True},
    {"quantity": "record-bits", "at": [3, 8], "histogram": True},
    {"quantity": "outcome-randomness", "at": {"every": 2}},
    {"quantity": "generator-lengths", "at": "end"},
]


@st.composite
def integers(draw: st.DrawFn) -> Any:
    limit = draw(st.sampled_from(LIMITS))
    shape = draw(array_shapes(min_dims=3, max_dims=3, max_side=5))
    return draw(arrays(np.int64, shape, elements=st.integers(-limit, limit)))


@settings(max_examples=80, deadline=None)
@given(integers())
def test_what_is_packed_comes_back_and_equal_integers_have_equal_bytes(values: Any) -> None:
    chunk = pack(values)
    assert np.array_equal(unpack(chunk.data), values)
    assert pack(narrowed(values)) == chunk


def test_extreme_integers_survive() -> None:
    values = np.array([[[-(2**63)], [2**63 - 1]], [[0], [-1]]])
    assert np.array_equal(unpack(pack(values).data), values)


def test_other_bytes_are_refused() -> None:
    data = pack(np.arange(12).reshape(4, 3)).data
    for damaged in (b"", b"SMA1" + data[4:], data[:-3], data[:28] + zlib.compress(bytes(11))):
        with pytest.raises(ValueError, match="kept values"):
            unpack(damaged)


def observed() -> tuple[Ensemble, list[Observation]]:
    observe = [{**item, "keep_values": True} for item in OBSERVED] + [{"quantity": "entropy", "name": "plain"}]
    sweep = Sweep.parse(small(circuit__sites=8, circuit__measurement_rate=0.2, observe=observe))
    return sweep.points[0].ensemble, [item.observation for item in sweep.observations]


def test_the_values_of_a_batch_make_its_accumulators() -> None:
    ensemble, observations = observed()
    batch = sample(ensemble, observations, 70, 300)
    assert set(batch.values) == {item.key for item in observations if item.keep_values}
    for item in observations:
        if item.keep_values:
            values = unpack(batch.values[item.key].data)
            single = values if getattr(item, "histogram", False) else None
            assert Accumulator.from_values(values, 70, single) == batch.accumulators[item.key]


def test_values_do_not_depend_on_blocks_and_batches(monkeypatch: pytest.MonkeyPatch) -> None:
    ensemble, observations = observed()
    whole = sample(ensemble, observations, 0, 100).values
    parts = [sample(ensemble, observations, first, 25).values for first in (0, 25, 50, 75)]
    monkeypatch.setattr("sweepmill_worker.memory.BLOCK_BYTES", 50_000)
    assert sample(ensemble, observations, 0, 100).values == whole
    for key, chunk in whole.items():
        together = np.concatenate([unpack(part[key].data) for part in parts])
        assert np.array_equal(together, unpack(chunk.data))


def test_kept_values_are_those_of_the_trajectory_recomputed() -> None:
    ensemble, observations = observed()
    kept = [item for item in observations if item.keep_values]
    values = sample_plain(ensemble.normal_form(), [item.normal_form() for item in kept], 17, 3)["values"]
    for item, again in zip(kept, trajectory_values(ensemble, kept, 18), strict=True):
        row = unpack(values[item.key][0])[1]
        places = coordinates(ensemble, item)
        if item.COMPONENTS == 2:
            assert row.tolist() == [[one["numerator"], one["denominator"]] for one in again["values"]]
        else:
            shown = [value / place.scale for (value,), place in zip(row.tolist(), places, strict=True)]
            assert shown == [one["value"] for one in again["values"]]


def test_values_take_no_more_than_is_predicted_and_compressed_less() -> None:
    ensemble, observations = observed()
    batch = sample(ensemble, observations, 0, 2000)
    for item in observations:
        predicted = 2000 * kept_bytes(ensemble, item)
        assert (predicted > 0) == item.keep_values
        if item.keep_values:
            assert 0 < len(batch.values[item.key].data) < predicted


def test_packing_the_values_of_a_batch_allocates_no_more_than_is_said() -> None:
    draw = np.random.default_rng(3)
    parts = [narrowed(draw.integers(-100, 100, size=(1000, 500))) for _ in range(BATCH_BYTES // 500_000)]
    held = sum(part.nbytes for part in parts)
    tracemalloc.start()
    pack(np.concatenate(parts))
    _, peak = tracemalloc.get_traced_memory()
    tracemalloc.stop()
    assert held == BATCH_BYTES
    assert held + peak <= KEPT_COPIES * BATCH_BYTES


def test_what_a_batch_needs_of_a_worker_includes_its_values() -> None:
    ensemble, observations = observed()
    plain = [item.model_copy(update={"keep_values": False}) for item in observations]
    assert peak_bytes(ensemble, observations) == peak_bytes(ensemble, plain) + KEPT_COPIES * BATCH_BYTES
