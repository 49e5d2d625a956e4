"""The way from a request to the bytes of its answer.

raw bytes -> the answer held ready? -> query model -> ETag, 304 before any work -> `ask` -> bytes. FastAPI documents
the routes from their models; the requests take this way, which costs a third of FastAPI's own.
"""

import contextlib
import itertools
import logging
import time
from collections.abc import AsyncGenerator, Iterator, Mapping
from typing import Any, NamedTuple
from urllib.parse import unquote_plus

import orjson
from fastapi.routing import APIRoute
from pydantic import ValidationError
from starlette.types import Receive, Scope, Send

from service.answers import Answer, basis_of, flat_row, sources_of
from service.cache import AnswerCache, Headers, Reply
from service.context import Context
from service.formats import (
    JSON,
    Representation,
    Table,
    choose,
    csv_pieces,
    etag,
    etag_matches,
    json_pieces,
    ndjson_pieces,
)
from service.middleware import body_too_large, send_problem
from service.openapi import responses_of
from service.problems import Fault, Problem, nearest_names, of_validation, problem_of
from service.question import Asked, Question, documented
from service.scans import Scans
from service.work import HeavyWork

LOG = logging.getLogger("sublevel")
FRESH = b"public, max-age=60, stale-while-revalidate=300"
MOST_PARAMETERS = 40
STREAMED_NUMBERS = 100_000
MOST_HEADER = 2000
WORTH_KEEPING_SECONDS = 1e-4  # what is computed more quickly is not worth the memory of others
CONTENT_HEADERS = (b"content-type", b"content-length")


class Work(NamedTuple):
    """One question that has been read: what remains is to answer it and to write the answer."""

    question: Question
    context: Context
    path: Mapping[str, str]
    asked: Asked
    echo: bytes
    row: Representation

    def tag(self, path: str) -> bytes:
        """The ETag: everything that decides the bytes of the answer."""
        return etag(self.context.stamp, path.encode(), self.echo, self.row.content_type)

    def answer(self) -> Answer:
        """Compute the answer; refuse recalled inputs where that was asked."""
        answer = self.question.ask(self.context, self.path, self.asked)
        if getattr(self.asked, "evidence", "any") == "checked":
            refuse_recalled(answer)
        return answer

    def pieces(self, answer: Answer) -> Iterator[bytes]:
        """Write the answer in the representation that was asked for."""
        if self.row is not JSON:
            table = answer.table or Table({name: [cell] for name, cell in flat_row(answer.content).items()})
            return csv_pieces(table) if self.row.name == "csv" else ndjson_pieces(table)
        after = {
            "warnings": answer.warnings,
            "uncertainty_excludes": answer.uncertainty_excludes,
            "sources": basis_of(answer.used, self.context.publications).encoded,
            "release": self.context.release,
        }
        inline = answer.table if answer.columnar else None
        return json_pieces({"query": orjson.Fragment(self.echo), **answer.content}, inline, after)


class Running(NamedTuple):
    """What a started application answers with."""

    context: Context
    cache: AnswerCache
    heavy: HeavyWork
    scans: Scans


class QuestionRoute(APIRoute):
    """A question as a route of the application."""

    def __init__(self, question: Question) -> None:
        super().__init__(
            question.path,
            documented(question),
            methods=[question.method],
            response_model=question.answered,
            responses=responses_of(question),
            summary=question.summary,
            tags=[question.tag],
            operation_id=question.name.replace(" ", "_"),
        )
        self.question = question
        self.app = self.answer

    async def answer(self, scope: Scope, receive: Receive, send: Send) -> None:
        """Answer one request, whatever happens."""
        try:
            reply = await self._reply(scope, receive)
        except Exception as error:
            problem = problem_of(error)
            if problem.type.status == 500:
                LOG.error("request %s to %s failed", scope.get("request_id"), scope["path"], exc_info=error)
            await send_problem(problem, scope, send)
        else:
            await _send(reply, send)

    async def _reply(self, scope: Scope, receive: Receive) -> Reply:
        running: Running | None = scope["app"].state.running
        if running is None:
            raise Problem("not-ready", "the catalogue is not loaded", headers={"Retry-After": "1"})
        context, cache = running.context, running.cache
        accept, if_none_match, content_type = _headers(scope)
        if self.question.method == "POST":
            body = await _body(receive, content_type, context.settings.max_body_bytes)
            work = self._work(context, scope, read_body(self.question, body), accept)
            return await self._computed(work, running)
        key = (scope["path"], scope["query_string"], accept)
        reply = cache.get(key)
        if reply is None:
            if "atom" in scope["path_params"]:  # a misspelt atom is told before what else may be wrong
                context.atom(scope["path_params"]["atom"])
            work = self._work(context, scope, read_query(self.question, scope["query_string"]), accept)
            tag = work.tag(scope["path"])
            if if_none_match and if_none_match != b"*" and etag_matches(if_none_match, tag):
                return Reply(304, _framing(tag, work.row))
            started = time.perf_counter()
            reply = await self._computed(work, running, tag)
            if isinstance(reply.body, bytes) and time.perf_counter() - started > WORTH_KEEPING_SECONDS:
                cache.put(key, reply)
        if if_none_match and (if_none_match == b"*" or etag_matches(if_none_match, reply.tag)):
            return Reply(304, reply.headers, b"", reply.tag)
        return reply

    def _work(self, context: Context, scope: Scope, asked: Asked, accept: bytes) -> Work:
        row = choose(asked.format, accept.decode("latin-1"))
        return Work(self.question, context, scope["path_params"], asked, echo_of(scope["path_params"], asked), row)

    async def _computed(self, work: Work, running: Running, tag: bytes = b"") -> Reply:
        answer = await running.heavy.run(work.answer) if self.question.heavy else work.answer()
        return self._written(work, answer, tag)

    def _written(self, work: Work, answer: Answer, tag: bytes) -> Reply:
        headers = (*_framing(tag, work.row), *(() if work.row is JSON else _provenance(answer, work.context)))
        parts = work.pieces(answer)
        if numbers_in(answer) > STREAMED_NUMBERS:
            first = next(parts)  # what is wrong with the answer shows here, before its status is sent
            return Reply(200, (*headers, (b"x-accel-buffering", b"no")), itertools.chain((first,), parts), tag)
        body = b"".join(parts)
        return Reply(200, (*headers, (b"content-length", str(len(body)).encode())), body, tag)


def echo_of(path: Mapping[str, str], asked: Asked) -> bytes:
    """The question with its defaults as JSON, in one spelling: the answer's echo, and what its ETag is made of."""
    own = asked.__pydantic_serializer__.to_json(asked)
    if not path:
        return own
    return orjson.dumps(path)[:-1] + (b"," if len(own) > 2 else b"") + own[1:]


def read_query(question: Question, query_string: bytes) -> Asked:
    """The query string as the question's model; a key that is unknown or given twice is refused."""
    text = query_string.decode("latin-1")
    pairs = [part.partition("=") for part in text.split("&") if part]
    if len(pairs) > MOST_PARAMETERS:
        bound = f"{MOST_PARAMETERS} parameters"
        raise Problem("invalid-parameter", f"the query has more than {bound}", parameter="query", allowed=bound)
    if "%" in text or "+" in text:
        pairs = [(_decoded(name), "=", _decoded(value)) for name, _, value in pairs]
    given = {name: value for name, _, value in pairs}
    if len(given) < len(pairs):
        names = [name for name, _, _ in pairs]
        twice = next(name for name in names if names.count(name) > 1)
        detail = f"{twice} is given more than once"
        raise Problem("invalid-parameter", detail, parameter=twice, given=given[twice], allowed="one value")
    return validated(question, given)


def _decoded(text: str) -> str:
    return unquote_plus(text, errors="replace")


def read_body(question: Question, body: bytes) -> Asked:
    """The body as the question's model."""
    try:
        given = orjson.loads(body)
    except orjson.JSONDecodeError as error:
        raise Problem("malformed-body", f"the body is not JSON: {error}", allowed="a JSON object") from None
    if not isinstance(given, dict):
        raise Problem("malformed-body", "the body is JSON but not an object", given=given, allowed="a JSON object")
    return validated(question, given)


def validated(question: Question, given: dict[str, Any]) -> Asked:
    """What was given as the question's model, or a problem that says what would do."""
    fields = question.asked.__pydantic_fields__
    if not given.keys() <= fields.keys():
        unknown = next(name for name in given if name not in fields)
        near = nearest_names(unknown, fields)
        hint = f"; did you mean {near[0]}?" if near else ""
        detail = f"{question.name} has no parameter {unknown!r}{hint}"
        value = given[unknown]
        raise Problem(
            "unknown-parameter", detail, parameter=unknown, given=value, allowed=", ".join(fields), nearest=near
        )
    try:
        asked: Asked = question.asked.__pydantic_validator__.validate_python(given)
        return asked
    except ValidationError as error:
        raise of_validation(error, question.asked) from None


def refuse_recalled(answer: Answer) -> None:
    """Refuse an answer that rests on recalled inputs, listing them."""
    faults = [
        Fault(
            parameter=purpose,
            given=quantity.text,
            allowed="evidence checked",
            detail=f"recalled from {quantity.source}",
        )
        for purpose, quantity in answer.used
        if quantity.evidence == "recalled"
    ]
    if faults:
        detail = f"{len(faults)} of the inputs were entered from memory and not compared with their publication"
        raise Problem("recalled-evidence", detail, parameter="evidence", given="checked", allowed="any", errors=faults)


def numbers_in(answer: Answer) -> int:
    """How many cells the answer's table has."""
    return 0 if answer.table is None else answer.table.rows * len(answer.table.columns)


def _headers(scope: Scope) -> tuple[bytes, bytes, bytes]:
    accept = if_none_match = content_type = b""
    for name, value in scope["headers"]:
        if name == b"accept":
            accept = value
        elif name == b"if-none-match":
            if_none_match = value
        elif name == b"content-type":
            content_type = value
    return accept, if_none_match, content_type


async def _body(receive: Receive, content_type: bytes, bound: int) -> bytes:
    kind = content_type.partition(b";")[0].strip().lower()
    if kind and kind != b"application/json" and not kind.endswith(b"+json"):
        allowed = "application/json"
        raise Problem(
            "unsupported-media-type", f"the body must be {allowed}", given=kind.decode("latin-1"), allowed=allowed
        )
    parts, size, more = [], 0, True
    while more:
        message = await receive()
        if message["type"] != "http.request":
            break
        parts.append(message.get("body", b""))
        size, more = size + len(parts[-1]), message.get("more_body", False)
        if size > bound:
            raise body_too_large(bound, f"more than {bound} bytes")
    return b"".join(parts)


def _framing(tag: bytes, row: Representation) -> Headers:
    content_type = (b"content-type", row.content_type)
    vary = (b"vary", b"accept")
    if not tag:
        return (content_type, vary, (b"cache-control", b"no-store"))
    return (content_type, vary, (b"etag", tag), (b"cache-control", FRESH))


def _provenance(answer: Answer, context: Context) -> Headers:
    """What the JSON says beside the columns, for representations that hold nothing else."""
    keys = ", ".join(record["id"] for record in sources_of(answer.used, {}))
    texts = {
        b"sublevel-release": context.release,
        b"sublevel-sources": keys,
        b"sublevel-warnings": "; ".join(answer.warnings),
    }
    return tuple((name, text[:MOST_HEADER].encode("ascii", "replace")) for name, text in texts.items() if text)


async def _send(reply: Reply, send: Send) -> None:
    headers = reply.headers if reply.status == 200 else [h for h in reply.headers if h[0] not in CONTENT_HEADERS]
    await send({"type": "http.response.start", "status": reply.status, "headers": list(headers)})
    if isinstance(reply.body, bytes):
        await send({"type": "http.response.body", "body": reply.body})
        return
    if isinstance(reply.body, AsyncGenerator):
        async with contextlib.aclosing(reply.body) as parts:
            async for part in parts:
                await send({"type": "http.response.body", "body": part, "more_body": True})
    else:
        for part in reply.body:
            await send({"type": "http.response.body", "body": part, "more_body": True})
    await send({"type": "http.response.body", "body": b""})
