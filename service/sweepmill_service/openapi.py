"""The OpenAPI document: problem documents, examples and the schemas that no signature mentions."""

from collections.abc import Callable
from http import HTTPStatus
from typing import Any

from fastapi import FastAPI
from fastapi.openapi.utils import get_openapi
from pydantic import BaseModel
from pydantic.json_schema import models_json_schema

from sweepmill.messages import Problem, Table
from sweepmill.sweep import Sweep
from sweepmill_service.events import ProgressEvent
from sweepmill_service.problems import MEDIA_TYPE

Responses = dict[int | str, dict[str, Any]]
_REFERENCE = "#/components/schemas/{model}"
# Bodies that are read or written by hand, so that every fault is listed and tables stream.
_BY_HAND: tuple[type[BaseModel], ...] = (Problem, ProgressEvent, Sweep, Table)
_WHEN = {
    400: "The body is not JSON, or nested too deep",
    404: "Nothing has this key, or the owner has no request here",
    406: "No format at hand is acceptable",
    409: "The shortened key fits several; `faults` lists them",
    413: "The body is too large",
    415: "The body is not declared as application/json",
    422: "Refused as a whole; `faults` lists every fault with its path",
    503: "The database or the pool does not answer now; try again after `Retry-After` seconds",
}
_EVERYWHERE = {
    403: "The request comes from a page of another origin",
    421: "The service does not answer to this Host",
    500: "The service failed; its log says more",
}


def problems(*statuses: int) -> Responses:
    """Documented error answers of a route."""
    return {status: _problem(status, _WHEN[status]) for status in statuses}


def described(description: str, example: Any, model: type[BaseModel] | None = None) -> dict[str, Any]:
    """A documented success with its example."""
    body: dict[str, Any] = {"description": description, "content": {"application/json": {"example": example}}}
    return body if model is None else body | {"model": model}


def _problem(status: int, description: str) -> dict[str, Any]:
    example = {"type": "about:blank", "title": HTTPStatus(status).phrase, "status": status, "detail": description}
    schema = {"$ref": _REFERENCE.format(model="Problem")}
    return {"description": description, "content": {MEDIA_TYPE: {"schema": schema, "example": example}}}


def document(app: FastAPI) -> Callable[[], dict[str, Any]]:
    """The function FastAPI calls for its OpenAPI document, made once."""

    def made() -> dict[str, Any]:
        if not app.openapi_schema:
            schema = get_openapi(
                title=app.title,
                version=app.version,
                description=app.description,
                routes=app.routes,
                tags=app.openapi_tags,
            )
            app.openapi_schema = _complete(schema)
        return app.openapi_schema

    return made


def _describe_specifications(schema: dict[str, Any]) -> None:
    """Bodies that `Sweep.parse` reads: one circuit block may stand without its list."""
    sweep = schema["components"]["schemas"]["Sweep"]
    sweep["description"] = "Circuits whose fields may be axes, observations and a stopping rule."
    blocks = sweep["properties"]["circuit"]
    sweep["properties"]["circuit"] = {"title": "Circuit", "anyOf": [blocks["items"], blocks]}
    for path in ("/v1/sweeps", "/v1/estimate"):
        content = schema["paths"][path]["post"]["requestBody"]["content"]["application/json"]
        content["schema"] = {"$ref": _REFERENCE.format(model="Sweep")}


def _complete(schema: dict[str, Any]) -> dict[str, Any]:
    _, extra = models_json_schema([(model, "validation") for model in _BY_HAND], ref_template=_REFERENCE)
    components = schema["components"]["schemas"]
    for name, definition in extra["$defs"].items():
        components.setdefault(name, definition)
    for name in ("HTTPValidationError", "ValidationError"):
        components.pop(name, None)
    _describe_specifications(schema)
    for path in schema["paths"].values():
        for operation in path.values():
            for status, description in _EVERYWHERE.items():
                operation["responses"][str(status)] = _problem(status, description)
    return schema
