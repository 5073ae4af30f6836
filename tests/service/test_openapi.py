"""The interface is documented completely, and changes of it are decisions.

To accept a change: SWEEPMILL_TEST_REFRESH=1 python -m pytest tests/service/test_openapi.py
"""

import json
import os
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest

from sweepmill.messages import Amendment
from sweepmill.sweep import Sweep
from sweepmill_service.app import create_app
from sweepmill_service.settings import Settings

GOLDEN = Path(__file__).parent.parent / "golden" / "openapi.json"
REFRESH = "SWEEPMILL_TEST_REFRESH"
PROBLEM = {"$ref": "#/components/schemas/Problem"}


@pytest.fixture(scope="module")
def document() -> dict[str, Any]:
    return create_app(Settings(database="sqlite:///never-opened.sqlite")).openapi()


def operations(document: dict[str, Any]) -> Iterator[tuple[str, dict[str, Any]]]:
    for path, methods in document["paths"].items():
        for method, operation in methods.items():
            yield f"{method} {path}", operation


def test_the_document_is_the_accepted_one(document: dict[str, Any]) -> None:
    text = json.dumps(document, indent=1, sort_keys=True) + "\n"
    if os.environ.get(REFRESH):
        GOLDEN.write_text(text)
    assert GOLDEN.read_text() == text, f"the interface changed; if that is meant, run this test with {REFRESH}=1"


def test_every_call_is_described_and_every_success_has_an_example(document: dict[str, Any]) -> None:
    for name, operation in operations(document):
        assert operation["description"], name
        for status, answer in operation["responses"].items():
            assert answer["description"], (name, status)
            if status.startswith("2") and name != "get /metrics":
                contents = answer["content"]
                assert any("example" in content for content in contents.values()), (name, status)


def test_every_error_is_a_problem_document(document: dict[str, Any]) -> None:
    for name, operation in operations(document):
        errors = {status: answer for status, answer in operation["responses"].items() if status >= "4"}
        assert {"403", "421", "500"} <= errors.keys(), name
        for answer in errors.values():
            assert list(answer["content"]) == ["application/problem+json"]
            assert answer["content"]["application/problem+json"]["schema"] == PROBLEM


def test_every_body_has_examples_that_are_accepted(document: dict[str, Any]) -> None:
    bodies = [(name, one["requestBody"]) for name, one in operations(document) if "requestBody" in one]
    assert len(bodies) == 3
    for name, body in bodies:
        (content,) = body["content"].values()
        for example in content["examples"].values():
            if name.startswith("patch"):
                Amendment.model_validate(example["value"])
            else:
                Sweep.parse(example["value"])


def test_every_reference_leads_somewhere(document: dict[str, Any]) -> None:
    schemas = document["components"]["schemas"]
    text = json.dumps(document)
    named = {part.split('"')[0] for part in text.split("#/components/schemas/")[1:]}
    assert named <= schemas.keys()


def test_specifications_refer_to_the_schema_of_a_sweep(document: dict[str, Any]) -> None:
    for path in ("/v1/sweeps", "/v1/estimate"):
        content = document["paths"][path]["post"]["requestBody"]["content"]["application/json"]
        assert content["schema"] == {"$ref": "#/components/schemas/Sweep"}
