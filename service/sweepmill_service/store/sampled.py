"""Progress of a sweep from the totals that are there: for new sweeps and after a restart."""

from sqlalchemy import ColumnElement, Connection, ScalarSelect, case, func, select, update

from sweepmill_service.schema import sweep, sweep_ensemble, sweep_observation, total
from sweepmill_service.store.common import SAMPLING, WAITING


def refresh_sampled(connection: Connection, key: str) -> None:
    """Set ``sampled`` of every ensemble of a sweep that is not settled, and the sweep's sum."""
    open_rows = (sweep_ensemble.c.sweep == key, sweep_ensemble.c.met_by.is_(None))
    value = _covered(key)
    counter = select(sweep.c.commit_counter + 1).where(sweep.c.key == key).scalar_subquery()
    changed = update(sweep_ensemble).where(*open_rows, sweep_ensemble.c.sampled != value)
    connection.execute(changed.values(sampled=value, changed=counter))
    summed = func.coalesce(func.sum(sweep_ensemble.c.sampled), 0)
    number = select(summed).where(sweep_ensemble.c.sweep == key).scalar_subquery()
    differs = (sweep.c.key == key, sweep.c.trajectories_sampled != number)
    connection.execute(update(sweep).where(*differs).values(trajectories_sampled=number, **_moved()))


def _moved() -> dict[str, ColumnElement[object]]:
    state = case((sweep.c.state == WAITING, SAMPLING), else_=sweep.c.state)
    return {"commit_counter": sweep.c.commit_counter + 1, "state": state}


def _covered(key: str) -> ScalarSelect[int]:
    """Trajectories, up to the cap, that every observation of the sweep has."""
    wanted = select(sweep_observation.c.observation).where(sweep_observation.c.sweep == key)
    number = (
        select(func.count(func.distinct(sweep_observation.c.observation)))
        .where(sweep_observation.c.sweep == key)
        .scalar_subquery()
    )
    least = func.min(total.c.trajectories)
    capped = case((least > sweep_ensemble.c.cap, sweep_ensemble.c.cap), else_=least)
    complete: ColumnElement[int] = case((func.count() == number, capped), else_=0)
    return (
        select(complete)
        .where(total.c.ensemble == sweep_ensemble.c.ensemble, total.c.observation.in_(wanted))
        .correlate(sweep_ensemble)
        .scalar_subquery()
    )
