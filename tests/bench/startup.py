"""(f) What the whole book costs at start against one of its files, and in a worker's memory once all of it was used."""

import statistics
import subprocess
import sys

from tests.bench.measure import report
from tests.bench.processes import free_port, get, resident_megabytes, server

REPEATS = 7
READ = """
import time
from levels import catalogue
paths = {paths}
started = time.perf_counter()
catalogue.load(paths)
print(time.perf_counter() - started)
"""
ONE = "[str(catalogue.DATA / name) for name in ('Rb.toml', 'references.json', 'release.toml')]"
EVERYTHING = (
    "/v1/lines?isotopes=all&limit=5000",
    "/v1/levels?limit=5000",
    "/v1/sources",
    "/v1/release",
    "/v1/book",
    "/v1/book?format=csv",
    "/v1/book.zip",
    "/v1/atoms/87Rb/lines",
    "/v1/atoms/165Ho/levels",
)


def seconds_to_read(paths: str) -> float:
    """The median over fresh processes of the seconds that reading takes, imports apart."""
    command = [sys.executable, "-c", READ.format(paths=paths)]
    return statistics.median(
        float(subprocess.run(command, capture_output=True, text=True, check=True).stdout) for _ in range(REPEATS)
    )


def run() -> None:
    whole, one = seconds_to_read("None"), seconds_to_read(ONE)
    note = f"{1e3 * whole:.0f} ms for all, {1e3 * one:.0f} ms for one file with the bibliography"
    report("(f) whole book at start, beyond one file", f"{whole - one:.2f} s", "0.4 s", note)
    port = free_port()
    with server([sys.executable, "-m", "service.cli", "serve", "--port", str(port)], port) as (pid, _):
        fresh = resident_megabytes(pid)
        for path in EVERYTHING:
            status, _ = get(port, path)
            assert status == 200, path
        for field in range(200):
            get(port, f"/v1/atoms/87Rb/components?line=780&field={field}")
        note = f"{fresh:.0f} MB fresh"
        report("(f) memory of a worker that used all of the book", f"{resident_megabytes(pid):.0f} MB", "180 MB", note)
