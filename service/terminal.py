"""Questions from a terminal: options are the query's parameters, the answer small tables or the JSON itself.

A question that takes a body is given a file with its JSON, or `-` for standard input.
"""

import argparse
import asyncio
import json
import re
import sys
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any
from urllib.parse import quote, urlencode

from service.formats import REPRESENTATIONS
from service.printing import table_lines
from service.question import Question
from service.routes import QUESTIONS

STANDARD_INPUT = "-"


def build_parser() -> argparse.ArgumentParser:
    """One command for each question."""
    parser = argparse.ArgumentParser(prog="sublevel", description="The numbers behind an atom and a magnetic field.")
    commands = parser.add_subparsers(dest="command", required=True, metavar="command")
    commands.add_parser("serve", help="Start the server")
    commands.add_parser("audit", help="Check the catalogue")
    for question in QUESTIONS:
        _add(commands.add_parser(question.name, help=question.summary, description=question.description), question)
    return parser


def _add(command: argparse.ArgumentParser, question: Question) -> None:
    for name in question.path_names:
        command.add_argument(name)
    if question.method == "POST":
        members = ", ".join(name for name in question.asked.model_fields if name != "format")
        command.add_argument("body", help=f"file with a JSON object of {members}; {STANDARD_INPUT} for standard input")
    for name, field in question.asked.model_fields.items():
        if name != "format" and question.method == "GET":
            help_ = (field.description or "").replace("%", "%%")
            command.add_argument(f"--{name}", required=field.is_required(), help=help_, metavar=name.upper())
    how = command.add_mutually_exclusive_group()
    for form in ("json", "csv", "ndjson"):
        how.add_argument(f"--{form}", dest="form", action="store_const", const=form, help=f"print {form.upper()}")


def ask(arguments: Sequence[str]) -> int:
    """Ask one question and print the answer; 1 when it is refused."""
    given = build_parser().parse_args(_joined(arguments))
    question = next(question for question in QUESTIONS if question.name == given.command)
    try:
        body = read_body(given.body) if question.method == "POST" else b""
    except OSError as error:
        print(f"sublevel {question.name}: {given.body}: {error.strerror}", file=sys.stderr)
        return 1
    status, text = asyncio.run(_answer(question.method, url_of(question, vars(given)), body, given.form or "json"))
    if status != 200:
        _print_problem(json.loads(text))
        return 1
    print(text.rstrip("\r\n") if given.form else "\n".join(table_lines(json.loads(text))))
    return 0


def read_body(name: str) -> bytes:
    """What the file of this name, or standard input, holds."""
    return sys.stdin.buffer.read() if name == STANDARD_INPUT else Path(name).read_bytes()


def _joined(arguments: Sequence[str]) -> list[str]:
    """Values that begin with a minus sign, joined to their option: `--field -3.2mT` is no option `-3`."""
    joined: list[str] = []
    for argument in arguments:
        if re.match(r"-[0-9.]", argument) and joined and re.fullmatch(r"--\w+", joined[-1]):
            joined[-1] += f"={argument}"
        else:
            joined.append(argument)
    return joined


def url_of(question: Question, given: Mapping[str, Any]) -> str:
    """The request that a command is."""
    path = question.path
    for name in question.path_names:
        path = path.replace(f"{{{name}}}", quote(given[name], safe=""))
    query = {name: given[name] for name in question.asked.model_fields if given.get(name) is not None}
    return f"{path}?{urlencode(query)}" if query else path


async def _answer(method: str, url: str, body: bytes, form: str) -> tuple[int, str]:
    import httpx2

    from service.app import build_app

    app = build_app()
    transport = httpx2.ASGITransport(app=app)
    async with (
        app.api.router.lifespan_context(app.api),
        httpx2.AsyncClient(transport=transport, base_url="http://sublevel", timeout=None) as client,
    ):
        headers = {"Accept": REPRESENTATIONS[form].content_type.decode(), "Content-Type": "application/json"}
        response = await client.request(method, url, content=body, headers=headers)
        return response.status_code, response.text


def _print_problem(problem: Mapping[str, Any]) -> None:
    print(f"{problem['title']}: {problem['detail']}", file=sys.stderr)
    for fault in problem["errors"]:
        print(f"  {fault['parameter']}: {fault['detail']}", file=sys.stderr)
    if problem["nearest"]:
        print(f"  nearest: {', '.join(problem['nearest'])}", file=sys.stderr)
