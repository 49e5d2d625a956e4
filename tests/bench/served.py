"""The service's own application with one bare route more, which returns a constant body."""

from starlette.requests import Request
from starlette.responses import Response
from starlette.routing import Route

from service.app import Application
from service.app import build_app as build_service

BODIES: dict[bytes, bytes] = {}


async def bare(request: Request) -> Response:
    """A constant body of as many bytes as the query string says, made once."""
    query = request.scope["query_string"]
    body = BODIES.get(query)
    if body is None:
        body = BODIES[query] = b"x" * int(query)
    return Response(body, media_type="application/json")


def build_app() -> Application:
    """The application; the bare route comes first, where matching a path costs least."""
    app = build_service()
    app.api.router.routes.insert(0, Route("/bare", bare))
    return app
