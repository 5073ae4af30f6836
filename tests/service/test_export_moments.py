"""Moments of many totals at once are those of one total at a time, to the last bit."""

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st

from sweepmill.accumulate import Accumulator
from sweepmill.coordinates import Coordinate
from sweepmill.statistics import summarize
from sweepmill_service.export.moments import moments_of


def total(seed: int, count: int, coordinates: int, components: int, largest: int) -> Accumulator:
    values = np.random.default_rng(seed).integers(-largest, largest + 1, (count, coordinates, components))
    readings = values[:, :, :1] % 5 if components == 1 else None
    return Accumulator.from_values(values, 3, readings)


TOTALS = st.builds(
    total,
    seed=st.integers(0, 2**32 - 1),
    count=st.sampled_from([1, 2, 3, 40, 90]),
    coordinates=st.sampled_from([1, 2, 9, 257]),
    components=st.sampled_from([1, 2]),
    largest=st.sampled_from([0, 1, 40, 2**20, 2**30, 2**55]),
)


@settings(deadline=None, max_examples=60)
@given(st.lists(TOTALS, min_size=1, max_size=8), st.sampled_from([1, 2, 6, 2**28]))
def test_moments_of_many_totals_are_those_of_each(totals: list[Accumulator], scale: int) -> None:
    places = [(Coordinate(None, None, scale),) * one.coordinates for one in totals]
    together = moments_of([(one.to_bytes(), place) for one, place in zip(totals, places, strict=True)])
    for one, place, moments in zip(totals, places, together, strict=True):
        alone = [(m.mean, m.standard_error, m.variance, m.minimum, m.maximum) for m in summarize(one, place)]
        assert np.array(alone).tobytes() == np.ascontiguousarray(moments).tobytes() or (
            repr(alone) == repr([tuple(row) for row in moments.tolist()])  # nan has many spellings
        )
