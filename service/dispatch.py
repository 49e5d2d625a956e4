"""Takes a request to its question by one look-up, past the framework's layers; everything else goes on to them.

The routes are the application's own: what this does not know for certain (another method, another path) it leaves to
the framework, so that the two cannot disagree. A path has at most one part that is a name.
"""

from collections.abc import Iterable

from starlette.applications import Starlette
from starlette.types import ASGIApp, Receive, Scope, Send

from service.asking import QuestionRoute

NAMED = "{}"


class Questions:
    """The questions by path, in front of the framework."""

    def __init__(self, app: ASGIApp, api: Starlette, routes: Iterable[QuestionRoute]) -> None:
        self._app, self._api = app, api
        self._routes: dict[tuple[str, ...], tuple[QuestionRoute, str]] = {}
        self._places: set[int] = set()
        for route in routes:
            parts = route.path.split("/")
            self._places |= {at for at, part in enumerate(parts) if part.startswith("{")}
            key = tuple(NAMED if part.startswith("{") else part for part in parts)
            self._routes[key] = route, "".join(route.question.path_names)

    async def __call__(self, scope: Scope, receive: Receive, send: Send) -> None:
        found = self._find(scope["path"]) if scope["type"] == "http" else None
        if found is None or scope["method"] != found[0].question.method:
            await self._app(scope, receive, send)
            return
        route, path_params = found
        scope["app"], scope["route"], scope["path_params"] = self._api, route, path_params
        await route.answer(scope, receive, send)

    def _find(self, path: str) -> tuple[QuestionRoute, dict[str, str]] | None:
        parts = path.split("/")
        known = self._routes.get(tuple(parts))
        if known is not None and not known[1]:
            return known[0], {}
        for at in self._places:
            if at < len(parts) and parts[at]:
                name, parts[at] = parts[at], NAMED
                known = self._routes.get(tuple(parts))
                if known is not None:
                    return known[0], {known[1]: name}
                parts[at] = name
        return None
