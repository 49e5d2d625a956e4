"""The deployment files: pinned and hashed, without addresses, pointing at what the server has."""

import re
import shutil
import subprocess
from pathlib import Path
from typing import Any

import pytest
import yaml
from starlette.testclient import TestClient

from service import VERSION
from tests.service.conftest import ROOT

DEPLOY = ROOT / "deploy"
PINNED = [DEPLOY / "requirements.txt", DEPLOY / "requirements-test.txt"]
MANIFESTS: list[dict[str, Any]] = list(yaml.safe_load_all((DEPLOY / "kubernetes.yaml").read_text()))


@pytest.mark.parametrize("path", PINNED, ids=lambda path: path.name)
def test_packages_are_pinned_and_hashed_without_an_address(path: Path) -> None:
    """Every package has one exact version and hashes, and no index, link or path is named."""
    text = path.read_text()
    assert not re.search(r"^\s*-|https?:|file:|@", text.replace("    --hash", "    hash"), re.MULTILINE)
    for block in re.split(r"\n(?=\S)", text.strip()):
        assert re.match(r"[a-z0-9][a-z0-9._-]*==[0-9][^ ;]*( ;.*)? \\\n", block), block[:80]
        assert "--hash=sha256:" in block


def test_both_lists_pin_the_same_versions() -> None:
    """What is tested is what is served: the test list holds every package of the other in the same version."""
    served, tested = (set(re.findall(r"^(\S+==\S+)", path.read_text(), re.MULTILINE)) for path in PINNED)
    assert served <= tested


def test_pins_fit_the_project() -> None:
    """Every dependency of the project is pinned."""
    import tomllib

    project = tomllib.loads((ROOT / "pyproject.toml").read_text())
    names = [re.split(r"[<>=;\[ ]", item)[0].replace("_", "-").lower() for item in project["project"]["dependencies"]]
    pinned = set(re.findall(r"^(\S+)==", PINNED[0].read_text(), re.MULTILINE))
    assert [name for name in names if name not in pinned] == []
    assert project["project"]["version"] == VERSION


@pytest.mark.parametrize("name", ["serve", "test", "lock", "environment.sh", "../.ci/run"])
def test_scripts_are_valid(name: str) -> None:
    """Every script is valid bash."""
    subprocess.run(["bash", "-n", str(DEPLOY / name)], check=True)


@pytest.mark.parametrize(
    ("with_python", "reason"),
    [(False, "no python3 was found"), (True, "only another version was found")],
)
def test_missing_python_is_said_plainly(tmp_path: Path, with_python: bool, reason: str) -> None:
    """Without a Python, or with one that is too old, `deploy/serve` ends with one line that says so."""
    copy = tmp_path / "deploy"
    copy.mkdir()
    for name in ("serve", "environment.sh", "requirements.txt"):
        shutil.copy(DEPLOY / name, copy / name)
    tools = tmp_path / "bin"
    tools.mkdir()
    for name in ("bash", "dirname", "basename", "cksum", "cat", "mkdir", "rm", "tail"):
        (tools / name).symlink_to(str(shutil.which(name)))
    if with_python:
        (tools / "python3").write_text("#!/usr/bin/env bash\nexit 1\n")
        (tools / "python3").chmod(0o755)
        (tools / "env").symlink_to(str(shutil.which("env")))
    run = subprocess.run(
        [str(tools / "bash"), str(copy / "serve")], env={"PATH": str(tools)}, capture_output=True, text=True
    )
    assert run.returncode == 1
    assert reason in run.stderr
    assert len(run.stderr.splitlines()) == 1


def test_probes_ask_what_is_there(client: TestClient) -> None:
    """The probes of the manifests and of the container ask paths that answer 200."""
    container = MANIFESTS[0]["spec"]["template"]["spec"]["containers"][0]
    paths = [container[probe]["httpGet"]["path"] for probe in ("startupProbe", "readinessProbe", "livenessProbe")]
    paths += re.findall(r"127\.0\.0\.1:8000(/[a-z/]+)", (DEPLOY / "Containerfile").read_text())
    assert len(paths) == 4
    assert {client.get(path).status_code for path in paths} == {200}


def test_manifests_fit_together() -> None:
    """Service and disruption budget select the pods of the deployment; the pod runs without privileges."""
    deployment, service, budget = MANIFESTS
    labels = deployment["spec"]["template"]["metadata"]["labels"]
    assert service["spec"]["selector"] == budget["spec"]["selector"]["matchLabels"] == labels
    pod = deployment["spec"]["template"]["spec"]
    assert pod["securityContext"]["runAsNonRoot"] is True
    assert pod["containers"][0]["securityContext"]["readOnlyRootFilesystem"] is True
    assert pod["containers"][0]["image"].endswith(VERSION)
    assert pod["terminationGracePeriodSeconds"] > 25 + 10  # the server's own grace after the pause before stopping


def test_proxy_bounds_are_the_servers() -> None:
    """The proxy takes bodies as large as the server does, and closes idle connections before the server does."""
    from service.server import KEEP_ALIVE_SECONDS
    from service.settings import Settings

    text = (DEPLOY / "nginx.conf").read_text()
    assert "client_max_body_size 1m;" in text
    assert Settings().max_body_bytes == 1024 * 1024
    idle = re.search(r"keepalive_timeout (\d+)s", text)
    assert idle is not None
    assert int(idle[1]) < KEEP_ALIVE_SECONDS
