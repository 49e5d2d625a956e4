"""OpenAPI: what every question may answer with, and the finished 3.1 document."""

from collections.abc import Iterable
from typing import Any
from urllib.parse import parse_qsl, unquote, urlsplit

from fastapi import FastAPI
from fastapi.openapi.utils import get_openapi

from service.formats import REPRESENTATIONS
from service.problems import MEDIA_TYPE, TYPES, ProblemBody
from service.question import Question

PROBLEM_SCHEMA = {"$ref": "#/components/schemas/Problem"}
TAGS = (
    {
        "name": "catalogue",
        "description": "What the catalogue holds: atoms, levels, lines and where each value comes from.",
    },
    {"name": "field", "description": "What a level or a line does in a magnetic field."},
    {
        "name": "scheme",
        "description": "Beams and a field checked as a whole: polarisations, populations, dark states, what to change.",
    },
    {
        "name": "plan",
        "description": "Lock points, leaks and repumpers, and the settings of a frequency plan. Nothing here drives "
        "hardware, and a laser safety officer has the last word on beams and powers.",
    },
    {"name": "motion", "description": "What light and field do to the motion of an atom: cooling and magnetic traps."},
    {
        "name": "light",
        "description": "Light shifts, polarisabilities, magic conditions and pairs for clocks. The powers of traps are "
        "dangerous to eyes and skin, also where the light is invisible: follow your laser safety officer.",
    },
    {"name": "algebra", "description": "Exact angular-momentum algebra."},
    {"name": "server", "description": "The server itself."},
)
EVERY = (404, 405, 406, 414, 422, 500, 503, 504)
WITH_BODY = (400, 413, 415)


def responses_of(question: Question) -> dict[int | str, dict[str, Any]]:
    """Every response that a question may have besides its model: representations, 304 and problems."""
    text = {"schema": {"type": "string"}}
    content = {row.media_type: text for row in REPRESENTATIONS.values() if row.name != "json"}
    headers = {"ETag": {"description": "strong; send it back as If-None-Match", "schema": {"type": "string"}}}
    posted = question.method == "POST"
    responses: dict[int | str, dict[str, Any]] = {
        200: {"description": "The answer", "content": content, **({} if posted else {"headers": headers})}
    }
    if not posted:
        responses[304] = {"description": "The answer is the one that If-None-Match names"}
    statuses = (*EVERY, *WITH_BODY) if posted else EVERY
    return responses | {status: problem_response(status) for status in sorted(statuses)}


def problem_response(status: int) -> dict[str, Any]:
    """The description of one status: the problem types that have it."""
    types = [row for row in TYPES.values() if row.status == status]
    return {
        "description": "; ".join(f"{row.title} ({row.uri})" for row in types),
        "content": {MEDIA_TYPE: {"schema": PROBLEM_SCHEMA}},
    }


def build_openapi(app: FastAPI, questions: Iterable[Question]) -> dict[str, Any]:
    """The document, with the problem's schema and the examples added."""
    document = get_openapi(
        title=app.title,
        version=app.version,
        summary=app.summary,
        description=app.description,
        routes=app.routes,
        tags=[dict(tag) for tag in TAGS],
        license_info={"name": "MIT", "identifier": "MIT"},
    )
    schema = ProblemBody.model_json_schema(ref_template="#/components/schemas/{model}")
    schemas = document.setdefault("components", {}).setdefault("schemas", {})
    schemas.update(schema.pop("$defs", {}))
    schemas["Problem"] = schema
    set_examples(document, questions)
    return document


def set_examples(document: dict[str, Any], questions: Iterable[Question]) -> None:
    """Give each parameter and body the value it has in the question's example, a request that works."""
    for question in questions:
        operation = document["paths"][question.path][question.method.lower()]
        url = urlsplit(question.example)
        values = dict(parse_qsl(url.query))
        for template, part in zip(question.path.split("/"), url.path.split("/"), strict=True):
            values[template[1:-1]] = unquote(part)
        for parameter in operation.get("parameters", ()):
            if parameter["name"] in values:
                parameter["example"] = values[parameter["name"]]
        if question.body_example is not None:
            operation["requestBody"]["content"]["application/json"]["example"] = dict(question.body_example)
