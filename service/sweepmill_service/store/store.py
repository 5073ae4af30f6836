"""The store: each method is one short transaction."""

from collections.abc import Iterator, Sequence
from typing import Any

from sqlalchemy import Engine, select
from sweepmill.messages import EnsembleRecord, ProgressPage, SweepList, SweepStatus
from sweepmill.sweep import Sweep

from sweepmill_service import schema
from sweepmill_service.database import writing
from sweepmill_service.store import keys, progress, records, requests, status, tables
from sweepmill_service.store.requests import UNSET, Submission, Unset
from sweepmill_service.store.tables import TableEntry


class Store:
    """What requests read and write. Raises UnknownKey for keys that are not there."""

    def __init__(self, engine: Engine) -> None:
        self.engine = engine
        self._writer = writing(engine)

    def ping(self) -> None:
        """Raise what the database raises if it does not answer."""
        with self.engine.connect() as connection:
            connection.execute(select(1))

    def submit(self, sweep: Sweep, owner: str) -> Submission:
        """Store a sweep with the owner's request; the same sweep again joins it, or restores it."""
        with self._writer.begin() as connection:
            return requests.submit(connection, sweep, owner)

    def withdraw(self, key: str, owner: str) -> bool:
        """Remove the owner's request, keeping what was sampled; False if there was none."""
        with self._writer.begin() as connection:
            return requests.withdraw(connection, key, owner)

    def amend(
        self, key: str, owner: str, label: str | Unset | None = UNSET, priority: int | Unset = UNSET
    ) -> bool:
        """Change label or priority of the owner's request; False if there is none."""
        with self._writer.begin() as connection:
            return requests.amend(connection, key, owner, label, priority)

    def find_sweep(self, prefix: str) -> str:
        """Full key of a sweep; raises ShortKey, UnknownKey, AmbiguousKey."""
        with self.engine.connect() as connection:
            return keys.find(connection, schema.sweep, prefix)

    def find_ensemble(self, prefix: str) -> str:
        """Full key of an ensemble; raises ShortKey, UnknownKey, AmbiguousKey."""
        with self.engine.connect() as connection:
            return keys.find(connection, schema.ensemble, prefix)

    def sweep_status(self, key: str) -> SweepStatus:
        """One sweep with its progress."""
        with self.engine.connect() as connection:
            return status.sweep_status(connection, key)

    def list_sweeps(
        self,
        owner: str | None = None,
        state: str | None = None,
        family: str | None = None,
        limit: int = 50,
        after: str | None = None,
    ) -> SweepList:
        """A page of sweeps, newest first."""
        with self.engine.connect() as connection:
            return status.list_sweeps(connection, owner, state, family, limit, after)

    def specification(self, key: str) -> str:
        """Canonical JSON of a sweep's normal form."""
        with self.engine.connect() as connection:
            return status.specification(connection, key)

    def commit_counter(self, key: str) -> int:
        """Grows with every change of a sweep's progress or state."""
        with self.engine.connect() as connection:
            return status.commit_counter(connection, key)

    def progress(
        self, key: str, since: int | None = None, limit: int = 500, after: int | None = None
    ) -> ProgressPage:
        """A page of a sweep's ensembles in table order."""
        with self.engine.connect() as connection:
            return progress.progress(connection, key, since, limit, after)

    def already_sampled(
        self, ensembles: Sequence[str], observations: Sequence[str]
    ) -> dict[tuple[str, str], int]:
        """Length N of the sampled prefix of each (ensemble key, observation key) that has one."""
        with self.engine.connect() as connection:
            return progress.already_sampled(connection, ensembles, observations)

    def seconds_per_trajectory(self, ensembles: Sequence[str]) -> dict[str, float]:
        """Measured core-seconds per trajectory of ensembles sampled before."""
        with self.engine.connect() as connection:
            return progress.seconds_per_trajectory(connection, ensembles)

    def table_entries(self, key: str) -> Iterator[TableEntry]:
        """Totals of a sweep in table order, paged in short transactions."""
        return tables.table_entries(self.engine, key)

    def table_version(self, key: str) -> str:
        """Digest over the N of every ensemble and observation of a sweep."""
        with self.engine.connect() as connection:
            return tables.table_version(connection, key)

    def frozen_digests(self, key: str) -> dict[str, str]:
        """Digest of every settled ensemble of a sweep."""
        with self.engine.connect() as connection:
            return tables.frozen_digests(connection, key)

    def ensemble_record(self, key: str) -> EnsembleRecord:
        """Parameters, counts and provenance of an ensemble."""
        with self.engine.connect() as connection:
            return records.ensemble_record(connection, key)

    def normal_forms(self, key: str) -> tuple[dict[str, Any], dict[str, dict[str, Any]]]:
        """Normal form of an ensemble and, by key, of the observations sampled of it."""
        with self.engine.connect() as connection:
            return records.normal_forms(connection, key)
