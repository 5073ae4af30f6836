"""`sweepmill folds` and `sweepmill fit` as a user meets them."""

import json
import re
import sys
from collections.abc import Callable
from pathlib import Path
from typing import Any, NamedTuple

import numpy as np
import pytest

from support.folds import Made, folds_of, scatter
from sweepmill import Client, Folds, Sweep
from sweepmill.cli import main
from sweepmill.coordinates import Coordinate

WAIT = 120.0


class Done(NamedTuple):
    """What a command left behind."""

    code: int
    out: str
    err: str


Run = Callable[..., Done]


@pytest.fixture
def run(monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]) -> Run:
    """Run a command in this process, without a service."""
    monkeypatch.setenv("SWEEPMILL_URL", "http://127.0.0.1:9")  # the discard port: nothing listens there
    monkeypatch.delenv("SWEEPMILL_TOKEN", raising=False)

    def call(*arguments: object) -> Done:
        monkeypatch.setattr(sys, "argv", ["sweepmill", *map(str, arguments)])
        code = 0
        try:
            main()
        except SystemExit as stopped:
            code = int(stopped.code or 0)
        return Done(code, *capsys.readouterr())

    return call


@pytest.fixture(scope="module")
def key(service_url: str) -> str:
    """A small sweep, sampled."""
    circuit = {"family": "hybrid-clifford", "sites": [4, 8, 16], "layers": 8, "replicate": 7311}
    body: dict[str, Any] = {
        "circuit": {**circuit, "measurement_rate": {"from": 0.05, "to": 0.4, "points": 6}},
        "observe": [
            {"quantity": "entropy", "name": "half", "histogram": True},
            {"quantity": "entropy", "name": "series", "at": {"every": 2}},
        ],
        "stop": {"trajectories": 128},
    }
    with Client(service_url, owner="mara") as client:
        sweep = client.submit(Sweep.parse(body))
        sweep.wait(progress=False, timeout=WAIT)
        return sweep.key


def made(curve: Callable[[int, float], float]) -> Folds:
    """Folds of an invented observation with a given mean, in thousandths, and noise of one tenth."""
    places = (Coordinate(None, None, 1000),)
    return folds_of(
        [
            Made(
                {"sites": sites, "p": round(p, 3)},
                places,
                np.rint(1000 * (curve(sites, p) + scatter(sites + round(1000 * p), 0.1))).astype(np.int64),
            )
            for sites in (8, 16, 32)
            for p in np.linspace(0.1, 0.3, 9).tolist()
        ]
    )


def written(folds: Folds, path: Path) -> Path:
    path.write_text(json.dumps({"columns": {n: folds.values(n) for n in folds.columns}, "metadata": folds.metadata}))
    return path


def scaling(sites: int, p: float) -> float:
    return float(np.tanh((p - 0.2) * sites ** (1 / 1.3)))


def test_a_sweep_is_fitted_from_the_service_and_from_files_alike(
    run: Run, key: str, service_url: str, tmp_path: Path
) -> None:
    path = tmp_path / "folds.arrow"
    assert run("folds", key[:10], "-o", path, "--url", service_url) == (0, f"{path}\n", "")
    options = ("--of", "half", "--where", "measurement_rate=0.05", "--sizes", "4,8,16")
    there = run("fit", "law", key[:10], *options, "--url", service_url)
    here = run("fit", "law", path, *options)
    assert (here.code, here.err) == (0, "")
    assert here.out == there.out
    head, sentence = here.out.split("\n\n")[:2]
    assert head == f"half against sites: sweep {key[:12]}, 3 ensembles, 384 trajectories, 64 folds"
    assert sentence.startswith("The data (3 points, 4 <= x <= 16)")

    table = tmp_path / "table.json"
    assert run("table", key, "-o", table, "--url", service_url).code == 0
    without = run("fit", "law", table, *options)
    assert without.code == 0
    assert "no folds, so errors are propagated from the table" in without.out


def test_purities_come_from_exact_histograms(run: Run, key: str, service_url: str, tmp_path: Path) -> None:
    options = ("--of", "half", "--where", "measurement_rate=0.4", "--x", "sites", "--url", service_url)
    done = run("fit", "purity", key, *options, "--json", tmp_path / "p.json", "--figure", tmp_path / "p.svg")
    assert (done.code, done.err) == (0, "")
    assert "The mean purity 2^-S of half (3 points, from exact histograms) lies between" in done.out
    written_down = json.loads((tmp_path / "p.json").read_text())
    with Client(service_url) as client:
        rows = list(client.sweep(key).histograms().where(name="half", measurement_rate=0.4).rows())
    for point in written_down["points"]:
        of = [(row["value"], row["occurrences"]) for row in rows if row["sites"] == point["size"]]
        expected = sum(n * 2.0**-s for s, n in of) / sum(n for _, n in of)
        assert point["purity"]["value"] == pytest.approx(expected, rel=1e-12)
        assert point["entropy"]["value"] == pytest.approx(-np.log2(expected), rel=1e-12)
    assert len(written_down["ensembles"]) == 3
    assert (tmp_path / "p.svg").read_text().startswith("<?xml")


def test_growth_is_fitted_along_the_layers_of_one_ensemble(run: Run, key: str, service_url: str) -> None:
    options = ("--of", "series", "--where", "measurement_rate=0.05", "--url", service_url)
    done = run("fit", "growth", key, *options, "--sizes", "16")
    assert done.code == 0
    assert "series against layer" in done.out
    assert "4 points, 2 <= x <= 8" in done.out
    several = run("fit", "growth", key, *options)
    assert several.code == 2
    assert "one curve for each size: choose one of 4, 8, 16 with --sizes" in several.err


def test_a_law_that_holds_from_some_length_on_is_found(run: Run, tmp_path: Path) -> None:
    """An invented entropy that grows as a logarithm beyond 5 sites, on a ring of 20 sites."""
    places = [Coordinate(None, position, 1000) for position in range(1, 21)]
    length = np.arange(1, 21)
    curve = 1.5 * np.log(np.maximum(length, 5)) - 3 * np.maximum(5 - length, 0)
    folds = folds_of(
        [Made({}, places, np.rint(1000 * (curve + scatter(12, 0.1, 20))).astype(np.int64))],
        sites=20,
        boundary="periodic",
    )
    done = run("fit", "law", written(folds, tmp_path / "f.json"))
    assert done.code == 0
    assert "(10 points, 1 <= x <= 10)" in " ".join(done.out.split())
    assert "note: the chain is a ring: --ring 20 takes chords for lengths" in done.out
    assert re.search(r"With --window [56] 10:\nThe data", done.out)


def test_the_result_and_its_figure_are_written_and_named(run: Run, tmp_path: Path) -> None:
    path, result, figure = written(made(scaling), tmp_path / "f.json"), tmp_path / "r.json", tmp_path / "r.png"
    done = run("fit", "collapse", path, "--json", result, "--figure", figure)
    assert done.code == 0
    assert done.out.endswith(f"\n\n{result}\n{figure}\n")
    kept = json.loads(result.read_text())
    assert (kept["analysis"], len(kept["ensembles"]), kept["folds"]) == ("collapse", 27, 64)
    assert figure.read_bytes().startswith(b"\x89PNG")
    assert "polynomial of degree 4" in done.out


def test_a_flagged_fit_says_so_names_choices_that_fit_and_is_a_result(run: Run, tmp_path: Path) -> None:
    """An offset that falls as L^-2 is no collapse; without the smallest size, or with corrections, it is one."""
    folds = made(lambda sites, p: scaling(sites, p) + 30 / sites**2)
    done = run("fit", "collapse", written(folds, tmp_path / "f.json"), "--degree", "5")
    assert done.code == 0
    assert "is not to be quoted: the form does not describe the data" in done.out.replace("\n", " ")
    assert "These choices do describe the data:" in done.out
    assert "--corrections" in done.out
    assert "not by the answer" in done.out


@pytest.mark.parametrize(("what", "sizes"), [("crossings", "8,16,32"), ("model-free", "16,32")])
def test_other_ways_to_the_critical_point_have_their_tables_and_figures(
    run: Run, tmp_path: Path, what: str, sizes: str
) -> None:
    folds = made(lambda sites, p: (p - 0.2) * sites ** (1 / 1.3))
    path = written(folds, tmp_path / "f.json")
    done = run("fit", what, path, "--sizes", sizes, "--figure", tmp_path / "f.pdf")
    assert done.code == 0
    assert "p_c" in done.out
    assert (tmp_path / "f.pdf").read_bytes().startswith(b"%PDF")


def test_central_charge_and_law_are_against_sites(run: Run, tmp_path: Path) -> None:
    path = written(made(lambda sites, p: 0.9 - 1.5 / sites**2), tmp_path / "f.json")
    options = ("--where", "p=0.2")
    done = run("fit", "central-charge", path, *options, "--rate", "0.16", "--figure", tmp_path / "c.png")
    assert done.code == 0
    assert "c_eff times anisotropy" in done.out
    assert (tmp_path / "c.png").exists()
    assert "give it with --rate" in run("fit", "central-charge", path, *options).err
    law = run("fit", "law", path, *options)
    assert (law.code, law.out.splitlines()[0].startswith("i3 against sites")) == (0, True)


@pytest.mark.parametrize(
    ("options", "message"),
    [
        (("--of", "half"), "no observation 'half': one of i3"),
        (("--x", "rate"), "x = 'rate' is no column: one of sites, p, layer, position"),
        (("--where", "p"), "a condition is written as axis=value"),
        (("--where", "p=0.21"), "no row has p = 0.21: there are 0.1, 0.125"),
        (("--where", "rate=0.2"), "no column 'rate' to choose 0.2 of: one of sites, p"),
        (("--sizes", "8,64"), "no row has sites = 64: there are 8, 16, 32"),
        (("--sizes", "8;64"), "sizes are whole numbers with commas between them"),
        (("--window", "0.5", "0.9"), "no row has 0.5 <= p <= 0.9: there are 0.1"),
        (("--zeta", "any"), "a number, or the word free"),
        (("--ring", "32"), "--ring means nothing to collapse, which takes --zeta, --degree, --corrections"),
        (("--figure", "f.gif"), "the suffix gives the format, one of .png, .svg, .pdf"),
    ],
)
def test_misuse_names_the_value_and_what_would_pass(
    run: Run, tmp_path: Path, options: tuple[str, ...], message: str
) -> None:
    done = run("fit", "collapse", written(made(scaling), tmp_path / "f.json"), *options)
    assert (done.code, done.out) == (2, "")
    assert message in " ".join(done.err.split())


def test_data_that_cannot_be_fitted_are_exit_code_1(run: Run, tmp_path: Path) -> None:
    path = written(made(scaling), tmp_path / "f.json")
    alone = run("fit", "collapse", path, "--sizes", "8")
    assert (alone.code, alone.out) == (1, "")
    assert "collapse cannot be fitted: finite-size scaling needs at least two sizes" in alone.err
    series = run("fit", "times", path, "--where", "p=0.2")
    assert (series.code, "i3 is read once per trajectory" in series.err) == (1, True)
    assert "no histograms by fold" in run("fit", "purity", path).err


def test_a_source_that_is_neither_file_nor_key_is_misuse(run: Run, tmp_path: Path) -> None:
    for source, message in (("transition", "is no file, and no key"), (tmp_path / "no.arrow", "there is no such file")):
        done = run("fit", "collapse", source)
        assert (done.code, message in " ".join(done.err.split())) == (2, True)
    other = tmp_path / "other.json"
    other.write_text('{"columns": {"a": [1]}, "metadata": {}}')
    assert "neither a table nor folds" in run("fit", "collapse", other).err


def test_a_missing_extra_is_named(run: Run, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    for module in [name for name in sys.modules if name.startswith("sweepmill.analysis")]:
        monkeypatch.delitem(sys.modules, module)
    monkeypatch.setitem(sys.modules, "scipy", None)
    done = run("fit", "collapse", written(made(scaling), tmp_path / "f.json"))
    assert done.code == 1
    assert 'pip install "sweepmill[analysis]"' in done.err


def test_a_series_is_judged_and_a_sweep_without_one_gets_a_companion(
    run: Run, key: str, service_url: str, tmp_path: Path
) -> None:
    judged = run("steady", key, "--url", service_url, "--json", tmp_path / "s.json", "--figure", tmp_path / "s.svg")
    assert (judged.code, judged.err) == (0, "")
    assert judged.out.splitlines()[0].startswith(f"sweep {key[:12]}, 18 ensembles")
    assert "series: " in judged.out
    assert len(json.loads((tmp_path / "s.json").read_text())["ensembles"]) == 18
    assert (tmp_path / "s.svg").exists()

    printed = run("steady", key, "--of", "half", "--url", service_url)
    assert printed.code == 1
    assert "no observation was read along the layers" in printed.err
    path = tmp_path / "companion.json"
    kept = run("steady", key, "--of", "half", "--companion", path, "--url", service_url)
    assert kept.code == 0
    assert f"sweepmill submit {path} --watch" in kept.out
    assert Sweep.read(path) == Sweep.parse(json.loads(printed.out))

    once = written(made(scaling), tmp_path / "f.json")
    assert "give the key of the sweep" in run("steady", once).err
