"""The store: each method is one short transaction."""

from collections.abc import Collection, Iterator, Sequence
from typing import Any

from sqlalchemy import Engine, select

from sweepmill.messages import EnsembleRecord, ProgressPage, Round, SweepList, SweepStatus
from sweepmill.sweep import Sweep
from sweepmill_service import schema
from sweepmill_service.database import writing
from sweepmill_service.plan.marks import Reach
from sweepmill_service.store import (
    commits,
    dispatching,
    evidence,
    judging,
    keys,
    loading,
    progress,
    records,
    requests,
    rounds,
    sampled,
    status,
    tables,
    values,
)
from sweepmill_service.store.loading import LiveSweep, OpenEnsemble
from sweepmill_service.store.requests import UNSET, Submission, Unset
from sweepmill_service.store.results import BatchFault, BatchResult, Outcome, Start
from sweepmill_service.store.rounds import Decision, Evidence
from sweepmill_service.store.tables import TableEntry
from sweepmill_service.store.values import KeptChunk, KeptEntry


class Store:
    """What requests and the dispatcher read and write. Raises UnknownKey for keys that are not there."""

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

    def amend(self, key: str, owner: str, label: str | Unset | None = UNSET, priority: int | Unset = UNSET) -> bool:
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

    def progress(self, key: str, since: int | None = None, limit: int = 500, after: int | None = None) -> ProgressPage:
        """A page of a sweep's ensembles in table order."""
        with self.engine.connect() as connection:
            return progress.progress(connection, key, since, limit, after)

    def already_sampled(self, ensembles: Sequence[str], observations: Sequence[str]) -> dict[tuple[str, str], int]:
        """Length N of the sampled prefix of each (ensemble key, observation key) that has one."""
        with self.engine.connect() as connection:
            return progress.already_sampled(connection, ensembles, observations)

    def seconds_per_trajectory(self, ensembles: Sequence[str]) -> dict[str, float]:
        """Measured core-seconds per trajectory of ensembles sampled before."""
        with self.engine.connect() as connection:
            return progress.seconds_per_trajectory(connection, ensembles)

    def recent_batches(self) -> list[evidence.Timed]:
        """The last batches of a few ensembles of the latest sweeps."""
        with self.engine.connect() as connection:
            return evidence.recent_batches(connection)

    def batches_of(self, ensembles: Sequence[str]) -> list[evidence.Timed]:
        """The last batches of these ensembles."""
        with self.engine.connect() as connection:
            return evidence.batches_of(connection, ensembles)

    def recent_totals(self, families: Sequence[str], observations: Sequence[str]) -> list[evidence.Scattered]:
        """Totals of these observations on a few ensembles of the latest sweeps with these families."""
        with self.engine.connect() as connection:
            return evidence.recent_totals(connection, families, observations)

    def totals_of(self, ensembles: Sequence[str], observations: Sequence[str]) -> list[evidence.Scattered]:
        """Totals of these observations on these ensembles."""
        with self.engine.connect() as connection:
            return evidence.totals_of(connection, ensembles, observations)

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

    def kept_entries(self, key: str, observation: str) -> list[KeptEntry]:
        """The N of every ensemble of a sweep whose values of an observation are served."""
        with self.engine.connect() as connection:
            return values.kept_entries(connection, key, observation)

    def kept_chunks(self, ensemble: str, observation: str, number: int) -> Iterator[KeptChunk]:
        """Packed values of the first trajectories of an ensemble, paged in short transactions."""
        return values.kept_chunks(self.engine, ensemble, observation, number)

    def ensemble_record(self, key: str) -> EnsembleRecord:
        """Parameters, counts and provenance of an ensemble."""
        with self.engine.connect() as connection:
            return records.ensemble_record(connection, key)

    def normal_forms(self, key: str) -> tuple[dict[str, Any], dict[str, dict[str, Any]]]:
        """Normal form of an ensemble and, by key, of the observations sampled of it."""
        with self.engine.connect() as connection:
            return records.normal_forms(connection, key)

    def change_counter(self) -> int:
        """Grows with every submission, withdrawal and amendment."""
        with self.engine.connect() as connection:
            return loading.change_counter(connection)

    def live_sweeps(self) -> list[LiveSweep]:
        """Sweeps that are requested and neither settled nor stuck, oldest first."""
        with self.engine.connect() as connection:
            return loading.live_sweeps(connection)

    def open_ensembles(self, key: str) -> list[OpenEnsemble]:
        """Ensembles of a sweep that are not settled, with what is stored of them."""
        with self.engine.connect() as connection:
            return loading.open_ensembles(connection, key)

    def ranges(self, key: str) -> tuple[dict[str, Reach], dict[str, dict[int, int]]]:
        """By observation key, how far an ensemble is and which batches (first -> count) wait beyond that."""
        with self.engine.connect() as connection:
            return loading.ranges(connection, key)

    def observation_forms(self, keys: Collection[str]) -> dict[str, dict[str, Any]]:
        """Normal forms of observations by key."""
        with self.engine.connect() as connection:
            return loading.observation_forms(connection, keys)

    def superseded(self, key: str) -> bool:
        """Whether a sweep rests on other revisions than this code's."""
        with self.engine.connect() as connection:
            return loading.superseded(connection, key)

    def due_ensembles(self, key: str) -> list[str]:
        """Ensembles of a sweep that may be judged, after bringing its progress up to date."""
        with self._writer.begin() as connection:
            sampled.refresh_sampled(connection, key)
            return loading.due_ensembles(connection, key)

    def judge(self, ensembles: Collection[str]) -> Outcome:
        """Judge every open member of these ensembles as far as its totals allow."""
        with self._writer.begin() as connection:
            return judging.judge(connection, ensembles)

    def commit(self, results: Sequence[BatchResult]) -> Outcome:
        """Store results, fold, judge and charge, all in one transaction; twice the same changes nothing."""
        with self._writer.begin() as connection:
            return commits.commit(connection, results)

    def evidence(self, key: str) -> Evidence:
        """What the next round of a sweep with a goal is judged on."""
        with self.engine.connect() as connection:
            return rounds.evidence(connection, key)

    def close_round(self, known: Evidence, decision: Decision) -> Outcome | None:
        """Note a round and what follows; None where the sweep has moved on since the evidence was read."""
        with self._writer.begin() as connection:
            return rounds.close_round(connection, known, decision)

    def end_rounds(self, key: str, reason: str) -> bool:
        """Settle a sweep with a goal where its last round left it; False if no round was judged."""
        with self._writer.begin() as connection:
            return rounds.end_rounds(connection, key, reason)

    def rounds(self, key: str) -> list[Round]:
        """The rounds in which the goal of a sweep was judged."""
        with self.engine.connect() as connection:
            return rounds.rounds(connection, key)

    def log_starts(self, starts: Sequence[Start], run: str) -> None:
        """Note tasks before they are handed to the pool."""
        with self._writer.begin() as connection:
            dispatching.log_starts(connection, starts, run)

    def record_fault(self, failed: BatchFault, attempts: int) -> int:
        """Note a failed attempt and return its number; from ``attempts`` on the ensemble is stuck."""
        with self._writer.begin() as connection:
            return dispatching.record_fault(connection, failed, attempts)

    def stick_sweep(self, key: str, reason: str) -> bool:
        """Mark a sweep that cannot proceed as a whole; False if it is not under way."""
        with self._writer.begin() as connection:
            return dispatching.stick_sweep(connection, key, reason)

    def stick_sweeps(self, keys: Collection[str]) -> list[str]:
        """Mark those sweeps stuck whose ensembles are all settled or stuck; returns their keys."""
        with self._writer.begin() as connection:
            return dispatching.stick_sweeps(connection, keys)
