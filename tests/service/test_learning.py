"""Costs and scatters learned from what was measured, against batches whose law is known."""

import math
from collections.abc import Sequence

import numpy as np
import pytest

from support.batches import result
from support.specs import small
from sweepmill.ensemble import Ensemble
from sweepmill.observation import observation_from_normal_form
from sweepmill.sweep import Sweep
from sweepmill_service.cost import Costs
from sweepmill_service.database import open_database
from sweepmill_service.learning.costs import MOST_CASES, known_of, load_of, nearest
from sweepmill_service.learning.neighbors import Cases, Law, Neighbors
from sweepmill_service.migrations import migrate
from sweepmill_service.store import Store
from sweepmill_service.store.common import to_json
from sweepmill_service.store.evidence import Timed

ENTROPY = observation_from_normal_form({"quantity": "entropy", "revision": 1})
SEED = 20_240


def chain(sites: int, rate: float) -> Ensemble:
    return Ensemble.of("hybrid-clifford", sites=sites, measurement_rate=rate, layers=4 * sites)


def machine(one: Ensemble) -> float:
    """What a trajectory takes on an invented machine: slower than the default, more so where it is large and quiet."""
    size, rate = math.log(one.sites / 64), math.log(one.parameters["measurement_rate"] / 0.16)
    return 1.7 * math.exp(0.2 * size - 0.15 * rate) * load_of(one, [ENTROPY]).seconds


def timed(one: Ensemble, noise: float = 0.0, seconds: float = 4.0) -> Timed:
    """A batch of so many seconds; ``noise`` in the logarithm."""
    count = max(1, round(seconds / machine(one)))
    took = count * machine(one) * math.exp(noise)
    return Timed(to_json(one.normal_form()), (to_json(ENTROPY.normal_form()),), count, took)


def drawn(number: int, seed: int) -> list[Ensemble]:
    """Ensembles at random sizes and rates, powers of two among the sizes so that some are alike."""
    random = np.random.default_rng(seed)
    return [chain(2 ** int(random.integers(3, 10)), round(float(random.uniform(0.02, 0.4)), 6)) for _ in range(number)]


def batches(number: int, seed: int = SEED, noise: float = 0.08) -> list[Timed]:
    random = np.random.default_rng(seed + 1)
    return [timed(one, noise * float(random.standard_normal())) for one in drawn(number, seed)]


@pytest.mark.parametrize(("number", "within"), [(0, 1.0), (1, 0.6), (5, 0.4), (40, 0.15), (1000, 0.1)])
def test_costs_come_closer_to_the_law_the_more_was_measured(number: int, within: float) -> None:
    wanted = drawn(60, SEED + 7)
    costs = Costs(wanted, [ENTROPY], batches(number))
    errors = [abs(math.log(costs[one.key].seconds / machine(one))) for one in wanted]
    assert float(np.median(errors)) < within
    assert costs[wanted[0].key].origin == ("learned" if number else "default")


def test_the_quoted_range_holds_about_two_times_out_of_three_or_more() -> None:
    """Over many stores, cold and warm; the drift between hours, which these batches lack, makes it hold more often."""
    inside: list[bool] = []
    widths = []
    for number in (1, 3, 10, 30):
        for seed in range(5):
            wanted = drawn(20, 100 * number + seed)
            costs = Costs(wanted, [ENTROPY], batches(number, 1000 * number + seed))
            inside += [
                abs(math.log(costs[one.key].seconds / machine(one))) < costs[one.key].deviation for one in wanted
            ]
        widths.append(float(np.mean([costs[one.key].deviation for one in wanted])))
    assert 0.6 < float(np.mean(inside)) < 0.97
    assert widths == sorted(widths, reverse=True)
    assert widths[-1] < 0.25


def test_an_outlier_moves_its_neighbors_little() -> None:
    wanted = [chain(64, 0.16)]
    known = [timed(chain(64, rate)) for rate in (0.155, 0.158, 0.162, 0.165)]
    disturbed = timed(chain(64, 0.16), noise=math.log(10))
    cost = Costs(wanted, [ENTROPY], [*known, disturbed])[wanted[0].key]
    assert cost.seconds == pytest.approx(machine(wanted[0]), rel=0.15)


def test_other_kinds_of_work_teach_how_fast_the_machine_is_and_little_more() -> None:
    ising = Ensemble.of("projective-ising", sites=64, bond_rate=0.5, layers=64)
    cost = Costs([ising], [ENTROPY], batches(40))[ising.key]
    default = load_of(ising, [ENTROPY]).seconds
    assert default < cost.seconds < 1.7 * default
    assert (cost.origin, cost.deviation > 0.3) == ("default", True)


def test_readings_count_and_what_is_learned_of_them_carries_over() -> None:
    many = observation_from_normal_form({"quantity": "entropy", "revision": 1, "at": {"every": 2}})
    one, other = chain(64, 0.16), chain(64, 0.1)
    plain, read = Costs([one], [ENTROPY]), Costs([one], [ENTROPY, many])
    assert read[one.key].seconds > 1.3 * plain[one.key].seconds
    took = 1000 * 2.0 * load_of(one, [many]).seconds
    batch = Timed(to_json(one.normal_form()), (to_json(many.normal_form()),), 1000, took)
    learned = Costs([other], [many], [batch])[other.key].seconds / load_of(other, [many]).seconds
    assert learned > 1.5


def test_what_a_worker_will_refuse_has_a_cost_all_the_same() -> None:
    """A unit cell of two layers does not fit into one: the batch fails, and the plan must get that far."""
    short = Ensemble.of("hybrid-clifford", sites=8, measurement_rate=0.1, layers=1)
    assert Costs([short], [ENTROPY])[short.key].seconds > 0


def test_a_sum_is_more_certain_than_its_parts_but_no_more_than_what_they_share() -> None:
    wanted = [chain(sites, 0.16) for sites in (8, 32, 128, 512)]
    costs = Costs(wanted, [ENTROPY])
    total = costs.deviation_of_sum({one.key: 1.0 for one in wanted})
    assert 0.4 < total < max(costs[one.key].deviation for one in wanted)
    assert costs.deviation_of_sum({}) == 0.0


def test_of_many_batches_the_nearest_are_kept() -> None:
    known = [one for batch in batches(400) if (one := known_of(batch)) is not None]
    wanted = load_of(chain(512, 0.3), [ENTROPY])
    kept = nearest(known, [wanted])
    assert len(kept) == MOST_CASES < len(known)
    gone = [one for one in known if one not in kept]
    near, far = ([math.dist(one.load.place, wanted.place) for one in some] for some in (kept, gone))
    assert max(near) <= min(far)


def test_batches_of_revisions_that_are_gone_teach_nothing() -> None:
    form = ENTROPY.normal_form() | {"revision": 99}
    assert known_of(Timed(to_json(chain(8, 0.1).normal_form()), (to_json(form),), 10, 1.0)) is None


def test_predictions_are_those_of_a_gaussian_process_where_nothing_is_an_outlier() -> None:
    """Two cases at one place, one name: the textbook formula for the mean and the variance of a normal variate."""
    law = Law(shared=(1.0,), local=0.5, together=0)
    cases = Cases([("a",), ("a",)], np.ones((2, 1)), np.zeros((2, 1)))
    near = Neighbors(law, cases, np.array([0.3, 0.3]), np.array([0.02, 0.02]))
    target = Cases([("a",), ("b",)], np.ones((2, 1)), np.zeros((2, 1)))
    prior, noise = 1.25, 0.01 * (4 / 5)  # trusted more than said, as far as Student's t allows
    assert near.means(target) == pytest.approx([0.3 * prior / (prior + noise), 0.0], abs=2e-3)
    expected = near.scale * np.sqrt([prior * noise / (prior + noise), prior])
    assert near.deviations(target) == pytest.approx(expected, abs=0.03)


# --- from the store


def stored(store: Store, seconds: float, sites: Sequence[int] = (8, 16)) -> Sweep:
    """A sweep of which every ensemble has a batch, of so many seconds for ten trajectories."""
    sweep = Sweep.parse(small(circuit__sites=list(sites), stop={"trajectories": 20}))
    store.submit(sweep, "ada")
    keys = [item.observation.key for item in sweep.observations]
    store.commit([result(point.ensemble.key, keys, 0, 10, sweep.key, seconds=seconds) for point in sweep.points])
    return sweep


def test_what_was_learned_outlives_the_process(database_url: str) -> None:
    engine = open_database(database_url)
    migrate(engine)
    sweep = stored(Store(engine), seconds=3.0)
    engine.dispose()
    again = open_database(database_url)
    other = Sweep.parse(small(circuit__sites=12, stop={"trajectories": 20}))
    observations = [item.observation for item in other.observations]
    costs = Costs.of([point.ensemble for point in (*sweep.points, *other.points)], observations, Store(again))
    again.dispose()
    assert [costs[point.ensemble.key].origin for point in sweep.points] == ["measured"] * len(sweep.points)
    for point in sweep.points:
        assert costs[point.ensemble.key].seconds == pytest.approx(0.3, rel=0.35)
    for point in other.points:
        cost = costs[point.ensemble.key]
        assert cost.origin == "learned"
        assert cost.seconds == pytest.approx(0.3, rel=0.8)


def test_only_the_last_batches_of_a_few_ensembles_are_read(store: Store) -> None:
    sweep = stored(store, seconds=1.0, sites=range(4, 100, 4))
    keys = [item.observation.key for item in sweep.observations]
    key = sweep.points[0].ensemble.key
    store.commit([result(key, keys, 10, 5, sweep.key, seconds=2.0)])
    (own,) = store.batches_of([key])
    assert (own.trajectories, len(own.observations)) == (5, len(keys))
    assert own.seconds == pytest.approx(2.0)
    assert 0 < len(store.recent_batches()) <= 16 < len(sweep.points)
