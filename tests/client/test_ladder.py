from hypothesis import given
from hypothesis import strategies as st

from sweepmill.ladder import rungs


def test_four_rungs_double_the_number_of_trajectories() -> None:
    assert rungs(200, 1000) == (200, 237, 282, 336, 400, 475, 565, 672, 800, 951, 1000)


def test_the_cap_is_the_last_rung_and_the_only_one_below_at_least() -> None:
    assert rungs(200, 200) == (200,)
    assert rungs(200, 50) == (50,)


@given(st.integers(2, 10**6), st.integers(1, 10**7))
def test_rungs_grow_to_the_cap_and_are_exact_roots(at_least: int, cap: int) -> None:
    ladder = rungs(at_least, cap)
    assert list(ladder) == sorted(set(ladder))
    assert ladder[-1] == cap
    for rung in ladder[:-1]:
        assert any(rung**4 <= at_least**4 << j < (rung + 1) ** 4 for j in range(100))
