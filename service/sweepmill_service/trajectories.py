"""One trajectory recomputed on demand, within limits: it runs in a thread of the service, not in the pool."""

import threading
from collections.abc import Iterator
from contextlib import contextmanager
from http import HTTPStatus

from sweepmill.ensemble import Ensemble
from sweepmill.messages import Trajectory, TrajectoryValue
from sweepmill.observation import observation_from_normal_form
from sweepmill_service.cost import Costs
from sweepmill_service.problems import Refusal, Unavailable
from sweepmill_service.store import Store
from sweepmill_worker.sample import trajectory_values, versions

_ONE_AT_A_TIME = threading.Lock()
_QUEUE = threading.BoundedSemaphore(4)  # who waits holds a thread that other requests need


def recompute(store: Store, key: str, k: int, limit: float) -> Trajectory:
    """Values of trajectory ``k`` for all observations stored of an ensemble.

    Raises Refusal for an ensemble of which nothing is sampled, of another revision, or predicted to take longer than
    ``limit`` seconds; Unavailable while others are being recomputed.
    """
    ensemble_form, forms = store.normal_forms(key)
    ensemble = Ensemble.from_normal_form(ensemble_form)
    if not forms:
        raise _refused(f"nothing is sampled of ensemble {key} yet, so there is no observation to recompute")
    seconds = Costs.of([ensemble], store)[key].seconds
    if seconds > limit:
        raise _refused(
            f"this trajectory is predicted to take {seconds:.0f} s, the service recomputes up to {limit:g} s "
            f"(limits.recompute_seconds): use `sweepmill replay {key[:16]} {k}` instead"
        )
    return _recomputed(ensemble, [forms[name] for name in sorted(forms)], k)


def _recomputed(ensemble: Ensemble, forms: list[dict[str, object]], k: int) -> Trajectory:
    try:
        observations = [observation_from_normal_form(form) for form in forms]
        with _turn():
            values = trajectory_values(ensemble, observations, k)
    except ValueError as error:  # a revision this code no longer samples
        raise _refused(str(error)) from error
    return Trajectory(
        ensemble=ensemble.key,
        trajectory=k,
        parameters=dict(ensemble.parameters),
        observations=[TrajectoryValue.model_validate(item) for item in values],
        versions=versions(),
    )


@contextmanager
def _turn() -> Iterator[None]:
    """One computes, a few wait. Raises Unavailable for the rest."""
    if not _QUEUE.acquire(blocking=False):
        raise Unavailable("several trajectories are being recomputed already")
    try:
        with _ONE_AT_A_TIME:
            yield
    finally:
        _QUEUE.release()


def _refused(detail: str) -> Refusal:
    return Refusal(HTTPStatus.UNPROCESSABLE_ENTITY, detail)
