"""Representations: the same columns as JSON, CSV and NDJSON; negotiation, ETags, HEAD."""

import csv
import io
import json
from typing import Any

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from starlette.testclient import TestClient

from service.answers import Answer, flat_row, scalar, unit_suffix
from service.formats import (
    JSON,
    NotFinite,
    Table,
    choose,
    csv_pieces,
    encode_json,
    etag,
    etag_matches,
    json_pieces,
    ndjson_pieces,
)
from service.question import Question
from service.routes import QUESTIONS

GETS = [question for question in QUESTIONS if question.method == "GET"]
COMPONENTS = "/v1/atoms/87Rb/components?line=780&field=3.2"
doubles = st.floats(allow_nan=False, allow_infinity=False)
texts = st.text(st.characters(codec="utf-8", exclude_characters="\x00"), max_size=12)


def read_csv(text: str) -> dict[str, list[str]]:
    rows = list(csv.reader(io.StringIO(text, newline="")))
    assert len({len(row) for row in rows}) == 1
    return {column[0]: list(column[1:]) for column in zip(*rows, strict=True)}


def written(value: Any) -> Any:
    """What a JSON value is in CSV: null is empty, a text itself; a float is compared as a number."""
    if value is None or isinstance(value, (str, float)):
        return "" if value is None else value
    return json.dumps(value)


@given(st.lists(st.tuples(doubles, texts, doubles | st.none()), min_size=1, max_size=40))
def test_three_representations_hold_the_same(rows: list[tuple[float, str, float | None]]) -> None:
    """JSON, CSV and NDJSON of any table read back as the same numbers, to the last bit, and the same texts."""
    numbers, names, gaps = (list(column) for column in zip(*rows, strict=True))
    table = Table({"number": np.array(numbers), "name": names, "gap, 100%": gaps})
    columns = json.loads(b"".join(json_pieces({}, table, {})))["columns"]
    lines = [json.loads(line) for line in b"".join(ndjson_pieces(table)).split(b"\n")[:-1]]
    cells = read_csv(b"".join(csv_pieces(table)).decode())
    assert columns == {"number": numbers, "name": names, "gap, 100%": gaps}
    assert {name: [line[name] for line in lines] for name in columns} == columns
    assert [float(cell) for cell in cells["number"]] == numbers
    assert cells["name"] == names
    assert [None if cell == "" else float(cell) for cell in cells["gap, 100%"]] == gaps


def test_long_tables_are_written_in_batches_without_a_seam() -> None:
    """Rows beyond one batch follow in order."""
    table = Table({"n": np.arange(10_000), "half": np.arange(10_000) / 2})
    cells = read_csv(b"".join(csv_pieces(table)).decode())
    assert [int(cell) for cell in cells["n"]] == list(range(10_000))
    assert len(b"".join(ndjson_pieces(table)).splitlines()) == 10_000


@pytest.mark.parametrize("bad", [float("nan"), float("inf"), -float("inf")])
def test_numbers_that_are_not_finite_never_leave(bad: float) -> None:
    """A column or scalar with NaN or infinity raises instead of becoming null."""
    for column in (np.array([1.0, bad]), [1.0, bad]):
        for write in (csv_pieces, ndjson_pieces, lambda table: json_pieces({}, table, {})):
            with pytest.raises(NotFinite):
                b"".join(write(Table({"x": column})))
    with pytest.raises(NotFinite):
        scalar(bad, None, "MHz")
    with pytest.raises(NotFinite):
        scalar(1.0, bad, "MHz")


@pytest.mark.parametrize("question", GETS, ids=lambda question: question.name)
def test_every_question_answers_in_every_representation(client: TestClient, question: Question) -> None:
    """CSV and NDJSON of a question hold the columns of its JSON, or its members and records as flat rows."""
    sign = "&" if "?" in question.example else "?"
    answer = client.get(question.example).json()
    text = client.get(f"{question.example}{sign}format=csv")
    lines = client.get(f"{question.example}{sign}format=ndjson")
    assert text.headers["content-type"] == "text/csv; charset=utf-8; header=present"
    assert lines.headers["content-type"] == "application/x-ndjson"
    cells = read_csv(text.text)
    rows = [json.loads(line) for line in lines.text.splitlines()]
    for name, column in cells.items():
        for cell, row in zip(column, rows, strict=True):
            value = row[name]
            assert (float(cell) if isinstance(value, float) else cell) == written(value)
    if "columns" in answer:
        assert list(cells) == list(answer["columns"])
        assert {name: [row[name] for row in rows] for name in cells} == answer["columns"]
    assert text.headers["sublevel-release"] == answer["release"]
    first_source = answer["sources"][0]["id"] if answer["sources"] else None
    assert first_source is None or first_source in text.headers["sublevel-sources"]


def test_format_wins_over_accept(client: TestClient) -> None:
    """format= decides, whatever the Accept header says; without it the header does."""
    asked = {"Accept": "text/csv"}
    assert client.get(COMPONENTS, headers=asked).headers["content-type"].startswith("text/csv")
    assert client.get(f"{COMPONENTS}&format=json", headers=asked).headers["content-type"] == "application/json"
    assert client.get(f"{COMPONENTS}&format=csv", headers={"Accept": "image/png"}).status_code == 200


@pytest.mark.parametrize(
    ("accept", "name"),
    [
        ("", "json"),
        ("*/*", "json"),
        ("application/json", "json"),
        ("application/*", "json"),
        ("text/*", "csv"),
        ("text/csv", "csv"),
        ("application/jsonl", "ndjson"),
        ("text/html, application/x-ndjson;q=0.9, */*;q=0.1", "ndjson"),
        ("text/csv;q=0.5, application/json;q=0.9", "json"),
        ("application/json;q=0, text/csv", "csv"),
        ("text/html,application/xhtml+xml,application/xml;q=0.9,*/*;q=0.8", "json"),
        ("text/csv;q=nonsense, */*", "json"),
    ],
)
def test_accept_header_is_weighed(accept: str, name: str) -> None:
    """The best match of the Accept header decides; JSON where several fit equally."""
    assert choose(None, accept).name == name


def test_etag_is_strong_and_of_everything_that_decides(client: TestClient) -> None:
    """The ETag differs between representations and questions, and stays the same for the same bytes."""
    tags = [
        client.get(url).headers["etag"]
        for url in (COMPONENTS, f"{COMPONENTS}&format=csv", COMPONENTS.replace("3.2", "3.3"), COMPONENTS)
    ]
    assert tags[0] == tags[3]
    assert len(set(tags)) == 3
    assert all(tag.startswith('"') for tag in tags)


@pytest.mark.parametrize("question", GETS, ids=lambda question: question.name)
def test_known_etag_gives_304(client: TestClient, question: Question) -> None:
    """If-None-Match with the ETag, in a list, weak, or as *, gives 304 without a body and with the same validators."""
    whole = client.get(question.example)
    tag = whole.headers["etag"]
    for known in (tag, f'"other", {tag}', f"W/{tag}", "*"):
        response = client.get(question.example, headers={"If-None-Match": known})
        assert (response.status_code, response.content) == (304, b"")
        assert response.headers["etag"] == tag
        assert response.headers["cache-control"] == whole.headers["cache-control"]
        assert "content-type" not in response.headers
    assert client.get(question.example, headers={"If-None-Match": '"other"'}).content == whole.content


def test_304_needs_no_computation(client: TestClient, app: Any, monkeypatch: pytest.MonkeyPatch) -> None:
    """A matching ETag is answered from the query alone: nothing is computed."""
    url = "/v1/atoms/87Rb/shift?line=780&lower=1,0&upper=2,1&field=77"
    tag = client.get(url).headers["etag"]
    route = next(route for route in app.api.router.routes if getattr(route, "name", "") == "shift")
    monkeypatch.setattr(app.api.state.running.cache, "get", lambda key: None)
    monkeypatch.setattr("service.asking.Work.answer", lambda self: pytest.fail("computed"))
    assert client.get(url, headers={"If-None-Match": tag}).status_code == 304
    assert route.path == "/v1/atoms/{atom}/shift"


@pytest.mark.parametrize("url", [*(question.example for question in GETS), "/health/live", "/docs", "/openapi.json"])
def test_head_is_get_without_a_body(client: TestClient, url: str) -> None:
    """HEAD answers with the headers of GET and no body."""
    whole, head = client.get(url), client.head(url)
    assert (head.status_code, head.content) == (whole.status_code, b"")
    same = ("content-length", "content-type", "etag", "cache-control")
    assert {name: head.headers.get(name) for name in same} == {name: whole.headers.get(name) for name in same}


def test_answers_may_be_kept_and_vary(client: TestClient) -> None:
    """Deterministic answers say how long they may be kept and that they vary with Accept; posted ones are not kept."""
    headers = client.get(COMPONENTS).headers
    assert "max-age=60" in headers["cache-control"]
    assert "accept" in headers["vary"].lower()
    posted = client.post("/v1/sweep", json={"atom": "87Rb", "level": "5s_2S1/2", "fields": {"values": [1]}})
    assert posted.headers["cache-control"] == "no-store"
    assert "etag" not in posted.headers


def test_etag_helpers() -> None:
    """Parts of an ETag do not run into each other, and a list of ETags is searched."""
    assert etag(b"ab", b"c") != etag(b"a", b"bc")
    assert etag_matches(b'"x", W/"y"', b'"y"')
    assert not etag_matches(b'"x"', b'"y"')


def test_flat_row_moves_units_into_names() -> None:
    """A scalar becomes a column with its unit, one of its uncertainty, and a list becomes text."""
    row = flat_row({"slope": scalar(1.4, 0.1, "MHz/G"), "names": ["a", "b"], "n": 3})
    assert row == {"slope_MHz_per_G": 1.4, "slope_uncertainty_MHz_per_G": 0.1, "names": "a; b", "n": 3}
    assert [unit_suffix(unit) for unit in ("1", "cm-1", "s-1", "a0^3", "e*a0", "Hz/G2")] == [
        "",
        "_per_cm",
        "_per_s",
        "_a03",
        "_e_a0",
        "_Hz_per_G2",
    ]


def test_json_of_numpy_needs_no_copy_of_the_caller() -> None:
    """Arrays that are slices or integers are written like lists."""
    grid = np.arange(10.0).reshape(5, 2)
    assert json.loads(b"".join(json_pieces({"a": 1}, Table({"x": grid[:, 0]}), {"b": 2}))) == {
        "a": 1,
        "columns": {"x": [0, 2, 4, 6, 8]},
        "missing": [],
        "b": 2,
    }
    assert encode_json(np.array([1, 2])) == b"[1,2]"
    assert choose("json", "") is JSON
    assert Answer({}).table is None
