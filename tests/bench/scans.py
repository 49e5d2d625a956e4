"""(g) A scan of 10,000 points over HTTP against as many single solutions, shared between the cores.

A single solution is the library's, from a finished scheme to its scattering, in this process with nothing else to do.
The scan is asked of a real server whose pool has started, and read to its last line. On a machine with other work the
seconds say little; the note has the processor time of server and pool over that of the single solutions.
"""

import http.client
import json
import pathlib
import statistics
import sys
import time
from typing import Any

from levels.grid import Solver
from levels.pumping import prepare, solve
from service.context import build_context
from service.executors import cores
from service.routes.scan import ScanAsked, job_of
from service.settings import Settings
from tests.bench.measure import report, seconds
from tests.bench.processes import cpu_seconds, free_port, server

ROUNDS = 3
SAMPLE = 200
LIGHT = {"direction": [1, 0, 0], "polarisation": {"linear": 30}}
BODY: dict[str, Any] = {
    "atom": "40Ca+",
    "field": [1, 1, 2],
    "beams": [
        {**LIGHT, "name": "cooling", "line": "397", "detuning": -10, "saturation": 1},
        {**LIGHT, "name": "repump", "line": "866", "detuning": 15, "saturation": 3},
    ],
    "axes": [
        {"parameter": "field_magnitude", "start": 0.1, "stop": 10, "points": 100},
        {"parameter": "detuning", "beam": "cooling", "start": -40, "stop": 0, "points": 100},
    ],
}


def singles() -> tuple[float, float]:
    """Seconds and processor seconds of one solution, over points from all of the grid."""
    job = job_of(build_context(Settings()), ScanAsked.model_validate(BODY))
    solver = Solver(job)
    schemes = [solver.scheme(job.at(point)) for point in range(0, job.size, job.size // SAMPLE)]
    for scheme in schemes[:20]:
        solve(prepare(scheme))
    began = time.process_time()
    single = statistics.median(seconds(lambda s=scheme: solve(prepare(s))) for scheme in schemes)
    return single, (time.process_time() - began) / len(schemes)


def scan(port: int, body: dict[str, Any]) -> int:
    """Ask for a scan and read it; gives how many points came."""
    connection = http.client.HTTPConnection("127.0.0.1", port, timeout=600)
    connection.request(
        "POST", "/v1/scan", json.dumps({**body, "format": "ndjson"}), {"Content-Type": "application/json"}
    )
    answer = connection.getresponse().read()
    connection.close()
    return answer.count(b'{"type":"row"')


def busy_seconds(pid: int) -> float:
    """Processor time of a server and the processes it started."""
    children = pathlib.Path(f"/proc/{pid}/task/{pid}/children").read_text().split()
    return sum(cpu_seconds(int(one)) for one in (pid, *children))


def run() -> None:
    port, points = free_port(), 10_000
    ratios, efforts, wholes = [], [], []
    with server([sys.executable, "-m", "service.cli", "serve", "--port", str(port)], port) as (pid, _):
        scan(port, {**BODY, "axes": [{**BODY["axes"][0], "points": 50}]})
        for _ in range(ROUNDS):
            single, effort = singles()
            before = busy_seconds(pid)
            whole = seconds(lambda: scan(port, BODY))
            ratios.append(whole / (points * single / cores()))
            efforts.append((busy_seconds(pid) - before) / (points * effort))
            wholes.append(whole)
    name = f"(g) scan of {points} points over HTTP, {cores()} cores"
    note = f"{statistics.median(wholes):.1f} s; processor time {statistics.median(efforts):.2f} x"
    report(name, f"{statistics.median(ratios):.2f} x", "1.3 x", note)
