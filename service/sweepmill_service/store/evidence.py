"""What was measured of a few ensembles, bounded however large the store is: times of batches, and totals.

The few are spread over the latest sweeps of every combination of families.  Of each, the times of the last commit are
taken, found by an index: no query scans the batches.
"""

from collections.abc import Iterable, Sequence
from typing import Any, NamedTuple

from sqlalchemy import Connection, func, select, union_all
from sqlalchemy import literal as value

from sweepmill_service.schema import batch, ensemble, observation, sweep, sweep_ensemble, total
from sweepmill_service.store.common import chunks

SWEEPS = 12  # of each combination of families
ENSEMBLES = 16  # of each sweep
MOST = 1500  # ensembles in all
FORM_CHARACTERS = 50_000  # longer circuits are left out: reading them takes longer than it teaches
TOTAL_BYTES = 65_536
MOST_TOTALS = 400
LEAST = 30  # trajectories of a total that tells how they scatter


class Timed(NamedTuple):
    """One batch: normal forms of the ensemble and of the observations it carried, trajectories and core-seconds."""

    ensemble: str
    observations: tuple[str, ...]
    trajectories: int
    seconds: float


class Scattered(NamedTuple):
    """One total: the keys and normal forms of an ensemble and an observation, and the accumulator."""

    ensemble_key: str
    observation_key: str
    ensemble: str
    observation: str
    accumulator: bytes


def recent_batches(connection: Connection) -> list[Timed]:
    """The last batches of a few ensembles of the latest sweeps."""
    return _batches(connection, select(_few().c.ensemble))


def batches_of(connection: Connection, ensembles: Iterable[str]) -> list[Timed]:
    """The last batches of these ensembles."""
    return [one for piece in chunks(ensembles) for one in _batches(connection, piece)]


def recent_totals(connection: Connection, families: Sequence[str], observations: Sequence[str]) -> list[Scattered]:
    """Totals of these observations, on a few ensembles of the latest sweeps with these families."""
    return _totals(connection, select(_few(families, MOST_TOTALS // len(observations)).c.ensemble), observations)


def totals_of(connection: Connection, ensembles: Iterable[str], observations: Sequence[str]) -> list[Scattered]:
    """Totals of these observations on these ensembles."""
    return [one for piece in chunks(ensembles) for one in _totals(connection, piece, observations)]


def _few(families: Sequence[str] = (), most: int = MOST) -> Any:
    """Keys of ensembles spread over the latest sweeps."""
    age = func.row_number().over(partition_by=sweep.c.families, order_by=sweep.c.created_at.desc())
    sampled = select(sweep.c.key, sweep.c.ensembles, sweep.c.created_at, age.label("age")).where(
        sweep.c.core_seconds > 0
    )
    latest = sampled.subquery()
    nth = union_all(*(select(value(n).label("n")) for n in range(ENSEMBLES))).subquery()
    step = (latest.c.ensembles + (ENSEMBLES - 1)) // ENSEMBLES
    ordinal = nth.c.n * step + (nth.c.n * 5) % step  # not always the same place along an axis
    here = (sweep_ensemble.c.sweep == latest.c.key) & (sweep_ensemble.c.ordinal == ordinal)
    chosen = (
        select(sweep_ensemble.c.ensemble)
        .select_from(latest.join(nth, latest.c.age <= SWEEPS).join(sweep_ensemble, here))
        .order_by(latest.c.created_at.desc(), nth.c.n)
        .limit(most)
    )
    if families:
        mine = ensemble.c.family.in_(families)
        chosen = chosen.join(ensemble, ensemble.c.key == sweep_ensemble.c.ensemble).where(mine)
    return chosen.subquery()


def _batches(connection: Connection, ensembles: Any) -> list[Timed]:
    other = batch.alias()
    last = select(func.max(other.c.at)).where(other.c.ensemble == ensemble.c.key).scalar_subquery()
    statement = (
        select(
            batch.c.ensemble,
            batch.c.first,
            batch.c.count,
            batch.c.seconds,
            ensemble.c.normal_form.label("form"),
            observation.c.normal_form.label("read"),
        )
        .join(ensemble, ensemble.c.key == batch.c.ensemble)
        .join(observation, observation.c.key == batch.c.observation)
        .where(ensemble.c.key.in_(ensembles), batch.c.at == last)
        .where(func.length(ensemble.c.normal_form) <= FORM_CHARACTERS)
        .order_by(batch.c.ensemble, batch.c.first, batch.c.observation)
    )
    found: dict[tuple[str, int], list[Any]] = {}
    for row in connection.execute(statement):
        found.setdefault((row.ensemble, row.first), []).append(row)
    return [
        Timed(rows[0].form, tuple(row.read for row in rows), rows[0].count, sum(row.seconds for row in rows))
        for rows in found.values()
    ]


def _totals(connection: Connection, ensembles: Any, observations: Sequence[str]) -> list[Scattered]:
    statement = (
        select(
            total.c.ensemble,
            total.c.observation,
            ensemble.c.normal_form,
            observation.c.normal_form,
            total.c.accumulator,
        )
        .join(ensemble, ensemble.c.key == total.c.ensemble)
        .join(observation, observation.c.key == total.c.observation)
        .where(total.c.ensemble.in_(ensembles), total.c.observation.in_(observations))
        .where(total.c.trajectories >= LEAST, func.length(total.c.accumulator) <= TOTAL_BYTES)
        .where(func.length(ensemble.c.normal_form) <= FORM_CHARACTERS)
    )
    return [Scattered(*row) for row in connection.execute(statement)]
