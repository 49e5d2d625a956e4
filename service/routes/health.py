"""Whether the server lives, whether it is ready, and what it measured: none of these waits for anything."""

from starlette.requests import Request
from starlette.responses import JSONResponse, Response
from starlette.routing import Route

from service.metrics import CONTENT_TYPE
from service.problems import Problem

NO_STORE = {"Cache-Control": "no-store"}


async def live(request: Request) -> Response:
    """The process answers."""
    return JSONResponse({"status": "live"}, headers=NO_STORE)


async def ready(request: Request) -> Response:
    """The catalogue is loaded and questions are answered."""
    running = request.app.state.running
    if running is None:
        raise Problem("not-ready", "the catalogue is not loaded", headers={"Retry-After": "1"})
    return JSONResponse({"status": "ready", "release": running.context.release}, headers=NO_STORE)


async def metrics(request: Request) -> Response:
    """Prometheus text."""
    return Response(request.app.state.metrics.render(), headers={**NO_STORE, "Content-Type": CONTENT_TYPE})


ROUTES = (
    Route("/health/live", live, name="live"),
    Route("/health/ready", ready, name="ready"),
    Route("/metrics", metrics, name="metrics"),
)
