"""The way of an answer that is long in the making: rows as they come, with progress, and an end when nobody listens.

NDJSON has one object a line with its `type`: first `meta` (at once), then `row` by row with `progress` between, last
`end`, or `error` with the problem (whose own type is its `problem`). In CSV the same stand on lines that begin with
`#`, before and between the rows. An answer without `end` or `error` was cut off. JSON comes whole, when all is there.
"""

import asyncio
import logging
import time
from collections.abc import AsyncGenerator, AsyncIterator, Mapping
from typing import Any

import numpy as np
import orjson
from starlette.types import Message, Receive, Scope, Send

from service.answers import Answer, basis_of
from service.asking import QuestionRoute, Running, Work, _framing
from service.cache import Reply
from service.formats import JSON, Column, Table, csv_pieces, encode_json, ndjson_pieces
from service.middleware import send_problem
from service.problems import Problem, problem_of
from service.question import Question

LOG = logging.getLogger("sublevel")
PROGRESS_SECONDS = 0.5


def route_of(question: Question) -> QuestionRoute:
    """The route of a question."""
    return QuestionRoute(question) if question.pieces is None else StreamedRoute(question)


class StreamedRoute(QuestionRoute):
    """A question whose table comes in pieces."""

    async def answer(self, scope: Scope, receive: Receive, send: Send) -> None:
        """Answer one request as long as the client is there."""
        running: Running | None = scope["app"].state.running
        if running is None:
            await super().answer(scope, receive, send)
            return
        try:
            with running.scans.admitted():
                await self._while_listened_to(scope, receive, send)
        except Problem as problem:
            await send_problem(problem, scope, send)

    async def _while_listened_to(self, scope: Scope, receive: Receive, send: Send) -> None:
        whole = asyncio.Event()

        async def heard() -> Message:
            message = await receive()
            if message["type"] != "http.request" or not message.get("more_body", False):
                whole.set()
            return message

        answering = asyncio.create_task(super().answer(scope, heard, send))
        leaving = asyncio.create_task(_gone(whole, receive))
        try:
            await asyncio.wait((answering, leaving), return_when=asyncio.FIRST_COMPLETED)
        finally:
            for task in (answering, leaving):
                task.cancel()
            await asyncio.gather(answering, leaving, return_exceptions=True)

    async def _computed(self, work: Work, running: Running, tag: bytes = b"") -> Reply:
        frame = await running.heavy.run(work.answer)
        await running.scans.ready()
        assert self.question.pieces is not None
        pieces = self.question.pieces(running.scans, work.context, work.asked)
        if work.row is JSON:
            return self._written(work, frame._replace(table=await _whole(pieces)), tag)
        headers = (*_framing(tag, work.row), (b"x-accel-buffering", b"no"))
        return Reply(200, headers, _lines(work, frame, pieces), tag)


async def _gone(whole: asyncio.Event, receive: Receive) -> None:
    """Return when the client has left."""
    await whole.wait()
    while (await receive())["type"] != "http.disconnect":
        pass


async def _whole(pieces: AsyncIterator[Table]) -> Table:
    tables = [table async for table in pieces]
    columns: dict[str, Column] = {
        name: _joined([table.columns[name] for table in tables]) for name in tables[0].columns
    }
    missing = {name: reason for table in tables for name, reason in table.missing.items()}
    return Table(columns, missing)


def _joined(parts: list[Column]) -> Column:
    if all(isinstance(part, np.ndarray) for part in parts):
        return np.concatenate(parts)
    return [cell for part in parts for cell in part]


async def _lines(work: Work, frame: Answer, pieces: AsyncIterator[Table]) -> AsyncGenerator[bytes, None]:
    csv = work.row.name == "csv"
    write = _comment if csv else _line
    began = last = time.monotonic()
    points, done = int(frame.content["points"]), 0
    yield write("meta", _meta(work, frame))
    try:
        async for table in pieces:
            parts = list(csv_pieces(table)) if csv else list(ndjson_pieces(_typed(table)))
            yield b"".join(parts if not csv or done == 0 else parts[1:])
            done += table.rows
            now = time.monotonic()
            if now - last > PROGRESS_SECONDS and done < points:
                last = now
                yield write("progress", {"done": done, "points": points, "seconds": round(now - began, 3)})
    except Exception as error:
        problem = problem_of(error)
        if problem.type.status == 500:
            LOG.error("a stream of %s failed", work.question.name, exc_info=error)
        body = orjson.loads(problem.encode(work.question.path, ""))
        yield write("error", {"problem": body.pop("type"), **body})
    else:
        yield write("end", {"done": done, "points": points, "seconds": round(time.monotonic() - began, 3)})


def _meta(work: Work, frame: Answer) -> dict[str, Any]:
    return {
        "query": orjson.Fragment(work.echo),
        **frame.content,
        "warnings": list(frame.warnings),
        "uncertainty_excludes": list(frame.uncertainty_excludes),
        "sources": basis_of(frame.used, work.context.publications).encoded,
        "release": work.context.release,
    }


def _typed(table: Table) -> Table:
    return Table({"type": ["row"] * table.rows, **table.columns})


def _line(kind: str, members: Mapping[str, Any]) -> bytes:
    return encode_json({"type": kind, **members}) + b"\n"


def _comment(kind: str, members: Mapping[str, Any]) -> bytes:
    return b"# " + encode_json({"type": kind, **members}) + b"\r\n"
