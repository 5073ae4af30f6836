"""Single ensembles: what is stored of them, and single trajectories recomputed."""

from typing import Annotated

from fastapi import APIRouter, Path

from sweepmill.messages import EnsembleRecord, Trajectory
from sweepmill_service import examples
from sweepmill_service.openapi import described, problems
from sweepmill_service.routes.dependencies import KeyPrefix, RuntimeOf, StoreOf
from sweepmill_service.trajectories import recompute

router = APIRouter(prefix="/v1", tags=["ensembles"])


@router.get(
    "/ensembles/{key}",
    responses={200: described("The ensemble", examples.ENSEMBLE), **problems(404, 409, 422, 503)},
)
def read_ensemble(key: KeyPrefix, store: StoreOf) -> EnsembleRecord:
    """Parameters, counts and provenance of an ensemble."""
    return store.ensemble_record(store.find_ensemble(key))


@router.get(
    "/ensembles/{key}/trajectories/{k}",
    responses={200: described("The trajectory", examples.TRAJECTORY), **problems(404, 409, 422, 503)},
)
def read_trajectory(
    key: KeyPrefix,
    k: Annotated[int, Path(ge=0, lt=2**63, description="Number of the trajectory, stored or not", examples=[17])],
    runtime: RuntimeOf,
    store: StoreOf,
) -> Trajectory:
    """One trajectory recomputed: values of every observation stored for its ensemble."""
    return recompute(store, store.find_ensemble(key), k, runtime.settings.limits.recompute_seconds)
