"""(d) From `deploy/serve` to a ready answer with the environment already made, and the memory of its worker."""

import pathlib
import statistics

from tests.bench.measure import report
from tests.bench.processes import free_port, get, resident_megabytes, server

SERVE = str(pathlib.Path(__file__).parents[2] / "deploy" / "serve")
STARTS = 5


def run() -> None:
    port = free_port()
    with server([SERVE, "--port", str(port)], port):
        pass  # makes the environment where there is none
    seconds, resident = [], []
    for _ in range(STARTS):
        port = free_port()
        with server([SERVE, "--port", str(port)], port) as (pid, took):
            seconds.append(took)
            for k in range(200):
                get(port, f"/v1/atoms/87Rb/components?line=780&field={k}")
            resident.append(resident_megabytes(pid))
    report("(d) deploy/serve to ready", f"{statistics.median(seconds):.2f} s", "2.5 s", f"slowest {max(seconds):.2f} s")
    report("(d) memory of the worker after 200 requests", f"{max(resident):.0f} MB", "180 MB")
