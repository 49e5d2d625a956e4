"""Every question: its example works, has the documented shape and says where its numbers come from."""

import math
from typing import Any
from urllib.parse import quote

import pytest
from httpx2 import Response
from starlette.testclient import TestClient

from service.question import Question
from service.routes import QUESTIONS

each_question = pytest.mark.parametrize("question", QUESTIONS, ids=lambda question: question.name)


def ask_example(client: TestClient, question: Question) -> Response:
    if question.body_example is not None:
        return client.post(question.example, json=dict(question.body_example))
    return client.get(question.example)


def numbers_in(value: Any) -> list[float]:
    if isinstance(value, dict):
        return [number for part in value.values() for number in numbers_in(part)]
    if isinstance(value, list):
        return [number for part in value for number in numbers_in(part)]
    return [value] if isinstance(value, float) else []


@each_question
def test_example_has_documented_shape(client: TestClient, question: Question) -> None:
    """The example of every question answers 200 with exactly the documented members."""
    response = ask_example(client, question)
    assert response.status_code == 200, response.text
    answer = response.json()
    question.answered.model_validate(answer, strict=True, extra="forbid")
    assert answer.keys() == question.answered.model_fields.keys()


@each_question
def test_answer_says_what_was_asked_and_what_it_rests_on(client: TestClient, question: Question) -> None:
    """Every answer echoes the query with its defaults and has release, sources and warnings."""
    answer = ask_example(client, question).json()
    defaults = {*question.asked.model_fields, *question.path_names} - {"format"}
    assert answer["query"].keys() == defaults
    assert answer["release"]
    for source in answer["sources"]:
        assert list(source) == ["id", "citation", "doi", "evidence", "used_for"]
        assert source["id"]
        assert source["citation"]
        assert source["evidence"] in ("checked", "recalled", "computed")
        assert source["used_for"]


@each_question
def test_echo_is_a_question(client: TestClient, question: Question) -> None:
    """The echo with its defaults, asked again, is the same question and gets the same answer."""
    first = ask_example(client, question).json()
    echo = dict(first["query"])
    if question.body_example is not None:
        second = client.post(question.path, json=echo)
    else:
        path = question.path.format_map({name: quote(echo.pop(name), safe="") for name in question.path_names})
        second = client.get(path, params={name: spelt(value) for name, value in echo.items() if value is not None})
    assert second.status_code == 200, second.text
    assert second.json() == first


def spelt(value: Any) -> str:
    if isinstance(value, list):
        return ",".join(map(str, value))
    return str(value).lower() if isinstance(value, bool) else str(value)


@each_question
def test_numbers_are_finite(client: TestClient, question: Question) -> None:
    """No NaN or infinity leaves: the text of every answer is strict JSON with finite numbers."""
    response = ask_example(client, question)
    assert "NaN" not in response.text
    assert "Infinity" not in response.text
    assert all(map(math.isfinite, numbers_in(response.json())))


@each_question
def test_keys_are_identifiers_and_records_alike(client: TestClient, question: Question) -> None:
    """Keys are valid identifiers, and the records of one list have the same keys in the same order."""

    def check(value: Any, path: str) -> None:
        if isinstance(value, dict):
            assert all(key.isidentifier() for key in value), (path, list(value))
            for key, part in value.items():
                check(part, f"{path}.{key}")
        elif isinstance(value, list):
            assert len({tuple(part) for part in value if isinstance(part, dict)}) <= 1, path
            for part in value:
                check(part, path)

    check(ask_example(client, question).json(), "")


@each_question
def test_null_columns_have_a_reason(client: TestClient, question: Question) -> None:
    """A column that holds null is listed under `missing`, and only such a column."""
    answer = ask_example(client, question).json()
    nulls = {name for name, column in answer.get("columns", {}).items() if None in column}
    assert {item["column"] for item in answer.get("missing", [])} == nulls
    assert all(item["reason"] for item in answer.get("missing", []))


@each_question
def test_question_is_documented(question: Question) -> None:
    """Every question has a summary, a description and a description for each of its members."""
    assert question.summary
    assert question.description
    for model in (question.asked, question.answered):
        assert model.__doc__


def test_computations_refuse_recalled_inputs_on_request(client: TestClient) -> None:
    """evidence=checked refuses an answer with recalled inputs and lists exactly those."""
    url = "/v1/atoms/87Rb/shift?line=780&lower=2,2&upper=3,3&field=3.2"
    recalled = [source for source in client.get(url).json()["sources"] if source["evidence"] == "recalled"]
    assert recalled
    response = client.get(f"{url}&evidence=checked")
    problem = response.json()
    assert (response.status_code, problem["type"]) == (422, "/problems/recalled-evidence")
    listed = {fault["parameter"] for fault in problem["errors"]}
    assert listed == {name for source in recalled for name in source["used_for"]}


def test_overrides_of_defaults_do_not_matter(client: TestClient) -> None:
    """Spelling out a default, another order or another unit is the same question: same answer, same ETag."""
    base = "/v1/atoms/87Rb/shift"
    one = client.get(f"{base}?line=780&lower=2,2&upper=3,3&field=3.2")
    two = client.get(f"{base}?field=0.32mT&evidence=any&upper=3,3&lower=2,2&line=780&format=json")
    assert one.content == two.content
    assert one.headers["etag"] == two.headers["etag"]


def test_shift_of_stretched_component(client: TestClient) -> None:
    """The stretched 87Rb D2 component moves by muB/h, 1.3996 MHz/G (CODATA 2022); frequency is centroid and offset."""
    answer = client.get("/v1/atoms/87Rb/shift?line=D2&lower=2,2&upper=3,3&field=100").json()
    assert answer["slope"]["value"] == pytest.approx(1.3996, abs=2e-4)
    assert answer["slope"]["unit"] == "MHz/G"
    assert answer["strength"]["value"] == pytest.approx(1.0, abs=1e-12)
    assert answer["polarisation"] == "sigma+"
    line = client.get("/v1/atoms/87Rb/lines").json()["lines"][0]
    expected = (line["frequency"]["value"] + answer["offset"]["value"]) * 1e-6
    assert answer["frequency"]["value"] == pytest.approx(expected, abs=1e-12)


def test_an_empty_table_of_pairs_says_why(client: TestClient) -> None:
    """A level of one sublevel has no pair, and one whose sublevels only move apart has none: the answer says so."""
    for path in ("88Sr/insensitive?level=5s2_1S0", "40Ca%2B/insensitive?level=4s_2S1/2&max_field=10"):
        answer = client.get(f"/v1/atoms/{path}").json()
        assert answer["columns"]["field_G"] == []
        assert any("no pair" in warning for warning in answer["warnings"])


def test_clock_pair_is_found(client: TestClient) -> None:
    """87Rb |1,-1> and |2,1> are field-insensitive at 3.2289 G with 431.36 Hz/G2 (published: issue's check list)."""
    columns = client.get("/v1/atoms/87Rb/insensitive?level=5S1/2&max_field=10").json()["columns"]
    labels = [columns[name] for name in ("lower_F", "lower_m", "upper_F", "upper_m")]
    row = list(zip(*labels, strict=True)).index((1.0, -1.0, 2.0, 1.0))
    assert columns["field_G"][row] == pytest.approx(3.2289, abs=1e-4)
    assert columns["quadratic_Hz_per_G2"][row] == pytest.approx(431.36, abs=0.01)


def test_splitting_gives_the_field_back(client: TestClient) -> None:
    """The field found from a splitting is the field at which that splitting was computed."""
    wanted = 7.25
    columns = client.get(f"/v1/atoms/87Rb/sublevels?level=5s_2S1/2&field={wanted}").json()["columns"]
    energy = dict(zip(zip(columns["F"], columns["m"], strict=True), columns["energy_MHz"], strict=True))
    splitting = energy[2.0, 1.0] - energy[1.0, 0.0]
    url = f"/v1/atoms/87Rb/field?level=5s_2S1/2&lower=1,0&upper=2,1&splitting={splitting!r}&uncertainty=1kHz"
    found = client.get(url).json()["columns"]
    assert found["field_G"] == pytest.approx([wanted], abs=1e-7)
    assert found["field_uncertainty_G"] == pytest.approx([1e-3 / found["slope_MHz_per_G"][0]], rel=1e-3)


def test_impossible_splitting_says_the_range(client: TestClient) -> None:
    """A splitting that no field gives answers with no rows and a warning that says what it is at both ends."""
    answer = client.get("/v1/atoms/87Rb/field?level=5s_2S1/2&lower=1,0&upper=2,0&splitting=1").json()
    assert answer["columns"]["field_G"] == []
    assert "6834.68" in answer["warnings"][-1]


def test_sublevels_of_spinless_isotope(client: TestClient) -> None:
    """88Sr 3P1 has three sublevels named by J, moving by 2.1 MHz/G times m (published: issue's check list)."""
    columns = client.get("/v1/atoms/88Sr/sublevels?level=5s.5p_3P1&field=1").json()["columns"]
    assert columns["F"] == [1.0, 1.0, 1.0]
    assert columns["m"] == [-1.0, 0.0, 1.0]
    assert columns["slope_MHz_per_G"] == pytest.approx([-2.1, 0.0, 2.1], abs=0.01)
    assert columns["m_I"] == [0.0, 0.0, 0.0]


def test_components_filter_by_polarisation(client: TestClient) -> None:
    """polarisation= keeps exactly the rows of that polarisation, also when the plus sign came unescaped."""
    everything = client.get("/v1/atoms/87Rb/components?line=780&field=3.2").json()["columns"]
    for spelling in ("sigma%2B", "sigma+"):
        some = client.get(f"/v1/atoms/87Rb/components?line=780&field=3.2&polarisation={spelling}").json()["columns"]
        kept = [at for at, name in enumerate(everything["polarisation"]) if name == "sigma+"]
        assert some == {name: [column[at] for at in kept] for name, column in everything.items()}


def test_shift_and_components_agree(client: TestClient) -> None:
    """The component that `shift` answers is the row of `components`."""
    shift = client.get("/v1/atoms/87Rb/shift?line=780&lower=1,0&upper=2,1&field=12.5").json()
    assert shift["slope"]["reason"] or shift["slope"]["uncertainty"]
    columns = client.get("/v1/atoms/87Rb/components?line=780&field=12.5").json()["columns"]
    labels = [columns[name] for name in ("lower_F", "lower_m", "upper_F", "upper_m")]
    row = list(zip(*labels, strict=True)).index((1.0, 0.0, 2.0, 1.0))
    for column in ("offset_MHz", "shift_MHz", "slope_MHz_per_G", "frequency_THz"):
        name = column.partition("_")[0]
        assert columns[column][row] == pytest.approx(shift[name]["value"], rel=1e-12, abs=1e-9)
        stem, _, unit = column.partition("_")
        spread = columns[f"{stem}_uncertainty_{unit}"][row]
        expected = shift[name]["uncertainty"]
        assert spread == (None if expected is None else pytest.approx(expected, rel=1e-9))


def test_missing_constant_is_named(client: TestClient) -> None:
    """A question that needs a constant the catalogue does not have names it, and never guesses."""
    for name in (record["name"] for record in client.get("/v1/atoms").json()["atoms"]):
        for level in client.get(f"/v1/atoms/{name}/levels").json()["levels"]:
            if level["g_J"]["value"] is None and level["J"] > 0:
                response = client.get(f"/v1/atoms/{name}/sublevels", params={"level": level["name"]})
                problem = response.json()
                assert (response.status_code, problem["type"]) == (422, "/problems/not-published")
                assert "g_J" in problem["parameter"] or "A" in problem["parameter"]
                return
    pytest.fail("every level has a g_J: use another constant here")
