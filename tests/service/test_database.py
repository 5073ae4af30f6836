"""Opening databases: what is refused, what is set, who may dispatch."""

import subprocess
import sys
from pathlib import Path

import pytest
from sqlalchemy import Engine, text
from sqlalchemy.exc import OperationalError

from support.databases import PostgresServer
from sweepmill_service.database import DatabaseUnusable, file_system, open_database, writing
from sweepmill_service.store.leadership import AlreadyServed, leadership


def test_other_databases_and_databases_in_memory_are_refused() -> None:
    for url, why in (("mysql://host/name", "mysql"), ("sqlite://", "in memory"), ("sqlite:///:memory:", "in memory")):
        with pytest.raises(DatabaseUnusable, match=why):
            open_database(url)


def test_a_network_file_system_is_recognized(tmp_path: Path) -> None:
    mounts = tmp_path / "mounts"
    mounts.write_text(f"/dev/sda / ext4 rw 0 0\nserver:/x {tmp_path} nfs4 rw 0 0\n")
    assert file_system(tmp_path / "deep", str(mounts)) == "nfs4"
    assert file_system(Path("/usr"), str(mounts)) == "ext4"
    assert file_system(tmp_path, str(tmp_path / "absent")) is None


def test_sqlite_on_a_network_file_system_is_refused(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("sweepmill_service.database.file_system", lambda _: "nfs4")
    with pytest.raises(DatabaseUnusable, match="network file system"):
        open_database(f"sqlite:///{tmp_path / 'x.sqlite'}")


def test_sqlite_keeps_what_it_acknowledged(tmp_path: Path) -> None:
    engine = open_database(f"sqlite:///{tmp_path / 'new' / 'x.sqlite'}")
    with engine.connect() as connection:
        settings = [connection.exec_driver_sql(f"PRAGMA {name}").scalar() for name in ("journal_mode", "synchronous")]
    assert settings == ["wal", 2]
    engine.dispose()


def test_a_sqlite_writer_reserves_the_file_before_it_reads(tmp_path: Path) -> None:
    engine = open_database(f"sqlite:///{tmp_path / 'x.sqlite'}")
    with writing(engine).begin() as connection:
        connection.exec_driver_sql("CREATE TABLE t (n)")
    with writing(engine).begin() as first, engine.connect() as reader:
        first.exec_driver_sql("SELECT 1")
        assert reader.exec_driver_sql("SELECT count(*) FROM t").scalar() == 0
        with engine.connect() as second:
            second.exec_driver_sql("PRAGMA busy_timeout=0")
            with pytest.raises(OperationalError, match="locked"):
                second.exec_driver_sql("INSERT INTO t VALUES (1)")
    engine.dispose()


def test_postgres_gives_up_on_statements_that_take_too_long(postgres: PostgresServer) -> None:
    with postgres.database() as url:
        engine = open_database(url.replace("postgresql://", "postgresql+psycopg://"))
        with engine.connect() as connection:
            shown = [connection.scalar(text(f"SHOW {name}")) for name in ("statement_timeout", "lock_timeout")]
        assert shown == ["1min", "15s"]
        engine.dispose()


def test_a_second_dispatcher_on_one_sqlite_file_is_refused_by_name(tmp_path: Path) -> None:
    path = tmp_path / "x.sqlite"
    engine = open_database(f"sqlite:///{path}")
    first = leadership(engine)
    assert first.acquire()
    assert first.acquire()
    with pytest.raises(AlreadyServed, match=str(path)):
        leadership(engine).acquire()
    first.release()
    second = leadership(engine)
    assert second.acquire()
    second.release()
    engine.dispose()


HOLDER = """
import sys
from sweepmill_service.database import open_database
from sweepmill_service.store.leadership import leadership
lead = leadership(open_database(sys.argv[1]))
assert lead.acquire()
print("held", flush=True)
sys.stdin.read()
"""


def test_a_killed_service_leaves_its_sqlite_file_free(tmp_path: Path) -> None:
    url = f"sqlite:///{tmp_path / 'x.sqlite'}"
    engine = open_database(url)
    command = [sys.executable, "-c", HOLDER, url]
    with subprocess.Popen(command, stdin=subprocess.PIPE, stdout=subprocess.PIPE, text=True) as holder:
        assert holder.stdout is not None
        assert holder.stdout.readline() == "held\n"
        with pytest.raises(AlreadyServed):
            leadership(engine).acquire()
        holder.kill()
    lead = leadership(engine)
    assert lead.acquire()
    lead.release()
    engine.dispose()


def test_a_second_dispatcher_on_one_postgres_database_waits_for_the_first(postgres: PostgresServer) -> None:
    with postgres.database() as url, postgres.database() as elsewhere:
        engines: list[Engine] = [open_database(one) for one in (url, url, elsewhere)]
        first, second, other = map(leadership, engines)
        assert first.acquire()
        assert not second.acquire()
        assert other.acquire()
        first.release()
        assert second.acquire()
        assert not first.acquire()
        for one in (first, second, other):
            one.release()
        for engine in engines:
            engine.dispose()
