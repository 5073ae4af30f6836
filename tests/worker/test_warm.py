"""Compiled kernels land in one cache, for other processes to load."""

import os
import subprocess
import sys
from pathlib import Path

import pytest

from sweepmill_worker import jit
from sweepmill_worker.warm import SIZES, main, warm


def test_every_width_of_vectors_has_its_size() -> None:
    from sweepmill_worker.clifford.state import lanes_for

    assert [lanes_for(sites) for sites in SIZES] == [1, 2, 4, 8]


def test_the_cache_is_where_the_environment_says(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("NUMBA_CACHE_DIR", str(tmp_path))
    assert jit.cache_directory() == tmp_path
    monkeypatch.delenv("NUMBA_CACHE_DIR")
    assert jit.cache_directory().parent.name == "kernels"


def test_a_warmed_cache_compiles_nothing_in_the_next_process() -> None:
    warm(sites_up_to=32)
    script = (
        "from sweepmill_worker.clifford.engine import HybridChain, run\n"
        "from sweepmill_worker.clifford.trajectories import run_batch\n"
        "run(HybridChain(8, 4, True, False, 2**30), (0, 0), 0, 1, [4], [(0, 1)])\n"
        "assert sum(run_batch.stats.cache_hits.values()) == 1, run_batch.stats\n"
        "assert not run_batch.stats.cache_misses, run_batch.stats\n"
    )
    subprocess.run([sys.executable, "-c", script], check=True, env=dict(os.environ))


def test_the_command_reports_where_the_kernels_are(
    capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(sys, "argv", ["warm", "--sites-up-to", "16"])
    main()
    assert str(jit.cache_directory()) in capsys.readouterr().out
