"""Reading totals in one step gives what reading them whole gives."""

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st

from sweepmill.accumulate import Accumulator
from sweepmill.coordinates import Coordinate
from sweepmill.statistics import summarize
from sweepmill_service.export.heads import read_head


@settings(deadline=None, max_examples=60)
@given(
    count=st.integers(1, 70),
    coordinates=st.sampled_from([1, 2, 9, 257]),
    components=st.sampled_from([1, 2]),
    largest=st.sampled_from([1, 40, 2**30, 2**61]),
    seed=st.integers(0, 2**32 - 1),
)
def test_a_head_is_the_accumulator_without_its_histogram(
    count: int, coordinates: int, components: int, largest: int, seed: int
) -> None:
    values = np.random.default_rng(seed).integers(0, largest, (count, coordinates, components))
    readings = values[:, :, :1] % 5 if components == 1 else None
    whole = Accumulator.from_values(values, 3, readings)
    head = read_head(whole.to_bytes())
    places = [Coordinate(None, None, 2)] * coordinates
    assert repr(summarize(head, places)) == repr(summarize(whole, places))
    assert (head.sums.tolist(), head.fold_sums.tolist()) == (whole.sums.tolist(), whole.fold_sums.tolist())
