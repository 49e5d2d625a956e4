"""What the README prints works as printed."""

import re
import shlex
from pathlib import Path

import httpx2
import pytest

from service.question import Question
from service.routes import QUESTIONS
from tests.service.conftest import ROOT, Server

README = (Path(ROOT) / "README.md").read_text()
REQUESTS = re.findall(r"^curl .*$", README, flags=re.MULTILINE)


def test_there_are_as_many_requests_as_the_heading_says() -> None:
    """The README promises eleven requests."""
    assert "## Eleven requests" in README
    assert len(REQUESTS) == 11


def test_map_for_developers_names_every_module_of_the_library() -> None:
    """DEVELOPERS.md says of every module of `levels` what it belongs to; the rules of the audit stand as `audit_*`."""
    text = (Path(ROOT) / "DEVELOPERS.md").read_text()
    modules = {path.stem for path in (Path(ROOT) / "levels").glob("*.py")} - {"__init__"}
    assert sorted(name for name in modules if f"`{name}`" not in text and not name.startswith("audit_")) == []


@pytest.mark.parametrize("command", REQUESTS)
def test_request_of_the_readme_answers(command: str, server: Server) -> None:
    """Each request, sent with the address of the test's server, is answered with 200 and a body with numbers."""
    words = shlex.split(command)
    address = words[-1].replace("http://127.0.0.1:8000", server.url)
    if "-d" in words:
        headers = dict([words[words.index("-H") + 1].split(": ")])
        answer = httpx2.post(address, content=words[words.index("-d") + 1], headers=headers)
    else:
        answer = httpx2.get(address)
    assert answer.status_code == 200, answer.text[:300]
    assert re.search(r"\d\.\d", answer.text)


@pytest.mark.parametrize("question", QUESTIONS, ids=lambda one: one.name)
def test_table_of_requests_has_every_question(question: Question) -> None:
    """Each question's path, or its last part behind dots, stands in the table of requests."""
    rows = "".join(re.findall(r"^\| .*$", README, flags=re.MULTILINE))
    assert f"/{question.path.rpartition('/')[2]}`" in rows


def test_the_two_commands_exist_and_run() -> None:
    """Both commands are files with their run bit, at the paths that the README prints."""
    block = README.split("## Two commands")[1].split("```")[1].split()
    assert block == ["deploy/serve", "deploy/test"]
    for command in block:
        assert (Path(ROOT) / command).stat().st_mode & 0o111


def test_terminal_example_gives_the_server_its_answer(server: Server) -> None:
    """The command of the README, as JSON, is the answer of the server's request."""
    import contextlib
    import io

    import orjson

    from service.cli import main

    example = re.search(r"`sublevel (shift [^`]*)`", README)
    assert example is not None
    printed = io.StringIO()
    with contextlib.redirect_stdout(printed):
        assert main([*shlex.split(example[1]), "--json"]) == 0
    query = {"line": "780", "lower": "2,2", "upper": "3,3", "field": "3.2"}
    assert orjson.loads(printed.getvalue()) == httpx2.get(f"{server.url}/v1/atoms/87Rb/shift", params=query).json()
