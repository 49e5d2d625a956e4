"""Scans on a real server: what is seen while they run, what happens when the client leaves, and a Dask scheduler."""

import json
import os
import signal
import socket
import subprocess
import sys
import time
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import httpx2
import pytest

from tests.service.conftest import ROOT, Server, free_port, start_server, stop_server
from tests.service.scan_bodies import LARGE, SMALL, columns_of, read_lines

SHIFT = "/v1/atoms/87Rb/shift?line=780&lower=2,2&upper=3,3&field=3.2"
TICKS = os.sysconf("SC_CLK_TCK")


def children(pid: int) -> list[int]:
    """The processes that a process started."""
    return [int(number) for number in Path(f"/proc/{pid}/task/{pid}/children").read_text().split()]


def cpu_seconds(pids: list[int]) -> float:
    """Processor time of some processes together."""
    fields = [Path(f"/proc/{pid}/stat").read_text().rpartition(")")[2].split() for pid in pids]
    return sum(int(parts[11]) + int(parts[12]) for parts in fields) / TICKS


def is_alive(pid: int) -> bool:
    try:
        return Path(f"/proc/{pid}/stat").read_text().rpartition(")")[2].split()[0] != "Z"
    except FileNotFoundError:
        return False


def gone_within(pids: list[int], seconds: float) -> bool:
    until = time.monotonic() + seconds
    while any(map(is_alive, pids)) and time.monotonic() < until:
        time.sleep(0.05)
    return not any(map(is_alive, pids))


@pytest.fixture(scope="module")
def warm(server: Server) -> Server:
    """A server whose pool has started."""
    assert httpx2.post(f"{server.url}/v1/scan", json=SMALL, timeout=60).status_code == 200
    return server


def start_large(server: Server) -> socket.socket:
    """A connection on which a large scan was asked for and has begun to arrive."""
    body = json.dumps({**LARGE, "format": "ndjson"}).encode()
    connection = socket.create_connection(("127.0.0.1", server.port), timeout=30)
    head = f"POST /v1/scan HTTP/1.1\r\nHost: x\r\nContent-Type: application/json\r\nContent-Length: {len(body)}\r\n\r\n"
    connection.sendall(head.encode() + body)
    received = b""
    while b'"type":"row"' not in received:
        received += connection.recv(65536)
    return connection


def test_first_line_comes_at_once_and_progress_on_the_way(warm: Server) -> None:
    """The meta line arrives long before the scan is done, and progress counts up to the points of the grid."""
    arrived: list[float] = []
    done: list[int] = []
    began = time.monotonic()
    with httpx2.stream("POST", f"{warm.url}/v1/scan", json={**LARGE, "format": "ndjson"}, timeout=120) as answer:
        assert answer.status_code == 200
        assert answer.headers["x-accel-buffering"] == "no"
        assert answer.headers["cache-control"] == "no-store"
        for line in answer.iter_lines():
            if not line.startswith('{"type":"row"'):
                arrived.append(time.monotonic() - began)
                done.append(json.loads(line).get("done", 0))
            if len(arrived) == 4:
                break
    assert arrived[0] < 1.0 < arrived[3]
    assert 0 == done[0] < done[1] < done[2] < done[3] < 20_000


def test_a_client_that_leaves_ends_its_scan(warm: Server) -> None:
    """Half a minute of work is dropped within two seconds of the connection being closed: the pool falls idle."""
    connection = start_large(warm)
    pool = children(warm.pid)
    busy = cpu_seconds(pool)
    time.sleep(0.5)
    assert cpu_seconds(pool) > busy
    connection.close()
    time.sleep(1.5)
    idle = cpu_seconds(pool)
    time.sleep(1.0)
    assert cpu_seconds(pool) - idle < 0.1
    assert httpx2.post(f"{warm.url}/v1/scan", json=SMALL, timeout=60).status_code == 200


def test_a_client_that_waits_for_json_and_leaves_ends_its_scan_too(warm: Server) -> None:
    """Also where nothing is streamed: a JSON scan that nobody waits for stops."""
    with pytest.raises(httpx2.ReadTimeout):
        httpx2.post(f"{warm.url}/v1/scan", json=LARGE, timeout=1.0)
    pool = children(warm.pid)
    time.sleep(1.5)
    idle = cpu_seconds(pool)
    time.sleep(1.0)
    assert cpu_seconds(pool) - idle < 0.1


def test_places_are_given_back_by_those_who_leave(warm: Server) -> None:
    """However many clients leave their scans, the next ones are not refused as too many."""
    for _ in range(5):
        start_large(warm).close()
        time.sleep(0.3)
    assert httpx2.post(f"{warm.url}/v1/scan", json=SMALL, timeout=60).status_code == 200


def test_look_ups_are_quick_while_a_scan_runs(warm: Server) -> None:
    """A scan runs in other processes: a look-up beside it answers in tens of milliseconds at the median."""
    connection = start_large(warm)
    times = []
    with httpx2.Client(base_url=warm.url) as client:
        for _ in range(40):
            asked = time.perf_counter()
            assert client.get(SHIFT).status_code == 200
            times.append(time.perf_counter() - asked)
    connection.close()
    assert sorted(times)[20] < 0.05


def test_stopping_the_server_ends_the_pool() -> None:
    """SIGTERM ends server and pool, without a complaint; so does a server that is killed outright."""
    for kill in (signal.SIGTERM, signal.SIGKILL):
        process, server = start_server()
        assert httpx2.post(f"{server.url}/v1/scan", json=SMALL, timeout=60).status_code == 200
        pool = children(server.pid)
        assert len(pool) >= 2
        process.send_signal(kill)
        output, _ = process.communicate(timeout=30)
        assert gone_within(pool, 10.0)
        assert b"Traceback" not in output
        assert kill == signal.SIGKILL or b"leaked" not in output


@pytest.fixture(scope="module")
def scheduler() -> Iterator[str]:
    """A Dask scheduler with one worker on this machine."""
    port = free_port()
    address = f"tcp://127.0.0.1:{port}"
    environment = {**os.environ, "PYTHONPATH": str(ROOT), "OPENBLAS_NUM_THREADS": "1"}
    quiet: dict[str, Any] = {
        "cwd": ROOT,
        "env": environment,
        "stdout": subprocess.DEVNULL,
        "stderr": subprocess.DEVNULL,
    }
    dask = [sys.executable, "-m", "distributed.cli.dask_scheduler"]
    worker = [sys.executable, "-m", "distributed.cli.dask_worker"]
    started = [
        subprocess.Popen([*dask, "--host", "127.0.0.1", "--port", str(port), "--no-dashboard"], **quiet),
        subprocess.Popen(
            [*worker, address, "--no-nanny", "--nthreads", "1", "--host", "127.0.0.1", "--no-dashboard"], **quiet
        ),
    ]
    ready = f"from distributed import Client; Client({address!r}, timeout=60).wait_for_workers(1, timeout=60)"
    subprocess.run([sys.executable, "-c", ready], check=True, timeout=120, **quiet)
    yield address
    for one in reversed(started):  # a worker whose scheduler is gone waits for it to come back
        one.kill()
        one.wait(20)


def test_a_scheduler_gives_the_same_bits(warm: Server, scheduler: str) -> None:
    """A server that sends its scans to a Dask scheduler answers exactly what the process pool answers."""
    process, server = start_server(SUBLEVEL_SCHEDULER=scheduler)
    try:
        far = httpx2.post(f"{server.url}/v1/scan", json=SMALL, timeout=60)
        near = httpx2.post(f"{warm.url}/v1/scan", json=SMALL, timeout=60)
        assert far.json() == near.json()
        assert children(server.pid) == []
        streamed = httpx2.post(f"{server.url}/v1/scan", json={**SMALL, "format": "ndjson"}, timeout=60)
        assert columns_of(read_lines(streamed.text)[0]) == near.json()["columns"]
        connection = start_large(server)
        connection.close()
        assert httpx2.post(f"{server.url}/v1/scan", json=SMALL, timeout=60).json() == near.json()
    finally:
        output = stop_server(process).decode()
    assert "Traceback" not in output, output


def test_a_scheduler_that_is_away_is_a_problem() -> None:
    """No scheduler at the address: 503 with a problem that says so, and everything else is answered."""
    process, server = start_server(SUBLEVEL_SCHEDULER=f"tcp://127.0.0.1:{free_port()}")
    try:
        answer = httpx2.post(f"{server.url}/v1/scan", json={**SMALL, "format": "ndjson"}, timeout=60)
        assert (answer.status_code, answer.json()["type"]) == (503, "/problems/scheduler-away")
        assert answer.headers["retry-after"] == "10"
        assert httpx2.get(server.url + SHIFT).status_code == 200
    finally:
        stop_server(process)


def test_a_scheduler_that_is_no_address_stops_the_start() -> None:
    """An address of another kind is told at the start, not at the first scan."""
    with pytest.raises(RuntimeError, match="scheduler"):
        start_server(SUBLEVEL_SCHEDULER="http://127.0.0.1:8786")
