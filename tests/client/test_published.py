"""The published results that come with the package: specification, what is known, and the fit that gives ours."""

import re
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from sweepmill import Client
from sweepmill.cli.reproduce import listing
from sweepmill.published import Known, catalogue, named
from sweepmill.published.averages import weighted
from sweepmill.published.catalogue import DIRECTORY, Entry, NoSuchResult
from sweepmill.published.models import AveragesFit
from sweepmill.published.run import Compared, reproduce

ENTRIES = catalogue()
CHEAP = {"page-law": 2000, "entanglement-velocity": 2000, "projective-ising-critical-point": 256}


def name_of(entry: Entry) -> str:
    return entry.name


def test_every_specification_has_what_is_known_beside_it() -> None:
    assert {path.stem for path in DIRECTORY.glob("*.toml")} == {entry.name for entry in ENTRIES}
    assert len(ENTRIES) >= 8


@pytest.mark.parametrize("entry", ENTRIES, ids=name_of)
def test_a_result_says_where_it_stands_and_how_to_make_it_again(entry: Entry) -> None:
    header = "".join(line for line in entry.specification.read_text().splitlines() if line.startswith("#"))
    assert header.startswith("# Published result: ")
    assert f"sweepmill reproduce {entry.name}" in header
    assert re.search(r"Took \d+ s on two cores", header)
    assert all(known.source < len(entry.published.sources) for known in entry.published.known)
    assert any(known.decides for known in entry.published.known) or entry.published.remark


@pytest.mark.parametrize("entry", ENTRIES, ids=name_of)
def test_a_result_expands_and_its_fits_name_observations_of_its_sweep(entry: Entry) -> None:
    sweep = entry.sweep()
    names = {one.name for one in sweep.observations}
    for fit in entry.published.fits:
        used = [one.name for one in fit.averages] if isinstance(fit, AveragesFit) else [fit.name, *fit.places]
        assert {name for name in used if name} <= names


@pytest.mark.parametrize("entry", ENTRIES, ids=name_of)
def test_a_first_look_takes_the_first_trajectories_of_the_same_ensembles(entry: Entry) -> None:
    whole, quick = entry.sweep(), entry.sweep(entry.published.quick)
    assert [point.ensemble.key for point in quick.points] == [point.ensemble.key for point in whole.points]
    assert all(few.cap < many.cap for few, many in zip(quick.points, whole.points, strict=True))
    assert quick.key != whole.key


@pytest.mark.parametrize("name", CHEAP)
def test_a_result_runs_from_end_to_end_on_a_service(name: str, service_url: str, tmp_path: Path) -> None:
    # few trajectories: every value is there with its error, or its error is withheld with a reason
    entry = named(name)
    with Client(service_url) as client:
        found = reproduce(entry, client, CHEAP[name], tmp_path)
    assert found.key == entry.sweep(CHEAP[name]).key
    assert [one.known for one in found.compared] == list(entry.published.known)
    assert all(one.ours.error is not None or one.ours.withheld for one in found.compared)
    text = found.text()
    assert all(source.place in text for source in entry.published.sources)
    drawn = sorted(path.name for path in tmp_path.iterdir())
    assert len(drawn) == sum(outcome.draw is not None for outcome in found.outcomes)


def test_exact_values_are_reproduced_by_few_trajectories(service_url: str) -> None:
    # 2,000 trajectories; 5 combined standard errors: chance 1e-6 for the two values together
    with Client(service_url) as client:
        found = reproduce(named("page-law"), client, CHEAP["page-law"])
    assert found.reproduced
    assert found.trajectories >= 2000


def test_an_unknown_name_is_refused_with_those_there_are() -> None:
    with pytest.raises(NoSuchResult, match="page-law"):
        named("../page-law")


def test_the_list_has_a_line_for_every_result() -> None:
    lines = listing().splitlines()[1:]
    assert [line.split()[0] for line in lines] == [entry.name for entry in ENTRIES]


def test_a_value_that_decides_is_not_reproduced_when_it_is_far_off_or_has_no_error() -> None:
    ours = weighted(np.array([0.0, 1.0]), np.array([60.0, 40.0]))
    assert ours.value == pytest.approx(0.4)
    assert ours.error == pytest.approx((0.24 / 99) ** 0.5)
    far = Known(quantity="q", value=0.7, source=0, standing="exact")
    decides = {"decides": True}
    assert not Compared(far, ours).differs
    assert Compared(far.model_copy(update=decides), ours).differs
    assert not Compared(far.model_copy(update=decides | {"error": 0.1}), ours).differs
    withheld = replace(ours, withheld="the form does not describe the data")
    assert Compared(far.model_copy(update=decides | {"value": 0.4}), withheld).differs
