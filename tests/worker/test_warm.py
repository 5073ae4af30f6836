"""Compiled kernels land in one cache, for other processes to load."""

import os
import subprocess
import sys
from pathlib import Path

import pytest

from sweepmill_worker import jit, warm
from sweepmill_worker.clifford.state import lanes_for

WORD_ENTRIES = """
from sweepmill_worker.warm import all_compiled, load
from sweepmill_worker.words import fill
load("words", 8)
print(sum(fill.stats.cache_hits.values()), sum(fill.stats.cache_misses.values()), all_compiled(8, ["words"]))
"""
LOADED = """
from sweepmill_worker.clifford.trajectories import run_batch
from sweepmill_worker.clusters.trajectories import run_batch as run_clusters
from sweepmill_worker.program.execute import run_trajectories
from sweepmill_worker.warm import warm
warm(sites_up_to=32)
entries = (run_batch, run_clusters, run_trajectories)
assert all(sum(entry.stats.cache_hits.values()) >= 1 for entry in entries), [entry.stats for entry in entries]
assert not any(entry.stats.cache_misses for entry in entries), [entry.stats for entry in entries]
"""


def run(script: str, **environment: str) -> str:
    found = subprocess.run(
        [sys.executable, "-c", script], check=True, env=os.environ | environment, capture_output=True, text=True
    )
    return found.stdout


def test_every_width_of_vectors_has_its_size() -> None:
    assert [lanes_for(sites) for sites in warm.SIZES] == [1, 2, 4, 8]
    assert [warm.widths(sites) for sites in (1, 33, 65, 129, 4096)] == [1, 2, 3, 4, 4]


def test_the_cache_is_where_the_environment_says(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("NUMBA_CACHE_DIR", str(tmp_path))
    assert jit.cache_directory() == tmp_path
    monkeypatch.delenv("NUMBA_CACHE_DIR")
    assert jit.cache_directory().parent.name == "kernels"


def test_a_warmed_cache_compiles_nothing_in_the_next_process() -> None:
    warm.warm(sites_up_to=32)
    run(LOADED)


def test_what_is_compiled_is_noted_beside_it(tmp_path: Path) -> None:
    assert run(WORD_ENTRIES, NUMBA_CACHE_DIR=str(tmp_path)).split() == ["0", "1", "True"]
    assert run(WORD_ENTRIES, NUMBA_CACHE_DIR=str(tmp_path)).split() == ["1", "0", "True"]


def test_the_command_reports_where_the_kernels_are(
    capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(sys, "argv", ["warm", "--sites-up-to", "16"])
    warm.main()
    assert str(jit.cache_directory()) in capsys.readouterr().out
