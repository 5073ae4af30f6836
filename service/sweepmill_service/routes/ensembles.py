"""Single ensembles: what is stored of them, and single trajectories recomputed."""

from typing import Annotated, Any, Literal

from fastapi import APIRouter, Header, Path, Query
from starlette.responses import PlainTextResponse, Response

from sweepmill.messages import EnsembleRecord, Trajectory
from sweepmill_service import examples
from sweepmill_service.negotiate import choose_format
from sweepmill_service.openapi import described, problems
from sweepmill_service.routes.dependencies import KeyPrefix, RuntimeOf, StoreOf
from sweepmill_service.trajectories import Recomputable

router = APIRouter(prefix="/v1", tags=["ensembles"])
MEDIA_TYPES = {"json": "application/json", "text": "text/plain"}


def _trajectory_response() -> dict[str, Any]:
    response = described("The trajectory", examples.TRAJECTORY)
    response["content"][MEDIA_TYPES["text"]] = {"schema": {"type": "string"}, "example": examples.CIRCUIT}
    return response


@router.get(
    "/ensembles/{key}",
    responses={200: described("The ensemble", examples.ENSEMBLE), **problems(404, 409, 422, 503)},
)
def read_ensemble(key: KeyPrefix, store: StoreOf) -> EnsembleRecord:
    """Parameters, counts and provenance of an ensemble."""
    return store.ensemble_record(store.find_ensemble(key))


@router.get(
    "/ensembles/{key}/trajectories/{k}",
    response_model=Trajectory,
    responses={200: _trajectory_response(), **problems(404, 406, 409, 422, 503)},
)
def read_trajectory(
    key: KeyPrefix,
    k: Annotated[int, Path(ge=0, lt=2**63, description="Number of the trajectory, stored or not", examples=[17])],
    runtime: RuntimeOf,
    store: StoreOf,
    circuit: Annotated[
        Literal["none", "stim", "openqasm3"], Query(description="The circuit is written in this language")
    ] = "none",
    accept: Annotated[
        str | None, Header(description=f"{MEDIA_TYPES['text']} for the circuit alone; JSON by default")
    ] = None,
) -> Trajectory | Response:
    """One trajectory recomputed: values of every observation stored for its ensemble, its circuit if wanted.

    The circuit is the one that was sampled; where it measures, whoever runs the text draws outcomes anew.
    """
    language = None if circuit == "none" else circuit
    offered = {"json": MEDIA_TYPES["json"]} if language is None else MEDIA_TYPES
    form = choose_format(accept, offered, "trajectories without `circuit`" if language is None else "trajectories")
    found = Recomputable.find(store, store.find_ensemble(key), k, runtime.settings.limits)
    if language is not None and form == "text":
        return PlainTextResponse(found.circuit(language), headers={"Vary": "Accept"})
    return found.trajectory(language)
