"""The report: plain values, Markdown and a page that needs nothing from outside."""

import json
import re
from dataclasses import replace
from html.parser import HTMLParser
from itertools import pairwise
from pathlib import Path

import pytest

import sweepmill
from support.costs import invented_cost
from support.paid import sampled_source
from sweepmill import Sweep, Table
from sweepmill.errors import SweepmillError
from sweepmill.experiment import NoRecordBits, Options, Source, companion, cost_of, markdown, page, read_source
from sweepmill.experiment.companion import as_toml
from sweepmill.experiment.figure import depth_figure

VOID = {"meta", "br"}
SERIES = {"quantity": "record-bits", "at": {"every": 1, "single_layers": True}, "histogram": True}
EXAMPLES = Path(sweepmill.__file__).parent / "examples"


def sweep(*observe: dict[str, object], **circuit: object) -> Sweep:
    fields = {"family": "hybrid-clifford", "sites": [4, 8], "measurement_rate": [0.2, 0.4], "layers": {"per_site": 1}}
    return Sweep.parse({"circuit": fields | circuit, "observe": observe, "stop": {"trajectories": 300}})


WHOLE = sweep(SERIES, {"quantity": "entropy"})


@pytest.fixture(scope="module")
def source() -> Source:
    """Two sizes, two rates, every depth."""
    return sampled_source(WHOLE, 300)


class Page(HTMLParser):
    """Notes open elements and everything that could load something."""

    def __init__(self) -> None:
        super().__init__()
        self.open: list[str] = []
        self.texts: list[str] = []
        self.loads: list[str] = []

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.loads += [name for name, _ in attrs if name in ("src", "href", "xlink:href", "action")]
        self.loads += [tag] if tag in ("script", "link", "img", "iframe") else []
        if tag not in VOID:
            self.open.append(tag)

    def handle_startendtag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.handle_starttag(tag, attrs)
        self.handle_endtag(tag)

    def handle_endtag(self, tag: str) -> None:
        assert self.open.pop() == tag

    def handle_data(self, data: str) -> None:
        self.texts.append(data)


def read_page(text: str) -> Page:
    parsed = Page()
    parsed.feed(text)
    assert not parsed.open
    return parsed


def test_the_page_is_well_formed_and_loads_nothing(source: Source) -> None:
    text = page(cost_of(source))
    parsed = read_page(text)
    assert not parsed.loads
    assert "url(" not in text
    assert "http" not in text
    assert text.count("<svg") == 1


@pytest.mark.parametrize("write", [page, markdown])
def test_every_ensemble_is_named_with_its_number_of_trajectories(source: Source, write: object) -> None:
    text = (page if write is page else markdown)(cost_of(source))
    for point in WHOLE.points:
        assert point.ensemble.key[:12] in text
    assert text.count("300") >= len(WHOLE.points)
    for said in ("no noise", "projective", "lower bounds", "not a particular machine", "100 µs"):
        assert said in text


def test_plain_values_are_json_and_belong_together(source: Source) -> None:
    cost = cost_of(source, Options(select=3, precision=0.01, shot_time=1e-6))
    values = json.loads(json.dumps(cost.to_dict(), allow_nan=False))
    assert len(values["records"]) == sum(point.ensemble.layers for point in WHOLE.points)
    for record in values["records"]:
        bits = record["random_outcomes"]
        assert record["log2_repetitions_again"] == bits["value"]
        assert record["quantiles"]["0.05"] <= record["median"] <= record["quantiles"]["0.95"]
        assert record["log2_mean_repetitions"]["value"] >= bits["value"]
        assert bits["value"] / 2 < record["log2_repetitions_any_twice"]["value"] <= bits["value"] / 2 + 1
        share = record["random_share"]["value"]
        assert bits["value"] == pytest.approx(share * record["measurements"], rel=1e-12)
    for (selected,) in values["selections"].values():
        assert selected["measurements"] == 3
        assert selected["log2_runs_for_observable"] == pytest.approx(
            selected["log2_runs_per_kept_one"] + 13.2877, abs=1e-4
        )


def test_selecting_all_outcomes_of_a_depth_costs_its_record(source: Source) -> None:
    """Measurements at p = .2 on eight sites: 8 after five layers, whose random outcomes are what is selected."""
    cost = cost_of(source, Options(select=8))
    last = next(one for one in cost.final if one.labels == {"sites": 8, "measurement_rate": 0.2})
    fifth = next(one for one in cost.depths(last) if one.layer == 5)
    (found,) = cost.selections(last)
    assert found is not None
    assert found.random == fifth.again
    assert cost_of(source, Options(select=1000)).selections(last) == [None]


@pytest.mark.parametrize("numbers", [{"shot_time": 0}, {"shot_time": float("inf")}, {"select": 0}, {"precision": 1}])
def test_numbers_out_of_range_are_refused(numbers: dict[str, float]) -> None:
    with pytest.raises(ValueError, match="got"):
        Options(**numbers)  # type: ignore[arg-type]


def test_the_two_roads_are_those_of_half_the_largest_chain(source: Source) -> None:
    both = cost_of(source).beside
    assert both is not None
    assert both.monitored is not None
    assert (both.monitored.ensemble.sites, both.sideways.window, both.sideways.qubits) == (8, 4, 7)
    assert both.monitored.gates == 8 * 8 / 2
    said = both.to_dict()
    assert said["sideways"]["entropy_at_least"] == pytest.approx(2.4422, abs=1e-4)
    assert said["monitored"]["entropy"]["trajectories"] == 300


def test_a_rotated_circuit_of_the_sweep_stands_beside_a_monitored_one_of_its_size() -> None:
    blocks = [
        {"family": "hybrid-clifford", "sites": [8, 16], "measurement_rate": [0.1, 0.3], "layers": 16},
        {"family": "rotated-clifford", "sites": 8, "layers": 4},
    ]
    end = {"quantity": "entropy", "name": "end", "at": "end"}
    observe = [{"quantity": "record-bits", "at": "end"}, {"quantity": "entropy"}, end]
    both_families = Sweep.parse({"circuit": blocks, "observe": observe, "stop": {"trajectories": 200}})
    source = sampled_source(both_families, 200)
    cost = cost_of(source)
    assert {tuple(one.labels) for one in cost.final} == {("sites", "measurement_rate")}  # of one family, unsaid
    both = cost.beside
    assert both is not None
    assert both.monitored is not None
    assert both.entropy is not None
    assert (both.sideways.chain, both.sideways.layers, both.sideways.window) == (5, 7, 4)
    assert both.monitored.ensemble.sites == 8
    assert both.rotated is not None
    assert both.rotated.key[:12] in markdown(cost)
    assert source.table is not None
    ends, cells = ([row["mean"] for row in source.table.where(name=name).rows()] for name in ("end", "entropy"))
    assert both.entropy.bits.value == ends[-1]  # of the last column alone
    assert both.monitored.entropy is not None
    assert both.monitored.entropy.bits.value in cells
    assert "<svg" not in page(cost)
    assert "≈" in page(cost)  # without a histogram the band is one from the variance


def test_rotated_circuits_alone_need_no_record() -> None:
    circuit = {"family": "rotated-clifford", "sites": 8, "layers": 4}
    alone = Sweep.parse({"circuit": circuit, "observe": [{"quantity": "entropy"}], "stop": {"trajectories": 100}})
    cost = cost_of(sampled_source(alone, 100))
    assert not cost.records
    assert "no record" in markdown(cost)
    assert cost.beside is not None
    assert cost.beside.entropy is None  # a mean over two columns is not what a laboratory holds
    assert not read_page(page(cost)).loads


def test_files_say_the_same_as_the_service(source: Source, tmp_path: Path) -> None:
    paths = [tmp_path / "table.json", tmp_path / "histograms.json", tmp_path / "sweep.json"]
    for path, table in zip(paths, (source.table, source.histograms), strict=False):
        assert table is not None
        columns = {name: table.values(name) for name in table.columns}
        path.write_text(json.dumps({"columns": columns, "metadata": table.metadata}))
    paths[2].write_text(json.dumps(WHOLE.normalized()))
    assert cost_of(read_source(paths)).to_dict() == cost_of(source).to_dict()
    without = cost_of(read_source(paths[:2]))
    assert [one.again for one in without.final] == [one.again for one in cost_of(source).final]
    assert without.beside is None
    assert "not known" in markdown(without)
    laws_alone = cost_of(read_source([paths[1], paths[2]]))
    assert [one.band for one in laws_alone.final] == [one.band for one in cost_of(source).final]
    assert [one.again.value for one in laws_alone.final] == pytest.approx(
        [one.again.value for one in cost_of(source).final], rel=1e-12
    )


def test_files_that_do_not_fit_together_are_refused(source: Source, tmp_path: Path) -> None:
    other = tmp_path / "other.json"
    other.write_text(json.dumps({"columns": {"name": [], "quantity": []}, "metadata": {"sweep": "0" * 64}}))
    written = tmp_path / "sweep.json"
    written.write_text(json.dumps(WHOLE.normalized()))
    with pytest.raises(SweepmillError, match="2 sweeps"):
        read_source([other, written])
    with pytest.raises(SweepmillError, match="at most one table"):
        read_source([other, other])
    with pytest.raises(SweepmillError, match="one specification"):
        read_source([written, written])
    with pytest.raises(SweepmillError, match="neither a file nor a key"):
        read_source(["nowhere.toml"])
    with pytest.raises(SweepmillError, match="need a service"):
        read_source(["0123456789"])


def test_a_table_without_metadata_gives_its_means(source: Source) -> None:
    assert source.table is not None
    bare = Table({name: source.table.values(name) for name in source.table.columns})
    found = cost_of(Source(bare))
    assert [one.again for one in found.records] == [one.again for one in cost_of(source).records]


def test_other_observations_are_refused(source: Source) -> None:
    with pytest.raises(SweepmillError, match="needs record-bits"):
        cost_of(source, Options(of="entropy"))
    with pytest.raises(SweepmillError, match="one of entropy, record-bits"):
        cost_of(source, Options(of="nothing"))
    plain = sampled_source(sweep({"quantity": "entropy"}, sites=4, measurement_rate=0.2), 10)
    with pytest.raises(NoRecordBits, match="only entropy"):
        cost_of(plain)
    empty: dict[str, list[str]] = {name: [] for name in ("name", "quantity", "layer")}
    with pytest.raises(SweepmillError, match="nothing is sampled yet"):
        cost_of(replace(plain, table=Table(empty)))


def test_a_single_trajectory_is_reported_without_errors() -> None:
    cost = cost_of(sampled_source(WHOLE, 1))
    assert {one.again.error for one in cost.records} == {None}
    assert not any(one.band.exact for one in cost.records)
    assert not read_page(page(cost)).loads
    json.dumps(cost.to_dict(), allow_nan=False)


@pytest.mark.parametrize("example", sorted(EXAMPLES.glob("*.toml")), ids=lambda path: path.stem)
def test_a_companion_is_about_the_same_ensembles(example: Path, tmp_path: Path) -> None:
    ensembles = [point.ensemble for point in Sweep.read(example).points]
    path = tmp_path / "companion.toml"
    path.write_text(as_toml(companion(ensembles)))
    again = Sweep.read(path)
    assert {point.ensemble.key for point in again.points} == {one.key for one in ensembles}
    assert "record-bits" in {item.observation.quantity for item in again.observations}
    if not any(one.family == "layered" for one in ensembles):
        blocks = re.findall(r"^\[\[circuit\]\]", path.read_text(), re.MULTILINE)
        assert len(blocks) == len({one.family for one in ensembles})


def test_a_companion_of_nothing_is_refused() -> None:
    with pytest.raises(SweepmillError, match="no circuits"):
        companion([])


@pytest.mark.parametrize("sizes", [(8, 16), (16, 32, 64)])
def test_both_forms_show_the_same_selections_and_say_what_is_left_out(sizes: tuple[int, ...]) -> None:
    cost = invented_cost(sizes, (0.05, 0.1, 0.2, 0.3))
    written, shown = markdown(cost), page(cost)
    rows = written.split("## Post-selecting")[1].split("## ")[0].splitlines()[4:-1]
    table = shown.split("<h2>Post-selecting")[1].split("</table>")[0]
    assert table.count("<tr>") - 1 == sum(row.startswith("| sites") for row in rows) == (8 if len(sizes) == 2 else 4)
    left_out = "Left out, but in the report as JSON: 16, 32 sites."
    assert (left_out in written) == (left_out in shown) == (len(sizes) == 3)
    assert len(cost.to_dict()["selections"]) == 4 * len(sizes)


@pytest.mark.parametrize("sizes", [(4, 8), (16, 32), (64, 128, 256)])
def test_the_figure_is_linear_in_log2_and_names_of_durations_do_not_touch(sizes: tuple[int, ...]) -> None:
    drawing = depth_figure(invented_cost(sizes, (0.1, 0.2)))
    numbers = re.findall(r'class="tick end" x="[\d.]+" y="([\d.]+)">(\d+)<', drawing)
    heights, values = ([float(one[part]) for one in numbers] for part in (0, 1))
    assert values[0] == 0
    assert len(values) > 3
    per_bit = (heights[0] - heights[-1]) / values[-1]
    assert heights == pytest.approx([heights[0] - per_bit * value for value in values], abs=0.11)
    marks = [float(y) for y in re.findall(r'class="mark" x="[\d.]+" y="([\d.]+)"', drawing)]
    assert all(below - above >= 9.9 for above, below in pairwise(marks))
    assert drawing.count('class="guide"') == len(marks) * len(sizes)


def test_the_age_of_the_universe_is_named_before_shorter_times() -> None:
    assert "age of universe" in depth_figure(invented_cost((64, 128, 256), (0.1, 0.2)))
