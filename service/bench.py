"""The pages and their files, served as ready bytes from the service's own origin."""

from collections.abc import Iterable
from pathlib import Path

from starlette.routing import Route

from service.docs import HTML, ready

FILES = Path(__file__).parent / "page"
PAGES = {"/": "index.html", "/scheme": "scheme.html"}
KINDS = {
    ".css": "text/css; charset=utf-8",
    ".js": "text/javascript; charset=utf-8",
    ".svg": "image/svg+xml",
}


def bench_routes() -> list[Route]:
    """The page at the root, that of schemes, and every style, script and drawing below /page."""
    pages = [Route(path, ready((FILES / name).read_text, HTML), name=path) for path, name in PAGES.items()]
    return [*pages, *(_file_route(path) for path in served_files())]


def served_files() -> Iterable[Path]:
    """The files that the page loads; licences and the documentation's own files are not among them."""
    found = sorted(path for path in FILES.rglob("*") if path.suffix in KINDS)
    return [path for path in found if "docs" not in path.relative_to(FILES).parts]


def _file_route(path: Path) -> Route:
    address = f"/page/{path.relative_to(FILES).as_posix()}"
    return Route(address, ready(path.read_text, KINDS[path.suffix]), name=address)
