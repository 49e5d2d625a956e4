"""(a) `shift` requests per second of one worker against a bare route of the same server with a body of the same size.

Every request asks another field between 0 and 1000 G, so no kept answer serves it. With `wrk` on the path that is the
client, otherwise a small one of our own; server and client sit on different CPUs where there are two.
"""

import os
import pathlib
import re
import shutil
import statistics
import subprocess
import sys
import tempfile
import threading
import time
from http.client import HTTPConnection
from itertools import count

from tests.bench.measure import report
from tests.bench.processes import cpu_seconds, free_port, get, server

PAIRS, SECONDS, CONNECTIONS = 7, 2, 16
LABELS = (("2,2", "3,3"), ("2,0", "3,1"), ("1,-1", "2,0"), ("1,0", "0,0"))
TAIL = " HTTP/1.1\\r\\nHost: bench\\r\\n\\r\\n"
SCRIPT = """\
local starts, tail, vary, k = {%s}, "%s", %s, 0
request = function()
  k = k + 1
  local start = starts[k %% #starts + 1]
  if vary then
    return start .. string.format("%%.5f", (%d + k * 37.77191) %% 1000) .. tail
  end
  return start .. tail
end
"""


def shift_paths() -> list[str]:
    """Paths of a few components, with # where the field goes."""
    return [f"/v1/atoms/87Rb/shift?line=780&lower={low}&upper={up}&field=#" for low, up in LABELS]


def requests_with_wrk(port: int, paths: list[str], start: int, cpu: int | None) -> float:
    """Requests per second by wrk."""
    with tempfile.TemporaryDirectory() as folder:
        script = pathlib.Path(folder, "paths.lua")
        starts = ", ".join(f'"GET {path.removesuffix("#")}"' for path in paths)
        script.write_text(SCRIPT % (starts, TAIL, str(paths[0].endswith("#")).lower(), start))
        command = ["wrk", "-t1", f"-c{CONNECTIONS}", f"-d{SECONDS}s", "-s", str(script), f"http://127.0.0.1:{port}"]
        pin = None if cpu is None else lambda: os.sched_setaffinity(0, {cpu})
        text = subprocess.run(command, capture_output=True, text=True, check=True, preexec_fn=pin).stdout
    if "Non-2xx" in text or "Socket errors" in text:
        raise RuntimeError(text)
    found = re.search(r"Requests/sec:\s+([0-9.]+)", text)
    assert found is not None
    return float(found[1])


def requests_without_wrk(port: int, paths: list[str], start: int) -> float:
    """Requests per second by a few threads of this process, each on one connection."""
    until, numbers, done = time.perf_counter() + SECONDS, count(), []

    def ask() -> None:
        connection, answered = HTTPConnection("127.0.0.1", port), 0
        while time.perf_counter() < until:
            k = next(numbers)
            connection.request("GET", paths[k % len(paths)].replace("#", f"{(start + k * 37.77191) % 1000:.5f}"))
            answer = connection.getresponse()
            answer.read()
            if answer.status != 200:
                raise RuntimeError(f"{answer.status}")
            answered += 1
        connection.close()
        done.append(answered)

    threads = [threading.Thread(target=ask) for _ in range(4)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    return sum(done) / SECONDS


def run() -> None:
    port, apart = free_port(), (os.cpu_count() or 1) > 1
    command = [
        sys.executable, "-m", "uvicorn", "tests.bench.served:build_app", "--factory", "--port", str(port),
        "--no-access-log", "--no-server-header", "--ws", "none", "--log-level", "warning",
    ]  # fmt: skip
    with server(command, port, 0 if apart else None) as (pid, _):
        sizes = [len(get(port, path.replace("#", "345.67891"))[1]) for path in shift_paths()]
        bare = [f"/bare?{round(statistics.mean(sizes))}"]

        def rate(paths: list[str], start: int) -> tuple[float, float]:
            before = cpu_seconds(pid)
            if shutil.which("wrk"):
                per_second = requests_with_wrk(port, paths, start, 1 if apart else None)
            else:
                per_second = requests_without_wrk(port, paths, start)
            return per_second, (cpu_seconds(pid) - before) / (per_second * SECONDS) * 1e6

        rate(shift_paths(), 1)
        pairs = [(rate(shift_paths(), 10 + k), rate(bare, 10 + k)) for k in range(PAIRS)]
    by_clock = statistics.median(ours[0] / floor[0] for ours, floor in pairs)
    by_cpu = statistics.median(floor[1] / ours[1] for ours, floor in pairs)
    ours_rate, ours_cost = (statistics.median(ours[k] for ours, _ in pairs) for k in (0, 1))
    floor_rate, floor_cost = (statistics.median(floor[k] for _, floor in pairs) for k in (0, 1))
    name = f"(a) shift against a bare route, {round(statistics.mean(sizes))} bytes, one worker"
    report(name, f"{by_clock:.2f}", "0.5", f"{ours_rate:.0f} against {floor_rate:.0f} requests/s")
    report("    the same by the server's CPU time", f"{by_cpu:.2f}", "0.5", f"{ours_cost:.0f} and {floor_cost:.0f} us")
