"""The command line and the client ask the same questions and get the same answers."""

import json
from pathlib import Path
from urllib.parse import parse_qsl, unquote, urlsplit

import httpx2
import pytest
from starlette.testclient import TestClient

from service.client import Client, Refused
from service.printing import table_lines
from service.question import Question
from service.routes import QUESTIONS
from service.settings import Settings
from service.terminal import ask
from tests.service.conftest import Server

SHIFT = ["shift", "87Rb", "--line", "780", "--lower", "2,2", "--upper", "3,3", "--field", "3.2"]


def test_json_is_the_servers_own(client: TestClient, capsys: pytest.CaptureFixture[str]) -> None:
    """A question asked with --json prints exactly what the server answers."""
    assert ask([*SHIFT, "--json"]) == 0
    url = "/v1/atoms/87Rb/shift?line=780&lower=2,2&upper=3,3&field=3.2"
    assert json.loads(capsys.readouterr().out) == client.get(url).json()


def test_table_shows_value_uncertainty_and_unit(capsys: pytest.CaptureFixture[str]) -> None:
    """Without a format the answer is a small table with units, sources and the release."""
    assert ask(SHIFT) == 0
    text = capsys.readouterr().out
    assert "slope" in text
    assert "MHz/G" in text
    assert "Ye, Swartz, Jungner, Hall" in text
    assert "release: " in text


def test_columns_are_aligned(capsys: pytest.CaptureFixture[str]) -> None:
    """A table of columns has a header and one line for each row."""
    assert ask(["strengths", "87Rb", "--line", "D2"]) == 0
    lines = capsys.readouterr().out.splitlines()
    head = next(at for at, line in enumerate(lines) if line.startswith("lower_F"))
    assert [line.split()[2] for line in lines[head + 1 : head + 7]] == ["1/6", "5/12", "5/12", "1/20", "1/4", "7/10"]


def test_negative_values_are_values(capsys: pytest.CaptureFixture[str]) -> None:
    """A value that begins with a minus sign is not taken for an option, with a unit or without."""
    for field in ("-3.2", "-0.32mT"):
        assert ask(["sublevels", "87Rb", "--level", "5S1/2", "--field", field, "--json"]) == 0
        assert json.loads(capsys.readouterr().out)["query"]["field"] == pytest.approx(-3.2)


def test_refusal_says_what_would_do(capsys: pytest.CaptureFixture[str]) -> None:
    """A refused question ends with status 1 and the problem's words on standard error."""
    assert ask(["atom", "87Rc"]) == 1
    assert "nearest: " in capsys.readouterr().err


@pytest.mark.parametrize("question", [one for one in QUESTIONS if one.method == "POST"], ids=lambda one: one.name)
def test_every_question_with_a_body_takes_a_file(
    question: Question, capsys: pytest.CaptureFixture[str], tmp_path: Path
) -> None:
    """Each POST question is a command that takes its JSON from a file and prints small tables, no Python or JSON."""
    body = tmp_path / "question.json"
    body.write_text(json.dumps(dict(question.body_example or {})))
    assert ask([question.name, str(body)]) == 0
    text = capsys.readouterr().out
    assert "release: " in text
    assert "{'" not in text


def test_missing_file_is_told(capsys: pytest.CaptureFixture[str], tmp_path: Path) -> None:
    """A file that is not there ends with status 1 and its name."""
    assert ask(["plan", str(tmp_path / "nowhere.json")]) == 1
    assert "nowhere.json: No such file" in capsys.readouterr().err


@pytest.mark.parametrize(
    ("value", "uncertainty", "text"),
    [
        (384.228119682248, 8.1e-9, "384.2281196822 ± 8.1e-09 MHz"),
        (15.54001, 0.017, "15.54 ± 0.017 MHz"),
        (0.0, 1.0, "0 ± 1 MHz"),
        (2.5, None, "2.5 MHz"),
    ],
)
def test_numbers_stop_where_their_uncertainty_does(value: float, uncertainty: float | None, text: str) -> None:
    """A number is printed to the second digit of its uncertainty."""
    rest = {"warnings": [], "uncertainty_excludes": [], "sources": [], "release": "r"}
    quantity = {"value": value, "uncertainty": uncertainty, "unit": "MHz", "reason": ""}
    assert next(table_lines({"shift": quantity, **rest})) == f"shift  {text}"


@pytest.mark.parametrize("question", [one for one in QUESTIONS if one.method == "GET"], ids=lambda one: one.name)
def test_every_query_question_is_a_command(question: Question, capsys: pytest.CaptureFixture[str]) -> None:
    """Each GET question is a command; its example, given as options, prints what the server answers."""
    url = urlsplit(question.example)
    places = [part for part, name in zip(url.path.split("/"), question.path.split("/"), strict=True) if name[:1] == "{"]
    options = [word for name, value in parse_qsl(url.query) for word in (f"--{name}", value)]
    assert ask([question.name, *places, *options]) == 0
    text = capsys.readouterr().out
    assert "release: " in text
    assert "{'" not in text


def test_client_answers_typed_records(server: Server) -> None:
    """The client's answers have the documented members with their types."""
    with Client(server.url) as client:
        shift = client.shift("87Rb", line=780, lower="2,2", upper="3,3", field=3.2)
        assert shift.slope.value == pytest.approx(1.3996, abs=2e-4)
        assert client.atom("40Ca+").nuclear_spin == 0.0
        assert client.levels("87Rb").levels[0].name == "5s_2S1/2"
        assert client.components("87Rb", line="780", polarisation="sigma+").columns.polarisation[0] == "sigma+"
        assert client.three_j(j1=1, j2=1, j3=0, m1=1, m2=-1, m3=0).exact == "sqrt(3)/3"
        swept = client.sweep(atom="87Rb", level="5s_2S1/2", fields={"values": [1.0]}, sublevels=["2,2"])
        assert swept.columns["F"] == [2.0]


@pytest.mark.parametrize("question", QUESTIONS, ids=lambda one: one.name)
def test_client_asks_every_question(question: Question, server: Server) -> None:
    """Each question is a method of the client that answers with the question's record."""
    url = urlsplit(question.example)
    places = [
        unquote(part)
        for part, name in zip(url.path.split("/"), question.path.split("/"), strict=True)
        if name[:1] == "{"
    ]
    method = {"3j": "three_j", "6j": "six_j"}.get(question.name, question.name.replace("-", "_"))
    asked = dict(parse_qsl(url.query)) if question.body_example is None else dict(question.body_example)
    with Client(server.url) as client:
        assert type(getattr(client, method)(*places, **asked)) is question.answered


def test_client_raises_the_problem(server: Server) -> None:
    """A refused question raises with the problem's members."""
    with Client(server.url) as client, pytest.raises(Refused) as caught:
        client.shift("87Rb", line=781, lower="2,2", upper="3,3", field=3.2)
    assert caught.value.problem.parameter == "line"
    assert "780" in caught.value.problem.nearest


def test_client_names_a_server_that_is_not_there() -> None:
    """No server at the address is the transport's own error, at once."""
    with Client("http://127.0.0.1:9", seconds=2) as client, pytest.raises(httpx2.ConnectError):
        client.atoms()


def test_settings_come_from_the_environment(monkeypatch: pytest.MonkeyPatch) -> None:
    """Every setting is an environment variable with the prefix SUBLEVEL_."""
    monkeypatch.setenv("SUBLEVEL_PORT", "8123")
    monkeypatch.setenv("SUBLEVEL_MAX_NUMBERS", "10")
    assert (Settings().port, Settings().max_numbers) == (8123, 10)
