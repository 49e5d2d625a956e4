"""What happens to every request, as one pure ASGI layer: bounds, request id, security headers, measurements, HEAD.

It stands outside the application, so that errors raised anywhere inside carry the same headers; CORS stands outside it.
"""

import itertools
import os
import re
import time

from starlette.types import ASGIApp, Message, Receive, Scope, Send

from service.metrics import UNMATCHED, Metrics
from service.problems import MEDIA_TYPE, Problem
from service.settings import Settings

API_POLICY = b"default-src 'none'; frame-ancestors 'none'"
PAGE_POLICY = (
    b"default-src 'none'; script-src 'self'; style-src 'self'; img-src 'self' data:; connect-src 'self'; "
    b"base-uri 'none'; form-action 'self'; frame-ancestors 'none'"
)
FIXED = [
    (b"x-content-type-options", b"nosniff"),
    (b"referrer-policy", b"no-referrer"),
    (b"cross-origin-opener-policy", b"same-origin"),
]
DRAINED_BYTES = 16_777_216
_REQUEST_ID = re.compile(rb"[A-Za-z0-9._-]{1,64}", re.ASCII)


class Front:
    """The outer layer of the application."""

    def __init__(self, app: ASGIApp, settings: Settings, metrics: Metrics) -> None:
        self._app, self._settings, self._metrics = app, settings, metrics
        self._prefix, self._numbers = os.urandom(6).hex(), itertools.count()

    async def __call__(self, scope: Scope, receive: Receive, send: Send) -> None:
        if scope["type"] != "http":
            await self._app(scope, receive, send)
            return
        started, method = time.perf_counter(), scope["method"]
        inner = dict(scope, method="GET") if method == "HEAD" else scope
        length, own_id = _read_headers(scope)
        request_id = own_id or f"{self._prefix}-{next(self._numbers):x}".encode()
        inner["request_id"] = request_id.decode()
        extra = [(b"x-request-id", request_id), *FIXED]
        status = 500

        async def send_framed(message: Message) -> None:
            nonlocal status
            if message["type"] == "http.response.start":
                status = message["status"]
                headers = [*message.get("headers", ()), *extra]
                if not any(name == b"content-security-policy" for name, _ in headers):
                    headers.append((b"content-security-policy", API_POLICY))
                message = {"type": "http.response.start", "status": status, "headers": headers}
            elif method == "HEAD" and message["type"] == "http.response.body":
                message = {"type": "http.response.body", "body": b"", "more_body": message.get("more_body", False)}
            await send(message)

        try:
            refusal = self._refusal(scope, length)
            if refusal is None:
                await self._app(inner, receive, send_framed)
            else:
                await _drain(receive, length)
                await send_problem(refusal, inner, send_framed)
        finally:
            route = getattr(inner.get("route"), "path", UNMATCHED)
            self._metrics.count(route, method, status, time.perf_counter() - started)

    def _refusal(self, scope: Scope, length: bytes) -> Problem | None:
        url_bytes = len(scope.get("raw_path") or b"") + len(scope["query_string"])
        if url_bytes > self._settings.max_url_bytes:
            bound = f"{self._settings.max_url_bytes} bytes"
            return Problem("url-too-long", f"path and query are longer than {bound}", given=url_bytes, allowed=bound)
        if length and (not length.isdigit() or len(length) > 15 or int(length) > self._settings.max_body_bytes):
            return body_too_large(self._settings.max_body_bytes, length.decode("latin-1"))
        return None


def body_too_large(bound: int, given: object) -> Problem:
    """The problem of a body that is larger than allowed."""
    allowed = f"{bound} bytes"
    return Problem("body-too-large", f"the body is larger than {allowed}", given=given, allowed=allowed)


def _read_headers(scope: Scope) -> tuple[bytes, bytes]:
    length = request_id = b""
    for name, value in scope["headers"]:
        if name == b"content-length":
            length = value
        elif name == b"x-request-id" and _REQUEST_ID.fullmatch(value):
            request_id = value
    return length, request_id


async def _drain(receive: Receive, length: bytes) -> None:
    """Read a refused body of bearable size: a client that is still sending would see a reset instead of the answer."""
    if not length.isdigit() or len(length) > 15 or int(length) > DRAINED_BYTES:
        return
    more = True
    while more:
        message = await receive()
        more = message["type"] == "http.request" and message.get("more_body", False)


async def send_problem(problem: Problem, scope: Scope, send: Send) -> None:
    """Answer with a problem."""
    body = problem.encode(scope["path"], scope.get("request_id", ""))
    headers = [
        (b"content-type", MEDIA_TYPE.encode()),
        (b"content-length", str(len(body)).encode()),
        (b"cache-control", b"no-store"),
        *((name.lower().encode(), value.encode()) for name, value in problem.headers.items()),
    ]
    await send({"type": "http.response.start", "status": problem.type.status, "headers": headers})
    await send({"type": "http.response.body", "body": body})
