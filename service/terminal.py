"""Questions from a terminal: options are the query's parameters, the answer a small table or the JSON itself."""

import argparse
import asyncio
import json
import re
import sys
from collections.abc import Iterator, Mapping, Sequence
from typing import Any
from urllib.parse import quote, urlencode

from service.question import Question
from service.routes import QUESTIONS

MISSING = "-"
META = ("query", "columns", "missing", "warnings", "uncertainty_excludes", "sources", "release")


def build_parser() -> argparse.ArgumentParser:
    """One command for each question that a query string carries."""
    parser = argparse.ArgumentParser(prog="sublevel", description="The numbers behind an atom and a magnetic field.")
    commands = parser.add_subparsers(dest="command", required=True, metavar="command")
    commands.add_parser("serve", help="Start the server")
    commands.add_parser("audit", help="Check the catalogue")
    for question in QUESTIONS:
        if question.method == "GET":
            _add(commands.add_parser(question.name, help=question.summary, description=question.description), question)
    return parser


def _add(command: argparse.ArgumentParser, question: Question) -> None:
    for name in question.path_names:
        command.add_argument(name)
    for name, field in question.asked.model_fields.items():
        if name != "format":
            help_ = (field.description or "").replace("%", "%%")
            command.add_argument(f"--{name}", required=field.is_required(), help=help_, metavar=name.upper())
    how = command.add_mutually_exclusive_group()
    for form in ("json", "csv", "ndjson"):
        how.add_argument(f"--{form}", dest="form", action="store_const", const=form, help=f"print {form.upper()}")


def ask(arguments: Sequence[str]) -> int:
    """Ask one question and print the answer; 1 when it is refused."""
    given = build_parser().parse_args(_joined(arguments))
    question = next(question for question in QUESTIONS if question.name == given.command)
    status, text = asyncio.run(_answer(url_of(question, vars(given))))
    if status != 200:
        _print_problem(json.loads(text))
        return 1
    print(text.rstrip("\r\n") if given.form else "\n".join(table_lines(json.loads(text))))
    return 0


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
    if given["form"]:
        query["format"] = given["form"]
    return f"{path}?{urlencode(query)}" if query else path


async def _answer(url: str) -> tuple[int, str]:
    import httpx2

    from service.app import build_app

    app = build_app()
    transport = httpx2.ASGITransport(app=app)
    async with (
        app.api.router.lifespan_context(app.api),
        httpx2.AsyncClient(transport=transport, base_url="http://sublevel", timeout=None) as client,
    ):
        response = await client.get(url)
        return response.status_code, response.text


def _print_problem(problem: Mapping[str, Any]) -> None:
    print(f"{problem['title']}: {problem['detail']}", file=sys.stderr)
    for fault in problem["errors"]:
        print(f"  {fault['parameter']}: {fault['detail']}", file=sys.stderr)
    if problem["nearest"]:
        print(f"  nearest: {', '.join(problem['nearest'])}", file=sys.stderr)


def table_lines(answer: Mapping[str, Any]) -> Iterator[str]:
    """An answer as lines: single members, then the table or the list of records, then warnings and sources."""
    records = {key: value for key, value in answer.items() if key not in META and _is_records(value)}
    single = {key: value for key, value in answer.items() if key not in META and key not in records}
    yield from _aligned([[key, _cell(value)] for key, value in single.items()])
    columns = answer.get("columns")
    if columns:
        yield from _aligned([list(columns), *(map(_cell, row) for row in zip(*columns.values(), strict=True))])
    for rows in records.values():
        yield from _aligned([list(rows[0]), *([_cell(value) for value in row.values()] for row in rows)])
    yield from (f"{item['column']}: {item['reason']}" for item in answer.get("missing", ()))
    yield from (f"warning: {text}" for text in answer["warnings"])
    if answer["uncertainty_excludes"]:
        yield f"uncertainties leave out {', '.join(answer['uncertainty_excludes'])}"
    for item in answer["sources"]:
        yield f"source: {item['citation']} ({item['evidence']}): {', '.join(item['used_for'])}"
    yield f"release: {answer['release']}"


def _is_records(value: Any) -> bool:
    return isinstance(value, list) and bool(value) and isinstance(value[0], dict)


def _cell(value: Any) -> str:
    if isinstance(value, dict) and "unit" in value:
        return _quantity(value)
    if isinstance(value, list):
        return ", ".join(map(_cell, value))
    if value is None:
        return MISSING
    return f"{value:.12g}" if isinstance(value, float) else str(value)


def _quantity(value: Mapping[str, Any]) -> str:
    if value["value"] is None:
        return f"{MISSING} ({value['reason']})"
    spread = f" ± {value['uncertainty']:.2g}" if value["uncertainty"] is not None else ""
    unit = "" if value["unit"] == "1" else f" {value['unit']}"
    return f"{value['value']:.15g}{spread}{unit}"


def _aligned(rows: Sequence[Any]) -> Iterator[str]:
    cells = [list(row) for row in rows]
    widths = [max(map(len, column)) for column in zip(*cells, strict=True)] if cells else []
    for row in cells:
        yield "  ".join(cell.ljust(width) for cell, width in zip(row, widths, strict=True)).rstrip()
