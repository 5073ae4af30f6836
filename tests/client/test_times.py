import pytest
from hypothesis import given
from hypothesis import strategies as st

from sweepmill.times import AverageOver, Every, LogSpaced, Reading, Window, check_cells, readings


def test_the_last_cell_is_the_last_two_layers() -> None:
    assert readings("last-cell", 8) == (Reading(None, (7, 8)),)


def test_the_end_is_the_last_layer() -> None:
    assert readings("end", 8) == (Reading(None, (8,)),)


def test_listed_layers_are_single_layers() -> None:
    assert readings((1, 4), 8) == (Reading(1, (1,)), Reading(4, (4,)))


def test_a_series_reads_unit_cells_unless_single_layers_are_asked_for() -> None:
    assert readings(Every(every=4), 10) == (Reading(4, (3, 4)), Reading(8, (7, 8)))
    assert readings(Every(every=4, single_layers=True), 10) == (Reading(4, (4,)), Reading(8, (8,)))


def test_a_window_averages_cells_counted_from_the_end() -> None:
    (reading,) = readings(AverageOver(average_over=Window(last=0.5, every=4)), 16)
    assert reading == Reading(None, (11, 12, 15, 16))
    (everything,) = readings(AverageOver(average_over=Window(last=1, every=2)), 8)
    assert everything.layers == tuple(range(1, 9))


def test_a_window_too_short_for_a_cell_is_refused() -> None:
    with pytest.raises(ValueError, match="holds no whole unit cell"):
        readings(AverageOver(average_over=Window(last=0.1)), 10)


@pytest.mark.parametrize("at", [Every(every=2), AverageOver(average_over=Window(last=0.5))])
def test_a_series_without_end_is_refused_before_it_is_listed(at: Every | AverageOver) -> None:
    with pytest.raises(ValueError, match="at most 100000 pass"):
        readings(at, 10**15)


def test_a_log_spaced_series_runs_from_the_first_cell_to_the_last_layer() -> None:
    ends = [reading.layer for reading in readings(LogSpaced(log_spaced=7), 128)]
    assert ends == [2, 4, 8, 16, 32, 64, 128]
    single = [reading.layer for reading in readings(LogSpaced(log_spaced=4, single_layers=True), 1000)]
    assert single == [1, 10, 100, 1000]


def test_cells_are_as_long_as_the_circuit_says() -> None:
    assert readings("last-cell", 8, cell=4) == (Reading(None, (5, 6, 7, 8)),)
    assert readings(Every(every=6), 13, cell=4) == (Reading(6, (3, 4, 5, 6)), Reading(12, (9, 10, 11, 12)))
    assert readings(Every(every=1), 2, cell=1) == (Reading(1, (1,)), Reading(2, (2,)))
    assert [reading.layer for reading in readings(LogSpaced(log_spaced=5), 64, cell=4)] == [4, 8, 16, 32, 64]
    (adjacent,) = readings(AverageOver(average_over=Window(last=0.5)), 16, cell=4)
    assert adjacent.layers == tuple(range(9, 17))
    (spaced,) = readings(AverageOver(average_over=Window(last=0.5, every=8)), 32, cell=4)
    assert spaced.layers == (21, 22, 23, 24, 29, 30, 31, 32)


@pytest.mark.parametrize(
    ("at", "layers", "message"),
    [
        ("last-cell", 3, "averages 4 layers and the circuit has 3"),
        (Every(every=3), 20, "unit cells overlap below every = 4"),
        (AverageOver(average_over=Window(every=3)), 20, "unit cells overlap below every = 4"),
        (LogSpaced(log_spaced=3), 4, "needs more than 4 layers"),
    ],
)
def test_what_does_not_fit_the_cell_is_refused(
    at: str | Every | AverageOver | LogSpaced, layers: int, message: str
) -> None:
    with pytest.raises(ValueError, match=message):
        readings(at, layers, cell=4)


@given(st.integers(2, 60), st.integers(3, 100_000))
def test_log_spaced_layers_are_distinct_and_inside_the_circuit(points: int, layers: int) -> None:
    found = readings(LogSpaced(log_spaced=points), layers)
    ends = [reading.layers[-1] for reading in found]
    assert ends == sorted(set(ends))
    assert ends[0] == 2
    assert ends[-1] == layers
    assert len(ends) <= points


@pytest.mark.parametrize(
    "at", ["end", (1, 9), Every(every=3, single_layers=True), LogSpaced(log_spaced=3, single_layers=True)]
)
def test_single_layers_of_after_are_read(at: object) -> None:
    check_cells(at, readings(at, 9), repeated=8)


@pytest.mark.parametrize(
    ("at", "words"),
    [
        (
            "last-cell",
            'the last cell would mix layers of `after` with the circuit: use at = "end" or a list of layers$',
        ),
        (Every(every=3), "a unit cell would mix .* or single_layers = true$"),
        (LogSpaced(log_spaced=3), "a unit cell would mix"),
        (AverageOver(average_over=Window(last=0.5)), "or a list of layers$"),
    ],
)
def test_a_unit_cell_does_not_reach_into_after(at: object, words: str) -> None:
    times = readings(at, 9)
    check_cells(at, times, repeated=9)
    with pytest.raises(ValueError, match=words):
        check_cells(at, times, repeated=8)


def test_cells_before_after_are_read() -> None:
    check_cells(Every(every=4), readings(Every(every=4), 9), repeated=8)
