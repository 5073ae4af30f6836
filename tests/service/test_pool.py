"""Local and external pools, as real processes."""

import json
import os
import signal
import subprocess
import sys
from collections.abc import Iterator
from pathlib import Path

import pytest

from support.dask_processes import DaskProcesses
from support.pools import QuickSettings, process_exists, until, worker_pids
from support.sweeps import keys_of, small_sweep
from sweepmill_service.database import open_database
from sweepmill_service.dispatcher import Dispatcher
from sweepmill_service.migrations import migrate
from sweepmill_service.pool import ExternalPool, LocalPool, PoolUnavailable, difference, worker_versions
from sweepmill_service.store import Store

TESTS = Path(__file__).parents[1]


@pytest.fixture
def sqlite_store(tmp_path: Path) -> Iterator[Store]:
    engine = open_database(f"sqlite:///{tmp_path / 'x.sqlite'}")
    migrate(engine)
    yield Store(engine)
    engine.dispose()


@pytest.fixture
def dask_processes(tmp_path: Path) -> Iterator[DaskProcesses]:
    processes = DaskProcesses(tmp_path)
    yield processes
    processes.kill_all()


def test_workers_of_a_killed_service_end_with_it() -> None:
    command = [sys.executable, str(TESTS / "support" / "pool_process.py")]
    environment = os.environ | {"PYTHONPATH": str(TESTS)}
    service = subprocess.Popen(command, env=environment, stdout=subprocess.PIPE, stderr=subprocess.DEVNULL)
    with service:
        assert service.stdout is not None
        pids = json.loads(service.stdout.readline())
        assert len(pids) == 2
        assert all(process_exists(pid) for pid in pids)
        service.send_signal(signal.SIGKILL)
        service.wait(30)
        until(lambda: not any(process_exists(pid) for pid in pids), "the workers end", seconds=10)


def test_the_lifeline_ends_a_process_whose_parent_is_another(tmp_path: Path) -> None:
    code = """if True:
        from threading import Event
        from sweepmill_service.lifeline import Lifeline
        Lifeline(parent=1).setup(None)
        Event().wait(60)
        raise SystemExit("still there")
    """
    assert subprocess.run([sys.executable, "-c", code], check=False, timeout=50, cwd=tmp_path).returncode == 0


def test_workers_are_single_threaded_and_loaded(local_pool: LocalPool) -> None:
    names = ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "NUMBA_NUM_THREADS")
    answers = local_pool.client.run(lambda: {name: os.environ.get(name) for name in names})
    assert list(answers.values()) == [dict.fromkeys(names, "1")] * 2
    workers = local_pool.workers()
    assert [worker.threads for worker in workers] == [1, 1]
    assert all(worker.address.startswith("tcp://127.0.0.1:") for worker in workers)
    assert local_pool.mismatches() == []


def test_a_closed_pool_leaves_no_processes_and_says_so() -> None:
    pool = LocalPool(1)
    pool.open()
    pids = list(worker_pids(pool).values())
    pool.close()
    until(lambda: not any(process_exists(pid) for pid in pids), "the worker ends")
    assert not pool.alive()
    with pytest.raises(PoolUnavailable):
        pool.workers()
    pool.close()


def test_a_local_pool_that_lost_all_its_workers_is_rebuilt(
    sqlite_store: Store, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr("sweepmill_service.dispatcher.PATIENCE_WITHOUT_WORKERS", 0.5)
    pool = LocalPool(1)
    dispatcher = Dispatcher(sqlite_store, pool, QuickSettings())
    dispatcher.start()
    until(lambda: dispatcher.status().ready, "the pool is ready")
    before = [worker.address for worker in dispatcher.status().workers]
    pool.client.retire_workers(before, close_workers=True, remove=True)
    until(lambda: dispatcher.status().reason == "the pool has no workers", "the loss is noticed")
    sweep = small_sweep(rates=1, cap=100)
    sqlite_store.submit(sweep, "ada")
    until(lambda: sqlite_store.sweep_status(sweep.key).state == "settled", "a new pool samples")
    assert [worker.address for worker in dispatcher.status().workers] != before
    dispatcher.stop(5)


def test_differing_versions_are_named() -> None:
    mine = worker_versions()
    assert difference(mine) is None
    assert difference(mine | {"python": "3.0"}) is None
    assert difference(mine | {"numpy": "1.0"}) == f"has numpy 1.0, the service {mine['numpy']}"
    assert "cannot run this version" in (difference(ImportError("no such module")) or "")


def test_a_scheduler_that_does_not_answer_is_named(
    dask_processes: DaskProcesses, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr("sweepmill_service.pool.WAIT_SECONDS", 0.5)
    with pytest.raises(PoolUnavailable, match=dask_processes.address):
        ExternalPool(dask_processes.address).open()


def test_an_external_pool_samples_and_survives_the_loss_of_its_scheduler(
    sqlite_store: Store, dask_processes: DaskProcesses
) -> None:
    sweep, later = small_sweep(rates=2, cap=20_000), small_sweep(rates=2, cap=21_000)
    scheduler, worker = dask_processes.scheduler(), dask_processes.worker()
    dispatcher = Dispatcher(sqlite_store, ExternalPool(dask_processes.address), QuickSettings())
    dispatcher.start()
    sqlite_store.submit(sweep, "ada")
    until(lambda: sqlite_store.sweep_status(sweep.key).trajectories > 0, "sampling began")
    scheduler.kill()
    worker.kill()
    until(lambda: not dispatcher.status().ready, "the loss is noticed")
    sqlite_store.submit(later, "ada")
    dask_processes.scheduler()
    dask_processes.worker()
    until(lambda: sqlite_store.sweep_status(later.key).state == "settled", "the sweep settles on the new one")
    dispatcher.stop(10)
    assert sqlite_store.sweep_status(sweep.key).state == "settled"


def test_a_worker_of_another_revision_is_left_out_by_name(
    sqlite_store: Store, dask_processes: DaskProcesses, tmp_path: Path
) -> None:
    (tmp_path / "sitecustomize.py").write_text(
        "import sweepmill.revisions as r\nr.FAMILY_REVISIONS['hybrid-clifford'] = 99\n"
    )
    dask_processes.scheduler()
    dask_processes.worker({"PYTHONPATH": str(tmp_path)})
    dispatcher = Dispatcher(sqlite_store, ExternalPool(dask_processes.address), QuickSettings())
    dispatcher.start()
    sweep = small_sweep(rates=1, cap=100)
    sqlite_store.submit(sweep, "ada")
    until(lambda: "hybrid-clifford=99" in (dispatcher.status().reason or ""), "the mismatch is named")
    dask_processes.worker()
    until(lambda: sqlite_store.sweep_status(sweep.key).state == "settled", "the other worker samples")
    dispatcher.stop(10)
    assert sqlite_store.ensemble_record(keys_of(sweep)[0][0]).faults == []
