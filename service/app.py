"""Builds the application: settings, catalogue, routes, errors and the layers around them."""

import gc
import logging
from collections.abc import AsyncIterator
from contextlib import asynccontextmanager
from functools import cache, partial

from fastapi import FastAPI
from starlette.exceptions import HTTPException
from starlette.middleware.cors import CORSMiddleware
from starlette.requests import Request
from starlette.responses import Response
from starlette.types import ASGIApp, Receive, Scope, Send

from service import VERSION
from service.asking import Running
from service.bench import bench_routes
from service.cache import AnswerCache
from service.context import build_context
from service.dispatch import Questions
from service.docs import docs_routes
from service.metrics import Metrics
from service.middleware import Front
from service.openapi import build_openapi
from service.problems import MEDIA_TYPE, Problem, nearest_names, problem_of
from service.routes import QUESTIONS, book, health
from service.scans import Scans
from service.settings import Settings
from service.streaming import route_of
from service.work import HeavyWork

LOG = logging.getLogger("sublevel")
EXPOSED = ["ETag", "Link", "Retry-After", "X-Request-ID", "Sublevel-Release", "Sublevel-Sources", "Sublevel-Warnings"]
PLAIN_ROUTES = (*health.ROUTES, *book.ROUTES)
DESCRIPTION = """\
The numbers behind an atom, its laser beams and a magnetic field. Every number says its unit, its uncertainty and the
publication it rests on. Frequencies are E/h in MHz and fields in gauss unless a name says otherwise; wavelengths are in
vacuum. Errors are problems (RFC 9457) that say what would do.
"""


class Application:
    """The service as one ASGI application: CORS around the front layer around the questions and FastAPI."""

    def __init__(self, api: FastAPI, layers: ASGIApp) -> None:
        self.api, self._layers = api, layers

    async def __call__(self, scope: Scope, receive: Receive, send: Send) -> None:
        await self._layers(scope, receive, send)


def build_app(settings: Settings | None = None) -> Application:
    """Build the application. The catalogue is read when it starts, not here."""
    settings = settings or Settings()
    metrics = Metrics()

    @asynccontextmanager
    async def lifespan(app: FastAPI) -> AsyncIterator[None]:
        heavy, scans = HeavyWork(settings), Scans(settings)
        app.state.running = Running(build_context(settings), AnswerCache(settings.cache_bytes), heavy, scans)
        gc.collect()
        gc.freeze()  # the catalogue stays: a collection need not walk through it again and again
        yield
        app.state.running = None
        heavy.close()
        await scans.close()

    api = FastAPI(
        title="Sublevel",
        version=VERSION,
        summary="The numbers behind an atom, its laser beams and a magnetic field",
        description=DESCRIPTION,
        lifespan=lifespan,
        openapi_url=None,
        docs_url=None,
        redoc_url=None,
        redirect_slashes=False,
        telemetry={"tracing": False, "metrics": False, "logs": False, "operation_spans": False},
        exception_handlers={HTTPException: answer_http_error, Problem: answer_problem, Exception: answer_error},
    )
    api.state.metrics, api.state.running = metrics, None
    questions = [route_of(question) for question in QUESTIONS]
    api.router.routes.extend(questions)
    api.router.routes.extend(PLAIN_ROUTES)
    document = cache(partial(build_openapi, api, QUESTIONS))
    api.router.routes.extend(docs_routes(document, QUESTIONS))
    api.router.routes.extend(bench_routes())
    api.openapi = document  # type: ignore[method-assign]
    front = Front(Questions(api, api, questions), settings, metrics)
    layers = CORSMiddleware(
        front,
        allow_origins=settings.allow_origins,
        allow_methods=["GET", "HEAD", "POST"],
        allow_headers=["*"],
        expose_headers=EXPOSED,
        max_age=86400,
    )
    return Application(api, layers)


def respond(problem: Problem, request: Request) -> Response:
    """The response that a problem is."""
    body = problem.encode(request.url.path, request.scope.get("request_id", ""))
    headers = {"Cache-Control": "no-store", **problem.headers}
    return Response(body, problem.type.status, headers, media_type=MEDIA_TYPE)


async def answer_problem(request: Request, error: Exception) -> Response:
    """Answer a problem raised outside the questions."""
    return respond(problem_of(error), request)


async def answer_http_error(request: Request, error: Exception) -> Response:
    """Answer what the router refuses: a path that does not exist, a method that a path does not have."""
    assert isinstance(error, HTTPException)
    if error.status_code == 405:
        allowed = (error.headers or {}).get("Allow", "").replace("GET", "GET, HEAD")
        detail = f"{request.url.path} answers {allowed}"
        problem = Problem(
            "method-not-allowed", detail, given=request.method, allowed=allowed, headers={"Allow": allowed}
        )
    elif error.status_code == 404:
        paths = [question.path for question in QUESTIONS] + [route.path for route in PLAIN_ROUTES]
        near = nearest_names(request.url.path, paths)
        problem = Problem("unknown-path", "there is nothing at this path", given=request.url.path, nearest=near)
    else:
        problem = problem_of(error)
    return respond(problem, request)


async def answer_error(request: Request, error: Exception) -> Response:
    """Answer a mistake of ours; the log has it whole, the client only the request's id."""
    LOG.error("request %s to %s failed", request.scope.get("request_id", ""), request.url.path, exc_info=error)
    return respond(problem_of(error), request)
