"""One ensemble: parameters, counts and provenance."""

import json
from typing import Any

from sqlalchemy import Connection, Row, func, select

from sweepmill.ensemble import Ensemble
from sweepmill.messages import BatchRecord, EnsembleRecord, FaultRecord, ObservationRecord
from sweepmill_service.schema import batch, ensemble, fault, observation, total
from sweepmill_service.store.errors import UnknownKey

SHOWN = 100


def ensemble_record(connection: Connection, key: str) -> EnsembleRecord:
    """What is stored of an ensemble; raises UnknownKey."""
    row = connection.execute(select(ensemble).where(ensemble.c.key == key)).first()
    if row is None:
        raise UnknownKey("ensemble", key)
    number = connection.scalar(select(func.count()).where(batch.c.ensemble == key))
    return EnsembleRecord(
        key=key,
        family=row.family,
        parameters=dict(Ensemble.from_normal_form(json.loads(row.normal_form)).parameters),
        revision=row.revision,
        reason=row.stuck,
        observations=_observations(connection, key),
        batches=number or 0,
        core_seconds=row.core_seconds,
        latest=_latest(connection, key),
        faults=_faults(connection, key),
    )


def normal_forms(connection: Connection, key: str) -> tuple[dict[str, Any], dict[str, dict[str, Any]]]:
    """Normal form of an ensemble and, by key, of the observations sampled of it; raises UnknownKey."""
    text = connection.scalar(select(ensemble.c.normal_form).where(ensemble.c.key == key))
    if text is None:
        raise UnknownKey("ensemble", key)
    sampled = select(total.c.observation).where(total.c.ensemble == key)
    statement = select(observation.c.key, observation.c.normal_form).where(observation.c.key.in_(sampled))
    return json.loads(text), {name: json.loads(form) for name, form in connection.execute(statement)}


def _observations(connection: Connection, key: str) -> list[ObservationRecord]:
    statement = (
        select(observation.c.key, observation.c.normal_form, total.c.trajectories, total.c.digest)
        .join(total, total.c.observation == observation.c.key)
        .where(total.c.ensemble == key)
        .order_by(observation.c.key)
    )
    return [
        ObservationRecord(
            key=row.key,
            observation=json.loads(row.normal_form),
            trajectories=row.trajectories,
            digest=row.digest,
        )
        for row in connection.execute(statement)
    ]


def _latest(connection: Connection, key: str) -> list[BatchRecord]:
    columns = [column for column in batch.c if column.name not in ("accumulator", "ensemble")]
    order = (batch.c.at.desc(), batch.c.first.desc(), batch.c.observation)
    rows = connection.execute(select(*columns).where(batch.c.ensemble == key).order_by(*order).limit(SHOWN))
    return [_batch(row) for row in rows]


def _batch(row: Row[Any]) -> BatchRecord:
    return BatchRecord.model_validate(dict(row._mapping) | {"versions": json.loads(row.versions)})


def _faults(connection: Connection, key: str) -> list[FaultRecord]:
    statement = select(fault).where(fault.c.ensemble == key).order_by(fault.c.at.desc()).limit(SHOWN)
    return [FaultRecord.model_validate(dict(row)) for row in connection.execute(statement).mappings()]
