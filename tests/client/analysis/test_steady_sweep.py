"""Every circuit of a sweep judged, the growth of the depth it needs, and the companion that reads along the layers."""

import numpy as np
import pytest

from support.folds import Made, folds_of, scatter
from sweepmill import Folds, Sweep, SweepmillError
from sweepmill.analysis import steady_sweep
from sweepmill.analysis.selecting import NotOneCurve
from sweepmill.companion import companion
from sweepmill.coordinates import Coordinate

SIZES, RATES = (8, 16, 32), (0.1, 0.3)


def relaxing(rate_of: float = 0.5, noise: float = 0.05, layers_per_site: int = 4) -> Folds:
    """An invented observation that relaxes with the time rate_of times the size; values in thousandths."""
    made = []
    for sites in SIZES:
        times = np.arange(2, layers_per_site * sites + 1, 2)
        places = [Coordinate(int(t), None, 1000) for t in times]
        for rate in RATES:
            curve = 2 - 1.5 * np.exp(-times / (rate_of * sites))
            values = curve + scatter(sites, noise, len(times)) + scatter(sites, 0.05)
            made.append(Made({"sites": sites, "p": rate}, places, np.rint(1000 * values).astype(np.int64)))
    return folds_of(made, "half")


def test_every_ensemble_is_judged_and_called_by_its_axes() -> None:
    result = steady_sweep(relaxing(rate_of=0.25))
    assert [row.label for row in result.steadiness.rows] == [f"sites = {s}, p = {p}" for s in SIZES for p in RATES]
    # the curve still rises by 1e-4 at an error of 1e-3
    assert result.steadiness.verdict == "steady"
    assert "Steady: none of 6 ensembles" in str(result)
    assert len({row.key for row in result.steadiness.rows}) == 6


def test_the_depth_needed_grows_as_it_was_made_to() -> None:
    result = steady_sweep(relaxing())
    assert [one.label for one in result.depths] == ["p = 0.1", "p = 0.3"]
    for one in result.depths:
        # 1.5 exp(-t / (L/2)) = 0.05 * 2 at t = L/2 ln 15; linear interpolation between layers moves it by less
        assert one.points.mean == pytest.approx([s / 2 * np.log(15) for s in SIZES], rel=0.08)
        assert one.growth is not None
        assert "L^z" in one.law() or one.law() == "cannot tell"
    assert "Layers until the mean stays within 5 % of its last quarter:" in result.text()
    assert result.to_dict()["depths"][0]["depths"][2]["size"] == 32


def test_a_series_that_still_rises_is_named() -> None:
    result = steady_sweep(relaxing(rate_of=4.0, noise=0.01))
    assert result.steadiness.verdict == "still changing"
    assert str(result) == "half: Not shown to be steady: of 6 ensembles, 6 still changing."


def test_without_enough_trajectories_it_says_how_many_would_do() -> None:
    noisy = steady_sweep(relaxing(rate_of=0.25, noise=1.5)).steadiness
    assert noisy.verdict == "too noisy to tell"
    # an error of 1.5 sqrt(2)/sqrt(4 * 640) = 0.042 in the smallest size, where two must fit into 0.04 less the change:
    # a factor of 4.4, of an error known to 9 percent
    assert 1.5 < noisy.more_needed() < 15
    assert steady_sweep(relaxing(rate_of=0.25, noise=0.01)).steadiness.more_needed() == 1


def test_what_was_read_once_cannot_be_judged_and_a_choice_is_asked_for() -> None:
    once = folds_of([Made({"sites": 8}, [Coordinate(None, None, 1)], np.ones((99, 1), np.int64))])
    with pytest.raises(ValueError, match="no observation was read along the layers"):
        steady_sweep(once)
    first, second = relaxing(), relaxing()
    columns = {name: [*first.values(name), *second.values(name)] for name in first.columns}
    columns["name"] = ["half"] * len(first) + ["third"] * len(second)
    with pytest.raises(NotOneCurve, match="with --of: half, third"):
        steady_sweep(Folds(columns))


def test_a_companion_reads_the_same_ensembles_along_the_layers() -> None:
    sweep = Sweep.parse(
        {
            "circuit": {
                "family": "hybrid-clifford",
                "sites": [16, 64],
                "measurement_rate": [0.1, 0.2],
                "layers": {"per_site": 8},
                "trajectories": 9000,
            },
            "observe": [
                {"quantity": "entropy", "name": "last", "histogram": True},
                {"quantity": "entropy", "name": "end", "at": "end"},
                {"quantity": "tripartite-information", "name": "i3", "average_translations": True},
            ],
            "stop": {"trajectories": 5000, "standard_error": [{"of": "i3", "below": 0.01}]},
        }
    )
    other = companion(sweep)
    assert {p.ensemble.key for p in other.points} == {p.ensemble.key for p in sweep.points}
    assert {p.cap for p in other.points} == {400}
    assert other.stop.standard_error == ()
    # two readings of one entropy are one series; 128 layers read 32 times
    assert [(item.name, item.observation.at.every) for item in other.observations] == [("end", 4), ("i3", 4)]  # type: ignore[union-attr]
    assert companion(sweep, trajectories=6000).stop.trajectories == 5000


def test_a_circuit_too_short_for_a_series_has_no_companion() -> None:
    sweep = Sweep.parse(
        {
            "circuit": {"family": "hybrid-clifford", "sites": 8, "measurement_rate": 0.1, "layers": 1},
            "observe": [{"quantity": "entropy", "at": "end"}],
            "stop": {"trajectories": 100},
        }
    )
    with pytest.raises(SweepmillError, match="no observation can be read along the layers"):
        companion(sweep)
