"""Submitting, looking at, amending and withdrawing sweeps."""

from http import HTTPStatus
from typing import Annotated, Any

from fastapi import APIRouter, Body, Query, Response

from sweepmill.errors import Fault
from sweepmill.messages import (
    Amendment,
    Estimate,
    ProgressPage,
    RoundList,
    Submitted,
    SweepList,
    SweepState,
    SweepStatus,
)
from sweepmill.revisions import all_revisions
from sweepmill_service import examples
from sweepmill_service.estimate import estimate, first_round, sampled_points
from sweepmill_service.finish import share_of
from sweepmill_service.openapi import described, problems
from sweepmill_service.problems import Refusal
from sweepmill_service.routes.dependencies import OWNER_PATTERN, KeyPrefix, Owner, RuntimeOf, StoreOf
from sweepmill_service.specification import accepted

router = APIRouter(prefix="/v1", tags=["sweeps"])
Specification = Annotated[dict[str, Any], Body(openapi_examples=examples.SPECIFICATIONS)]


@router.post(
    "/sweeps",
    status_code=HTTPStatus.CREATED,
    responses={
        201: described("A new sweep", examples.SUBMITTED),
        200: described("The sweep was there; the request joined it", examples.SUBMITTED, Submitted),
        **problems(400, 413, 415, 422, 503),
    },
)
def submit_sweep(
    specification: Specification, response: Response, runtime: RuntimeOf, store: StoreOf, owner: Owner = "local"
) -> Submitted:
    """Validate, expand and store a sweep; submitting the same again changes nothing but one's label and priority."""
    sweep, _ = accepted(specification, store, runtime.settings.limits)
    submission = store.submit(sweep, owner)
    if not submission.created:
        response.status_code = HTTPStatus.OK
    there = sampled_points(first_round(sweep), sweep.observations, store)
    return Submitted(
        key=submission.key,
        created=submission.created,
        status=runtime.forecast(store.sweep_status(submission.key)),
        sampled_ensembles=sum(item.missing == 0 for item in there),
        sampled_trajectories=sum(item.trajectories for item in there),
        revisions=all_revisions(),
    )


@router.post(
    "/estimate",
    responses={200: described("What the sweep would cost", examples.ESTIMATE), **problems(400, 413, 415, 422, 503)},
)
def estimate_sweep(
    specification: Specification, runtime: RuntimeOf, store: StoreOf, owner: Owner = "local"
) -> Estimate:
    """What a sweep would cost, when the pool would have it done, and how small its errors; nothing is stored."""
    sweep, costs = accepted(specification, store, runtime.settings.limits)
    pool = runtime.pool_status()
    share = share_of(runtime.waiting(), sweep.key, owner, sweep.priority, pool.cores)
    share = share._replace(pace=runtime.pace() or share.pace)
    return estimate(sweep, costs, store, share, None if pool.cores else pool.reason or "the pool has no workers")


@router.get(
    "/sweeps",
    responses={200: described("One page of sweeps, newest first", examples.SWEEP_LIST), **problems(422, 503)},
)
def list_sweeps(
    store: StoreOf,
    owner: Annotated[str | None, Query(pattern=OWNER_PATTERN, description="Only sweeps this owner requests")] = None,
    state: Annotated[SweepState | None, Query()] = None,
    family: Annotated[
        str | None, Query(pattern="^[a-z0-9-]{1,64}$", description="Only sweeps with circuits of this family")
    ] = None,
    limit: Annotated[int, Query(ge=1, le=500)] = 50,
    after: Annotated[str | None, Query(pattern="^[0-9a-f]{64}$", description="`next` of the page before")] = None,
) -> SweepList:
    """Sweeps with their progress."""
    return store.list_sweeps(owner=owner, state=state, family=family, limit=limit, after=after)


@router.get(
    "/sweeps/{key}",
    responses={200: described("The sweep", examples.STATUS), **problems(404, 409, 422, 503)},
)
def read_sweep(key: KeyPrefix, runtime: RuntimeOf, store: StoreOf) -> SweepStatus:
    """One sweep with its progress."""
    return runtime.forecast(store.sweep_status(store.find_sweep(key)))


@router.get(
    "/sweeps/{key}/specification",
    response_class=Response,
    responses={200: described("The normal form", examples.NORMAL_FORM), **problems(404, 409, 422, 503)},
)
def read_specification(key: KeyPrefix, store: StoreOf) -> Response:
    """What was submitted, in the normal form whose hash the key is; it can be changed and submitted again."""
    return Response(store.specification(store.find_sweep(key)), media_type="application/json")


@router.get(
    "/sweeps/{key}/ensembles",
    responses={
        200: described("One page, in the order of the table", examples.PROGRESS),
        **problems(404, 409, 422, 503),
    },
)
def read_progress(
    key: KeyPrefix,
    store: StoreOf,
    since: Annotated[int | None, Query(ge=0, lt=2**63, description="Only what changed after this commit")] = None,
    after: Annotated[int | None, Query(ge=0, lt=2**63, description="`next` of the page before")] = None,
    limit: Annotated[int, Query(ge=1, le=1000)] = 200,
) -> ProgressPage:
    """Progress of every ensemble of a sweep."""
    return store.progress(store.find_sweep(key), since, limit, after)


@router.get(
    "/sweeps/{key}/rounds",
    responses={200: described("All rounds, oldest first", examples.ROUNDS), **problems(404, 409, 422, 503)},
)
def read_rounds(key: KeyPrefix, store: StoreOf) -> RoundList:
    """The rounds in which the goal of a sweep was judged; none where it has no goal."""
    full = store.find_sweep(key)
    return RoundList(sweep=full, rounds=store.rounds(full))


@router.patch(
    "/sweeps/{key}",
    responses={
        200: described("The sweep, amended", examples.STATUS),
        **problems(400, 404, 409, 413, 415, 422, 503),
    },
)
def amend_sweep(
    key: KeyPrefix,
    amendment: Annotated[Amendment, Body(openapi_examples=examples.AMENDMENTS)],
    store: StoreOf,
    owner: Owner = "local",
) -> SweepStatus:
    """Change label or priority of one's own request; a label of null removes it."""
    full = store.find_sweep(key)
    if "priority" in amendment.model_fields_set and amendment.priority is None:
        raise Refusal(HTTPStatus.UNPROCESSABLE_ENTITY, "a priority is a number", [Fault("body.priority", "is null")])
    if not store.amend(full, owner, **amendment.model_dump(exclude_unset=True)):
        raise _no_request(full, owner)
    return store.sweep_status(full)


@router.delete(
    "/sweeps/{key}",
    responses={200: described("The sweep without the request", examples.STATUS), **problems(404, 409, 422, 503)},
)
def withdraw_sweep(key: KeyPrefix, store: StoreOf, owner: Owner = "local") -> SweepStatus:
    """Withdraw one's own request; what was sampled stays, and submitting again restores the sweep."""
    full = store.find_sweep(key)
    if not store.withdraw(full, owner):
        raise _no_request(full, owner)
    return store.sweep_status(full)


def _no_request(key: str, owner: str) -> Refusal:
    return Refusal(HTTPStatus.NOT_FOUND, f"{owner} does not request sweep {key}")
