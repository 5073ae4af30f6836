"""The specifications that come with the package."""

import tomllib
from pathlib import Path

import pytest

import sweepmill
from sweepmill import Sweep, layered_form
from sweepmill.language.written import circuit_toml

FILES = sorted((Path(sweepmill.__file__).parent / "examples").glob("*.toml"))


def name_of(path: Path) -> str:
    return path.stem


@pytest.mark.parametrize("file", FILES, ids=name_of)
def test_an_example_is_a_valid_sweep_with_axes_marked_as_invented(file: Path) -> None:
    assert len(Sweep.read(file).axes) >= 2
    assert file.read_text(encoding="utf-8").startswith("# Invented scenario")


@pytest.mark.parametrize("file", FILES, ids=name_of)
def test_the_circuit_of_an_example_written_as_toml_is_the_same_circuit(file: Path) -> None:
    ensemble = Sweep.read(file).points[-1].ensemble
    text = circuit_toml(layered_form(ensemble))
    rest = {"observe": [{"quantity": "entropy", "at": "end"}], "stop": {"trajectories": 10}}
    (point,) = Sweep.parse({**tomllib.loads(text), **rest}).points
    assert point.ensemble.normal_form() == layered_form(ensemble)
