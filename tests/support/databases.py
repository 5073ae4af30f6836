"""A Postgres server of the test session's own, and databases to test on."""

import os
import pwd
import shutil
import subprocess
import tempfile
from collections.abc import Callable, Iterator
from contextlib import AbstractContextManager, contextmanager
from pathlib import Path
from typing import Any
from uuid import uuid4

import psycopg

PLACES = ("/usr/lib/postgresql", "/usr/pgsql", "/opt/homebrew/opt", "/usr/local/opt")
UNPRIVILEGED = ("postgres", "nobody")

DatabaseMaker = Callable[..., AbstractContextManager[str]]  # (migrated=True) -> URL of a fresh database


def postgres_tool(name: str) -> str:
    """Path of a Postgres server program; a missing one is an error, because these tests are never skipped."""
    found = [str(path) for place in PLACES for path in sorted(Path(place).glob(f"*/bin/{name}"))]
    if found:
        return found[-1]
    if path := shutil.which(name):
        return path
    raise RuntimeError(
        f"{name} was not found on PATH or under {', '.join(PLACES)}: install the Postgres server package "
        "(Debian and Ubuntu: apt-get install postgresql), the tests start a server of their own"
    )


class PostgresServer:
    """A server in a temporary directory, reached over a Unix socket there; never run as root."""

    def __init__(self) -> None:
        self.home = Path(tempfile.mkdtemp(prefix="sweepmill-pg-"))
        self.data = self.home / "data"
        self._prefix: list[str] = []
        if os.geteuid() == 0:
            self._become_unprivileged()
        initialize = [postgres_tool("initdb"), "-D", str(self.data), "-A", "trust", "-U", "tester", "-E", "UTF8"]
        self._run([*initialize, "--no-sync", "--locale=C"])
        self.start()

    def start(self) -> None:
        """Start it and wait until it answers."""
        options = f"-k {self.home} -c listen_addresses='' -c max_connections=200 -c shared_buffers=32MB"
        log = str(self.home / "log")
        self._run([postgres_tool("pg_ctl"), "-D", str(self.data), "-w", "-t", "60", "-l", log, "-o", options, "start"])

    def stop(self, mode: str = "fast") -> None:
        """Stop it: ``fast`` rolls open transactions back, ``immediate`` is a crash."""
        self._run([postgres_tool("pg_ctl"), "-D", str(self.data), "-w", "-t", "60", "-m", mode, "stop"])

    def remove(self) -> None:
        """Stop it and delete everything."""
        self.stop("immediate")
        shutil.rmtree(self.home, ignore_errors=True)

    def url(self, database: str) -> str:
        """SQLAlchemy URL of one of its databases."""
        return f"postgresql://tester@/{database}?host={self.home}"

    def execute(self, statement: str) -> None:
        """Run one administrative statement."""
        with psycopg.connect(host=str(self.home), user="tester", dbname="postgres", autocommit=True) as connection:
            connection.execute(statement.encode())

    @contextmanager
    def database(self, template: str = "template1") -> Iterator[str]:
        """URL of a fresh database, dropped afterwards."""
        name = f"test_{uuid4().hex}"
        self.execute(f"CREATE DATABASE {name} TEMPLATE {template} STRATEGY file_copy")
        try:
            yield self.url(name)
        finally:
            self.execute(f"DROP DATABASE {name} WITH (FORCE)")

    def _become_unprivileged(self) -> None:
        known = {entry.pw_name: entry for entry in pwd.getpwall()}
        user = next(known[name] for name in UNPRIVILEGED if name in known)
        os.chown(self.home, user.pw_uid, user.pw_gid)
        groups = ["--reuid", str(user.pw_uid), "--regid", str(user.pw_gid), "--clear-groups"]
        self._prefix = ["setpriv", *groups]

    def _run(self, command: list[str]) -> None:
        done = subprocess.run(
            [*self._prefix, *command],
            cwd=self.home,
            stdin=subprocess.DEVNULL,
            stdout=subprocess.DEVNULL,
            stderr=subprocess.PIPE,
            text=True,
            check=False,
        )
        if done.returncode:
            log = self.home / "log"
            raise RuntimeError(f"{command[0]} failed: {done.stderr}{log.read_text() if log.exists() else ''}")


class Statements:
    """Statements sent to a database since :meth:`clear`."""

    def __init__(self) -> None:
        self.sent: list[str] = []

    def clear(self) -> None:
        """Forget what was sent."""
        self.sent.clear()

    def note(self, *arguments: Any) -> None:
        """Listener of before_cursor_execute."""
        self.sent.append(arguments[2])

    def __len__(self) -> int:
        return len(self.sent)
