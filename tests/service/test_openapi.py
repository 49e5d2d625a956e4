"""The OpenAPI document: valid, complete, with examples that work."""

from typing import Any

import jsonschema
import pytest
from openapi_spec_validator import validate
from starlette.testclient import TestClient

from service.problems import TYPES
from service.question import Question
from service.routes import QUESTIONS


@pytest.fixture(scope="module")
def document(client: TestClient) -> dict[str, Any]:
    response = client.get("/openapi.json")
    assert response.headers["content-type"] == "application/json"
    body: dict[str, Any] = response.json()
    return body


def operation_of(document: dict[str, Any], question: Question) -> dict[str, Any]:
    operation: dict[str, Any] = document["paths"][question.path][question.method.lower()]
    return operation


def test_document_is_valid(document: dict[str, Any]) -> None:
    """The document is OpenAPI 3.1 and valid."""
    assert document["openapi"].startswith("3.1")
    validate(document)


def test_every_question_is_in_it_and_nothing_else(document: dict[str, Any]) -> None:
    """The paths are those of the questions, each with its one method."""
    expected = {(question.path, question.method.lower()) for question in QUESTIONS}
    assert {(path, method) for path, item in document["paths"].items() for method in item} == expected
    names = [operation_of(document, question)["operationId"] for question in QUESTIONS]
    assert len(set(names)) == len(names)


def test_every_error_is_a_problem(document: dict[str, Any]) -> None:
    """Every 4xx and 5xx of every question is application/problem+json with the Problem schema; no stock 422 is left."""
    for question in QUESTIONS:
        responses = operation_of(document, question)["responses"]
        errors = {status: response for status, response in responses.items() if status[0] in "45"}
        assert {"404", "405", "406", "422", "500"} <= errors.keys()
        for response in errors.values():
            assert response["content"] == {
                "application/problem+json": {"schema": {"$ref": "#/components/schemas/Problem"}}
            }
    assert "HTTPValidationError" not in document["components"]["schemas"]


def test_every_status_of_a_problem_is_documented(document: dict[str, Any]) -> None:
    """Each problem type's URI is named in the description of its status."""
    text = str(document["paths"])
    assert [row.uri for row in TYPES.values() if row.uri not in text] == []


def test_every_parameter_is_described_and_has_an_example(document: dict[str, Any]) -> None:
    """Each parameter says what it is; those of the example carry its value."""
    for question in QUESTIONS:
        for parameter in operation_of(document, question).get("parameters", ()):
            assert parameter.get("description") or question.path.startswith("/v1/angular"), parameter
            assert "example" in parameter or not parameter["required"], (question.name, parameter["name"])


def test_answers_fit_the_document(document: dict[str, Any], client: TestClient) -> None:
    """The answer to each example fits the JSON schema that the document states for it."""
    for question in QUESTIONS:
        if question.body_example is None:
            answer = client.get(question.example).json()
        else:
            content = operation_of(document, question)["requestBody"]["content"]["application/json"]
            answer = client.post(question.path, json=content["example"]).json()
        schema = operation_of(document, question)["responses"]["200"]["content"]["application/json"]["schema"]
        jsonschema.validate(answer, {**schema, "components": document["components"]})


def test_problems_fit_the_document(document: dict[str, Any], client: TestClient) -> None:
    """A problem fits the Problem schema."""
    problem = client.get("/v1/atoms/87Rc").json()
    schema = {"$ref": "#/components/schemas/Problem", "components": document["components"]}
    jsonschema.validate(problem, schema)


def test_other_representations_are_announced(document: dict[str, Any]) -> None:
    """CSV and NDJSON are among the contents of every answer, 304 among those of every GET."""
    for question in QUESTIONS:
        responses = operation_of(document, question)["responses"]
        assert {"application/json", "text/csv", "application/x-ndjson"} == responses["200"]["content"].keys()
        assert ("304" in responses) == (question.method == "GET")
