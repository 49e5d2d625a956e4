"""Imports run one way, and importing the library is quick and light."""

import ast
import subprocess
import sys
import time
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[1]
ORDER = (  # inside `levels`: a module may import from any row above its own, and from its own row never
    ("errors", "constants"),
    ("units", "air"),
    ("notation", "quantity"),
    ("records", "angular"),
)
FILE_READERS = {"catalogue", "audit"}
SYMPY_USERS = {"angular", "formulas"}
WEB = {"fastapi", "starlette", "uvicorn", "httpx2", "pydantic_settings", "prometheus_client", "orjson"}


def imports_of(path: Path) -> set[str]:
    """The modules that a file imports, also inside functions."""
    found: set[str] = set()
    for node in ast.walk(ast.parse(path.read_text())):
        if isinstance(node, ast.Import):
            found |= {alias.name for alias in node.names}
        elif isinstance(node, ast.ImportFrom) and node.module:
            found.add(node.module)
            found |= {f"{node.module}.{alias.name}" for alias in node.names}
    return found


def modules(package: str) -> list[Path]:
    return sorted(path for path in (ROOT / package).rglob("*.py") if path.stem != "__init__")


LEVELS = {path.stem: imports_of(path) for path in modules("levels")}


@pytest.mark.parametrize("path", modules("levels"), ids=lambda path: path.stem)
def test_library_knows_no_web(path: Path) -> None:
    """No module of `levels` imports the service or a web package."""
    tops = {name.partition(".")[0] for name in imports_of(path)}
    assert not tops & (WEB | {"service", "tests"})


@pytest.mark.parametrize("name", sorted(LEVELS))
def test_only_the_algebra_imports_sympy(name: str) -> None:
    """Only `angular` and `formulas` import sympy."""
    assert name in SYMPY_USERS or not any(module.partition(".")[0] == "sympy" for module in LEVELS[name])


@pytest.mark.parametrize("name", sorted(LEVELS))
def test_physics_is_given_records(name: str) -> None:
    """Only the catalogue's own modules and the audit import the catalogue; physics is given records."""
    users = {other for other in LEVELS[name] if other.startswith("levels.catalogue")}
    assert not users or name.startswith("audit"), name


def test_library_imports_run_one_way() -> None:
    """There is no cycle among the modules of `levels`, and the lowest rows import nothing above them."""
    graph = {
        name: {
            module.split(".")[1] for module in found if module.startswith("levels.") and module.split(".")[1] in LEVELS
        }
        for name, found in LEVELS.items()
    }
    for height, row in enumerate(ORDER):
        below = {name for lower in ORDER[:height] for name in lower}
        for name in row:
            assert graph[name] <= below, (name, graph[name] - below)
    done: set[str] = set()
    while len(done) < len(graph):
        ready = {name for name, found in graph.items() if name not in done and found <= done}
        assert ready, f"a cycle among {sorted(set(graph) - done)}"
        done |= ready


def test_service_imports_run_one_way() -> None:
    """There is no cycle among the modules of `service`, and none imports the tests."""
    names = {path: ".".join(path.relative_to(ROOT).with_suffix("").parts) for path in modules("service")}
    known = set(names.values())
    graph = {name: imports_of(path) & known - {name} for path, name in names.items()}
    done: set[str] = set()
    while len(done) < len(graph):
        ready = {name for name, found in graph.items() if name not in done and found <= done}
        assert ready, f"a cycle among {sorted(set(graph) - done)}"
        done |= ready


def test_importing_the_library_is_quick_and_light() -> None:
    """`import levels` takes well under a second and pulls in no web package."""
    code = f"import sys, levels; print([name for name in {sorted(WEB)} if name in sys.modules])"
    started = time.perf_counter()
    output = subprocess.run([sys.executable, "-c", code], cwd=ROOT, capture_output=True, text=True, check=True).stdout
    assert output.strip() == "[]"
    assert time.perf_counter() - started < 1.0


def test_importing_everything_of_the_library_pulls_in_no_web_package() -> None:
    """Every module of `levels` together loads no web package, not even through another package."""
    names = ", ".join(f"levels.{name}" for name in sorted(LEVELS))
    code = f"import sys, {names}; print([name for name in {sorted(WEB)} if name in sys.modules])"
    output = subprocess.run([sys.executable, "-c", code], cwd=ROOT, capture_output=True, text=True, check=True).stdout
    assert output.strip() == "[]"
