"""The application in this process, and a real server in one of its own."""

import os
import socket
import subprocess
import sys
import time
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path

import httpx2
import pytest
from starlette.testclient import TestClient

from service.app import Application, build_app
from service.settings import Settings

ROOT = Path(__file__).parents[2]


@dataclass(frozen=True)
class Server:
    """A running server."""

    port: int
    pid: int

    @property
    def url(self) -> str:
        return f"http://127.0.0.1:{self.port}"


def free_port() -> int:
    with socket.socket() as probe:
        probe.bind(("127.0.0.1", 0))
        return int(probe.getsockname()[1])


def start_server(*options: str, **environment: str) -> tuple[subprocess.Popen[bytes], Server]:
    port = free_port()
    command = [sys.executable, "-m", "service.cli", "serve", "--port", str(port), *options]
    process = subprocess.Popen(
        command, cwd=ROOT, env={**os.environ, **environment}, stdout=subprocess.PIPE, stderr=subprocess.STDOUT
    )
    server = Server(port, process.pid)
    until = time.monotonic() + 30
    while time.monotonic() < until and process.poll() is None:
        try:
            if httpx2.get(f"{server.url}/health/ready").status_code == 200:
                return process, server
        except httpx2.TransportError:
            time.sleep(0.02)
    output = stop_server(process).decode()
    raise RuntimeError(f"the server did not become ready: {output}")


def stop_server(process: subprocess.Popen[bytes]) -> bytes:
    """End it as a service manager would; returns what it printed."""
    process.terminate()
    output, _ = process.communicate(timeout=30)
    return output


@pytest.fixture(scope="session")
def server() -> Iterator[Server]:
    """A real server on a free port."""
    process, running = start_server()
    yield running
    stop_server(process)


@pytest.fixture(scope="session")
def app() -> Application:
    """The application; its lifespan runs with `client`."""
    return build_app(Settings())


@pytest.fixture(scope="session")
def client(app: Application) -> Iterator[TestClient]:
    """A client of the application in this process."""
    with TestClient(app, raise_server_exceptions=False) as running:
        yield running
