"""The documentation as pages of the server itself: every question with a form that asks it, every problem type.

Written from the OpenAPI document and the table of problems when first asked for; nothing comes from elsewhere, so it
works offline, and there is no inline script or style.
"""

import re
from collections.abc import Awaitable, Callable, Iterable, Mapping
from functools import cache, partial
from html import escape
from pathlib import Path
from typing import Any

import orjson
from starlette.requests import Request
from starlette.responses import Response
from starlette.routing import Route

from levels.findings import KINDS
from service.formats import etag, etag_matches
from service.middleware import PAGE_POLICY
from service.problems import TYPES, Problem, ProblemType, nearest_names
from service.question import Question

FILES = Path(__file__).parent / "page" / "docs"
HTML = "text/html; charset=utf-8"
CAUTION = (
    "Laser beams can blind: before you change a power or the path of a beam, follow your local rules and your laser"
    " safety officer."
)
PAGE_HEADERS = {"Content-Security-Policy": PAGE_POLICY.decode(), "Cache-Control": "public, max-age=300"}


def docs_routes(document: Callable[[], Mapping[str, Any]], questions: Iterable[Question]) -> list[Route]:
    """The routes of the documentation: each page is written once, when it is first asked for."""
    problems = {row.name: ready(partial(problem_page, row), HTML) for row in TYPES.values()}

    async def problem(request: Request) -> Response:
        name = request.path_params["name"]
        if name not in problems:
            detail = f"there is no problem type {name!r}"
            raise Problem("unknown-path", detail, given=name, nearest=nearest_names(name, problems))
        return await problems[name](request)

    pages = {
        "/docs": (lambda: docs_page(document(), list(questions)), HTML),
        "/problems": (problems_page, HTML),
        "/findings": (findings_page, HTML),
        "/openapi.json": (lambda: orjson.dumps(document()).decode(), "application/json"),
        "/docs/docs.css": ((FILES / "docs.css").read_text, "text/css; charset=utf-8"),
        "/docs/docs.js": ((FILES / "docs.js").read_text, "text/javascript; charset=utf-8"),
    }
    routes = [Route(path, ready(write, kind), name=path) for path, (write, kind) in pages.items()]
    return [*routes, Route("/problems/{name}", problem, name="problem")]


def ready(write: Callable[[], str], media_type: str) -> Callable[[Request], Awaitable[Response]]:
    """An endpoint that answers with one text, written when it is first asked for."""

    @cache
    def written() -> tuple[bytes, bytes]:
        body = write().encode()
        return body, etag(body)

    async def endpoint(request: Request) -> Response:
        body, tag = written()
        headers = {**PAGE_HEADERS, "ETag": tag.decode(), "Content-Type": media_type}
        if etag_matches(request.headers.get("if-none-match", "").encode(), tag):
            return Response(status_code=304, headers=headers)
        return Response(body, headers=headers)

    return endpoint


def _page(title: str, body: str) -> str:
    return (
        '<!doctype html>\n<html lang="en">\n<head>\n<meta charset="utf-8">\n'
        '<meta name="viewport" content="width=device-width, initial-scale=1">\n'
        f"<title>{escape(title)}</title>\n"
        '<link rel="icon" href="/page/mark.svg" type="image/svg+xml">\n'
        '<link rel="stylesheet" href="/docs/docs.css">\n'
        '<script type="module" src="/docs/docs.js"></script>\n</head>\n'
        f"<body>\n<main>\n{body}\n</main>\n</body>\n</html>\n"
    )


def docs_page(document: Mapping[str, Any], questions: list[Question]) -> str:
    """The page of all questions."""
    info = document["info"]
    parts = [
        f"<h1>{escape(info['title'])} {escape(info['version'])}</h1>",
        f"<p>{escape(info['description'])}</p>",
        '<p><a href="/openapi.json">OpenAPI document</a> · <a href="/problems">problem types</a>'
        ' · <a href="/findings">findings of a scheme</a></p>',
    ]
    tags = [(tag, [one for one in questions if one.tag == tag["name"]]) for tag in document["tags"]]
    parts += [_index(tag["name"], mine) for tag, mine in tags if mine]
    for tag, mine in tags:
        if mine:
            parts.append(f"<h2>{escape(tag['name'])}</h2>\n<p>{escape(tag['description'])}</p>")
            parts += [_section(question, document) for question in mine]
    return _page(f"{info['title']}: documentation", "\n".join(parts))


def _index(tag: str, questions: Iterable[Question]) -> str:
    links = (
        f'<a href="/docs#{_anchor(one)}" title="{escape(one.summary)}">{escape(one.name)}</a>' for one in questions
    )
    return f"<p>{escape(tag)}: {' · '.join(links)}</p>"


def _anchor(question: Question) -> str:
    return escape(question.name.replace(" ", "-"))


def _prose(text: str) -> str:
    """Text as HTML, what stands between backticks as code."""
    return re.sub("`([^`]+)`", r"<code>\1</code>", escape(text))


def _section(question: Question, document: Mapping[str, Any]) -> str:
    operation = document["paths"][question.path][question.method.lower()]
    answer = operation["responses"]["200"]["content"]["application/json"]["schema"]
    return "\n".join(
        (
            f'<section id="{_anchor(question)}">',
            f"<h3>{escape(question.summary)}</h3>",
            f"<p><code>{question.method} {escape(question.path)}</code></p>",
            *(f"<p>{_prose(text)}</p>" for text in question.description.split("\n\n")),
            _parameters(operation, document),
            _form(question, operation),
            '<pre class="answer" aria-live="polite"></pre>',
            f"<details><summary>Answer</summary>{_members(answer, document, 'Members of the answer')}</details>",
            "</section>",
        )
    )


def _parameters(operation: Mapping[str, Any], document: Mapping[str, Any]) -> str:
    if "requestBody" in operation:
        schema = operation["requestBody"]["content"]["application/json"]["schema"]
        parts = [(name, part) for name, part in _parts(schema, document).items() if name != _name(schema)]
        inner = [_members(part, document, f"Members of {name}") for name, part in parts]
        return "\n".join((_members(schema, document, "Members of the body"), *inner))
    rows = [
        (row["name"], _kind(row["schema"], document), row["schema"].get("default"), row.get("description", ""))
        for row in operation.get("parameters", ())
    ]
    needed = {row["name"] for row in operation.get("parameters", ()) if row.get("required")}
    return _table("Parameters", rows, needed)


def _parts(schema: Mapping[str, Any], document: Mapping[str, Any]) -> dict[str, Mapping[str, Any]]:
    """The objects that a schema is made of, by name, each once, outer ones first."""
    found: dict[str, Mapping[str, Any]] = {}
    waiting: list[Any] = [schema]
    while waiting:
        part = waiting.pop(0)
        if isinstance(part, list):
            waiting += part
        elif isinstance(part, Mapping) and "$ref" in part:
            if _name(part) not in found:
                found[_name(part)] = part
                waiting.append(dict(_solved(part, document)))
        elif isinstance(part, Mapping):
            waiting += [value for key, value in part.items() if key not in ("default", "example", "examples")]
    return {name: part for name, part in found.items() if "properties" in _solved(part, document)}


def _name(schema: Mapping[str, Any]) -> str:
    return str(schema.get("$ref", "")).rpartition("/")[2]


def _members(schema: Mapping[str, Any], document: Mapping[str, Any], caption: str) -> str:
    solved = _solved(schema, document)
    rows = [
        (name, _kind(row, document), row.get("default"), row.get("description", ""))
        for name, row in solved.get("properties", {}).items()
    ]
    tables = [_table(caption, rows, set(solved.get("required", ())))]
    columns = solved.get("properties", {}).get("columns")
    if columns:
        tables.append(_members(columns, document, "Columns"))
    return "\n".join(tables)


def _table(caption: str, rows: list[tuple[str, str, Any, str]], needed: set[str]) -> str:
    if not rows:
        return ""
    cells = (
        (f"<code>{escape(name)}</code>", escape(kind), _default(name, default, needed), _prose(text))
        for name, kind, default, text in rows
    )
    body = "\n".join("<tr>" + "".join(f"<td>{cell}</td>" for cell in row) + "</tr>" for row in cells)
    heads = "".join(f'<th scope="col">{head}</th>' for head in ("name", "kind", "default", "meaning"))
    return f"<table><caption>{caption}</caption>\n<tr>{heads}</tr>\n{body}\n</table>"


def _default(name: str, default: Any, needed: set[str]) -> str:
    return "needed" if name in needed else "" if default is None else f"<code>{escape(str(default))}</code>"


def _solved(schema: Mapping[str, Any], document: Mapping[str, Any]) -> Mapping[str, Any]:
    if "$ref" in schema:
        solved: Mapping[str, Any] = document["components"]["schemas"][schema["$ref"].rpartition("/")[2]]
        return solved
    return schema


def _kind(schema: Mapping[str, Any], document: Mapping[str, Any]) -> str:
    if "enum" in schema:
        return " | ".join(map(str, schema["enum"]))
    if "const" in schema:
        return str(schema["const"])
    if "anyOf" in schema:
        return " or ".join(_kind(part, document) for part in schema["anyOf"])
    if "$ref" in schema:
        return str(schema["$ref"].rpartition("/")[2])
    if schema.get("type") == "array":
        return f"list of {_kind(schema.get('items', {}), document)}"
    return str(schema.get("type", ""))


def _form(question: Question, operation: Mapping[str, Any]) -> str:
    if question.body_example is not None:
        text = orjson.dumps(dict(question.body_example), option=orjson.OPT_INDENT_2).decode()
        fields = f'<label class="wide">body<textarea name="body" rows="8">{escape(text)}</textarea></label>'
    else:
        rows = [(escape(row["name"]), escape(str(row.get("example", "")))) for row in operation.get("parameters", ())]
        fields = "".join(f'<label>{name}<input name="{name}" value="{value}"></label>' for name, value in rows)
    return (
        f'<form data-path="{escape(question.path)}" data-method="{question.method}" action="#" method="get">'
        f"{fields}<button>Ask</button></form>"
    )


def problem_page(row: ProblemType) -> str:
    """The page of one problem type."""
    return _page(f"{row.title}: a problem", f'{_problem(row, "h1")}\n<p><a href="/problems">All problem types</a></p>')


def problems_page() -> str:
    """The page of all problem types."""
    return _page("Problem types", "<h1>Problem types</h1>\n" + "\n".join(_problem(row, "h2") for row in TYPES.values()))


def findings_page() -> str:
    """The page of all findings that a scheme may have."""
    rows = "\n".join(
        f'<tr id="{kind.code}"><td><code>{kind.code}</code></td><td>{kind.severity}</td><td>{escape(kind.unit)}</td>'
        f"<td>{escape(kind.meaning)}</td></tr>"
        for kind in KINDS
    )
    heads = "".join(
        f'<th scope="col">{head}</th>' for head in ("code", "usual severity", "unit", "the number behind it")
    )
    return _page(
        "Findings of a scheme",
        "<h1>Findings of a scheme</h1>\n<p>What <code>/v1/scheme</code> may say about beams in a field. Codes never"
        " change; the number behind a finding may make it more or less severe.</p>\n"
        f"<table><caption>Findings</caption>\n<tr>{heads}</tr>\n{rows}\n</table>\n<p>{escape(CAUTION)}</p>",
    )


def _problem(row: ProblemType, head: str) -> str:
    return (
        f'<section id="{row.name}">\n<{head}>{escape(row.title)}</{head}>\n'
        f"<p><code>{row.uri}</code>, status {row.status}</p>\n<p>{escape(row.meaning)}</p>\n"
        f"<p>What to do: {escape(row.remedy)}</p>\n</section>"
    )
