"""What a client can send wrong: a problem with the right status that says what would do; never a 500."""

import json
from typing import Any

import pytest
from starlette.testclient import TestClient

from levels.errors import NotPublished, OutsideValidity, UnknownName
from service.problems import TYPES, Problem, ProblemBody, problem_of, shown
from service.question import Question
from service.routes import QUESTIONS

SHIFT = "/v1/atoms/87Rb/shift?line=780&lower=2,2&upper=3,3&field=3.2"
SWEEP: dict[str, Any] = {"atom": "87Rb", "level": "5s_2S1/2", "fields": {"start": 0, "stop": 10, "points": 3}}
GETS = [question for question in QUESTIONS if question.method == "GET"]
NASTY = (
    "",
    " ",
    "nan",
    "NaN",
    "inf",
    "-Infinity",
    "1e999",
    "1e9",
    "-1e9",
    "0x10",
    "9" * 400,
    "1/0",
    "3/3",
    "2,",
    ",2",
    "2,9",
    "-2,2",
    "999,0",
    "5/2,2",
    "2;2",
    "null",
    "true",
    "[1]",
    "{}",
    "3.2 parsec",
    "3.2MHz",
    "%00",
    "%ff%fe",
    "%F0%9F%92%A9",
    "%ED%A0%80",
    "../../etc",
    "<script>",
    "__import__('os')",
    "780->795",
    "5P",
    "a" * 3000,
)


def refused(response: Any, status: int, name: str) -> dict[str, Any]:
    """The body of a problem, after checking what every problem has."""
    assert response.headers["content-type"] == "application/problem+json", response.text
    assert response.headers["cache-control"] == "no-store"
    body: dict[str, Any] = response.json()
    ProblemBody.model_validate(body, strict=True, extra="forbid")
    assert list(body) == list(ProblemBody.model_fields)
    assert (response.status_code, body["status"], body["type"]) == (status, status, f"/problems/{name}")
    assert body["title"] == TYPES[name].title
    assert body["request_id"] == response.headers["x-request-id"]
    assert "Traceback" not in response.text
    return body


def replaced(url: str, name: str, value: str) -> str:
    """The URL with one query parameter set to raw text."""
    path, _, query = url.partition("?")
    parts = [part for part in query.split("&") if part and not part.startswith(f"{name}=")]
    return f"{path}?{'&'.join([*parts, f'{name}={value}'])}"


CASES = (
    ("/v1/atoms/87Rc", 404, "unknown-name", "atom", "", "87Rb"),
    ("/v1/atoms/86Rb", 404, "unknown-name", "atom", "", "87Rb"),
    ("/v1/atoms/87Rc/shift", 404, "unknown-name", "atom", "", "87Rb"),
    (replaced(SHIFT, "line", "781"), 404, "unknown-name", "line", "", "780"),
    (replaced(SHIFT, "line", "D3"), 404, "unknown-name", "line", "", "780"),
    ("/v1/atoms/87Rb/sublevels?level=5p_2P5/2", 404, "unknown-name", "level", "", "5p_2P3/2"),
    (replaced(SHIFT, "lower", "3,2"), 404, "unknown-name", "sublevel", "F is one of 1, 2", ""),
    (replaced(SHIFT, "lower", "2,3"), 422, "invalid-parameter", "lower", "|m| at most F", ""),
    (replaced(SHIFT, "upper", "3,0"), 422, "invalid-parameter", "upper", "from m = 2 to 1 or 2 or 3", ""),
    (replaced(SHIFT, "field", "1e9"), 422, "invalid-parameter", "field", "to 1000000 G", ""),
    (replaced(SHIFT, "field", "nan"), 422, "invalid-parameter", "field", "finite number", ""),
    (replaced(SHIFT, "field", ""), 422, "invalid-parameter", "field", "finite number", ""),
    (replaced(SHIFT, "field", "3.2 nm"), 422, "invalid-parameter", "field", "mT", ""),
    (replaced(SHIFT, "evidence", "sure"), 422, "invalid-parameter", "evidence", "'checked'", ""),
    (replaced(SHIFT, "format", "xml"), 422, "invalid-parameter", "format", "csv", ""),
    (f"{SHIFT}&feild=3", 422, "unknown-parameter", "feild", "field", "field"),
    (f"{SHIFT}&field=4", 422, "invalid-parameter", "field", "one value", ""),
    ("/v1/atoms/87Rb/shift?line=780&upper=3,3&field=1", 422, "missing-parameter", "lower", "F,m", ""),
    ("/v1/atoms/87Rb/components?line=780&polarisation=sigma", 422, "invalid-parameter", "polarisation", "pi", ""),
    ("/v1/atoms/87Rb/insensitive?level=5S1/2&max_field=0", 422, "invalid-parameter", "max_field", "G", ""),
    ("/v1/atoms/87Rb/insensitive?level=5S1/2&max_dm=-1", 422, "invalid-parameter", "max_dm", "greater", ""),
    ("/v1/angular/3j?j1=1&j2=1&j3=1/3&m1=0&m2=0&m3=0", 422, "invalid-parameter", "j3", "half-integer", ""),
    ("/v1/angular/3j?j1=99999&j2=1&j3=1&m1=0&m2=0&m3=0", 422, "invalid-parameter", "j1", "", ""),
    ("/v1/angular/3j?j1=1&j2=1&j3=1&m1=1/2&m2=0&m3=0", 422, "invalid-parameter", "m1", "integer", ""),
    ("/v1/angular/lande?J=5/2&L=1&S=1/2", 422, "invalid-parameter", "J", "couples", ""),
    ("/v1/angular/lande?J=3/2&L=1&S=1/2&I=3/2", 422, "invalid-parameter", "F", "I and F together", ""),
    ("/v1/sources/ye1997", 404, "unknown-name", "source", "", "ye1996"),
    ("/v1/atom", 404, "unknown-path", "", "", "/v1/atoms"),
    ("/v1/atoms/", 404, "unknown-path", "", "", "/v1/atoms"),
    ("/v1/atoms/87Rb/shift/", 404, "unknown-path", "", "", "/v1/atoms/{atom}/shift"),
    ("/problems/none", 404, "unknown-path", "", "", ""),
)


@pytest.mark.parametrize(
    ("url", "status", "name", "parameter", "allowed", "near"), CASES, ids=[case[0] for case in CASES]
)
def test_refusal_names_the_fix(
    client: TestClient, url: str, status: int, name: str, parameter: str, allowed: str, near: str
) -> None:
    """Each kind of bad request is a problem that names the parameter and what would do."""
    body = refused(client.get(url), status, name)
    assert body["parameter"] == parameter
    assert allowed in body["allowed"]
    assert not near or near in body["nearest"]
    assert body["detail"]


@pytest.mark.parametrize("question", GETS, ids=lambda question: question.name)
def test_nothing_a_query_can_hold_breaks_the_server(client: TestClient, question: Question) -> None:
    """Every parameter of every question, given every nasty text, answers or refuses; it never fails."""
    for name in [*question.asked.model_fields, "surprise"]:
        for text in NASTY:
            response = client.get(replaced(question.example, name, text))
            assert response.status_code < 500, (name, text, response.text)
            if response.status_code != 200:
                assert response.headers["content-type"] == "application/problem+json"
                assert response.json()["detail"]


@pytest.mark.parametrize("question", [one for one in GETS if one.path_names], ids=lambda question: question.name)
def test_nothing_a_path_can_hold_breaks_the_server(client: TestClient, question: Question) -> None:
    """Every name in a path, given every nasty text, is refused with a problem."""
    template = question.example.partition("?")
    for text in NASTY:
        parts = template[0].split("/")
        parts[3 if "atoms" in parts else -1] = text.replace("/", "%2F") or "%20"
        response = client.get("/".join(parts) + template[1] + template[2])
        assert response.status_code in (404, 422), (text, response.text)
        assert response.headers["content-type"] == "application/problem+json"


BODIES: tuple[tuple[Any, int, str, str], ...] = (
    (b"", 400, "malformed-body", ""),
    (b"{", 400, "malformed-body", ""),
    (b'{"atom": NaN}', 400, "malformed-body", ""),
    (b'{"fields": {"start": 1e999}}', 400, "malformed-body", ""),
    (b"[" * 50_000, 400, "malformed-body", ""),
    (b"\xff\xfe", 400, "malformed-body", ""),
    (b"[]", 400, "malformed-body", ""),
    (b"3", 400, "malformed-body", ""),
    ({}, 422, "missing-parameter", "atom"),
    ({**SWEEP, "atom": "87Rc"}, 404, "unknown-name", "atom"),
    ({**SWEEP, "atom": 87}, 422, "invalid-parameter", "atom"),
    ({**SWEEP, "level": "6Z"}, 404, "unknown-name", "level"),
    ({**SWEEP, "line": "780"}, 422, "invalid-parameter", "level"),
    ({"atom": "87Rb", "fields": SWEEP["fields"]}, 422, "invalid-parameter", "level"),
    ({**SWEEP, "fields": {}}, 422, "invalid-parameter", "fields"),
    ({**SWEEP, "fields": {"start": 0, "stop": 1}}, 422, "invalid-parameter", "fields"),
    ({**SWEEP, "fields": {"values": []}}, 422, "invalid-parameter", "fields.values"),
    ({**SWEEP, "fields": {"values": [1, "x"]}}, 422, "invalid-parameter", "fields.values.1"),
    ({**SWEEP, "fields": {"values": [1, None]}}, 422, "invalid-parameter", "fields.values.1"),
    ({**SWEEP, "fields": {"values": [True]}}, 422, "invalid-parameter", "fields.values.0"),
    ({**SWEEP, "fields": {**SWEEP["fields"], "points": 0}}, 422, "invalid-parameter", "fields.points"),
    ({**SWEEP, "fields": {**SWEEP["fields"], "points": True}}, 422, "invalid-parameter", "fields.points"),
    ({**SWEEP, "fields": {**SWEEP["fields"], "points": 2.5}}, 422, "invalid-parameter", "fields.points"),
    ({**SWEEP, "fields": {**SWEEP["fields"], "step": 1}}, 422, "unknown-parameter", "fields.step"),
    ({**SWEEP, "fields": {"start": 0, "stop": 1e9, "points": 2}}, 422, "invalid-parameter", "fields.stop"),
    ({**SWEEP, "fields": {"start": 0, "stop": 1, "points": 500_000}}, 422, "answer-too-large", "fields"),
    ({**SWEEP, "columns": ["energy"]}, 422, "invalid-parameter", "columns.0"),
    ({**SWEEP, "columns": ["offset_MHz"]}, 422, "invalid-parameter", "columns"),
    ({**SWEEP, "columns": []}, 422, "invalid-parameter", "columns"),
    ({**SWEEP, "sublevels": ["9,9"]}, 404, "unknown-name", "sublevel"),
    ({**SWEEP, "sublevels": "2,2"}, 422, "invalid-parameter", "sublevels"),
    ({**SWEEP, "lower": "2,2"}, 422, "invalid-parameter", "lower"),
    ({**SWEEP, "polarisation": "pi"}, 422, "invalid-parameter", "polarisation"),
    ({**SWEEP, "feilds": 1}, 422, "unknown-parameter", "feilds"),
)


@pytest.mark.parametrize(("body", "status", "name", "parameter"), BODIES)
def test_bad_body_is_refused(client: TestClient, body: Any, status: int, name: str, parameter: str) -> None:
    """Each kind of bad body is a problem that names the member."""
    given = {"content": body} if isinstance(body, bytes) else {"json": body}
    problem = refused(client.post("/v1/sweep", **given), status, name)
    assert problem["parameter"] == parameter
    assert problem["detail"]


def test_body_of_another_type_is_refused(client: TestClient) -> None:
    """A body that says it is not JSON is refused with 415."""
    response = client.post("/v1/sweep", content=b"<a/>", headers={"Content-Type": "text/xml"})
    assert refused(response, 415, "unsupported-media-type")["allowed"] == "application/json"


def test_giant_body_is_refused_at_the_door(client: TestClient) -> None:
    """A body over the bound is refused with 413 naming the bound, with or without a Content-Length."""
    giant = b" " * 1_100_000
    assert "1048576 bytes" in refused(client.post("/v1/sweep", content=giant), 413, "body-too-large")["allowed"]
    pieces = (giant[at : at + 65_536] for at in range(0, len(giant), 65_536))
    assert "1048576 bytes" in refused(client.post("/v1/sweep", content=pieces), 413, "body-too-large")["allowed"]


def test_giant_url_is_refused(client: TestClient) -> None:
    """A URL over the bound is refused with 414 naming the bound."""
    assert "8192" in refused(client.get(f"/v1/atoms?x={'a' * 9000}"), 414, "url-too-long")["allowed"]


@pytest.mark.parametrize("method", ["POST", "PUT", "PATCH", "DELETE", "OPTIONS", "BREW"])
def test_wrong_method_names_the_right_ones(client: TestClient, method: str) -> None:
    """A method that a path does not answer is refused with 405 and an Allow header."""
    for question in QUESTIONS:
        if question.method == method:
            continue
        response = client.request(method, question.example)
        body = refused(response, 405, "method-not-allowed")
        expected = "GET, HEAD" if question.method == "GET" else "POST"
        assert response.headers["allow"] == body["allowed"] == expected


def test_accept_without_a_match_lists_the_types(client: TestClient) -> None:
    """An Accept header that nothing fits is refused with 406 and the list of media types."""
    body = refused(client.get(SHIFT, headers={"Accept": "image/png"}), 406, "not-acceptable")
    assert body["allowed"] == "application/json, text/csv, application/x-ndjson"


def test_problem_types_are_documented_where_they_point(client: TestClient) -> None:
    """Every problem type is served under its own URI with its status, meaning and remedy."""
    every = client.get("/problems").text
    for row in TYPES.values():
        page = client.get(row.uri)
        assert page.status_code == 200
        for text in (page.text, every):
            assert row.uri in text
            assert f"status {row.status}" in text


def test_exceptions_of_the_library_become_problems() -> None:
    """Each exception of `levels` becomes its problem with the data to recover; anything else says nothing."""
    unknown = problem_of(UnknownName("line", "781", ["780"], "or D2"))
    assert (unknown.type.name, unknown.parameter, unknown.nearest) == ("unknown-name", "line", ("780",))
    missing = problem_of(NotPublished("A", "87Rb 9s_2S1/2"))
    assert (missing.type.name, missing.parameter) == ("not-published", "A of 87Rb 9s_2S1/2")
    outside = problem_of(OutsideValidity("field", 1e9, "up to 1e6 G"))
    assert (outside.type.name, outside.parameter, outside.allowed) == ("invalid-parameter", "field", "up to 1e6 G")
    ours = problem_of(RuntimeError("a secret"))
    assert ours.type.status == 500
    assert "secret" not in ours.encode("/x", "1").decode()


def test_given_text_is_shortened_and_printable() -> None:
    """What was given comes back short and without control characters."""
    assert shown("a\r\nb\x00\ud800") == "a\ufffd\ufffdb\ufffd\ufffd"
    assert len(shown("x" * 1000)) == 80
    assert json.loads(Problem("internal-error", "a\x00b").encode("/\ud800", ""))["detail"] == "a\ufffdb"


def test_a_member_unknown_inside_a_body_names_what_its_place_takes(client: TestClient) -> None:
    """A wrong member of a beam is told with the members that a beam has."""
    body = {
        "atom": "87Rb",
        "field": [0, 0, 1],
        "beams": [{"name": "a", "line": "780", "direction": [0, 0, 1], "colour": 1}],
    }
    problem = client.post("/v1/scheme", json=body).json()
    fault = next(item for item in (problem, *problem["errors"]) if item["parameter"] == "beams.0.colour")
    assert {"polarisation", "detuning"} <= set(fault["allowed"].split(", "))
