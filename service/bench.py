"""The bench page and its files, served as ready bytes from the service's own origin."""

from collections.abc import Iterable
from pathlib import Path

from starlette.routing import Route

from service.docs import HTML, ready

FILES = Path(__file__).parent / "page"
KINDS = {
    ".css": "text/css; charset=utf-8",
    ".js": "text/javascript; charset=utf-8",
    ".svg": "image/svg+xml",
}


def bench_routes() -> list[Route]:
    """The page at the root, and every style, script and drawing below /page."""
    pages = [Route("/", ready((FILES / "index.html").read_text, HTML), name="bench")]
    return [*pages, *(_file_route(path) for path in served_files())]


def served_files() -> Iterable[Path]:
    """The files that the page loads; licences and the documentation's own files are not among them."""
    found = sorted(path for path in FILES.rglob("*") if path.suffix in KINDS)
    return [path for path in found if "docs" not in path.relative_to(FILES).parts]


def _file_route(path: Path) -> Route:
    address = f"/page/{path.relative_to(FILES).as_posix()}"
    return Route(address, ready(path.read_text, KINDS[path.suffix]), name=address)
