"""Starts servers, waits until they answer, and reads what they cost from /proc."""

import contextlib
import http.client
import os
import pathlib
import signal
import socket
import subprocess
import tempfile
import time
from collections.abc import Iterator, Sequence

TICKS_PER_SECOND = os.sysconf("SC_CLK_TCK")
PATIENCE_SECONDS = 600  # a first start makes its environment


def free_port() -> int:
    """A port that was free a moment ago."""
    with socket.socket() as sock:
        sock.bind(("127.0.0.1", 0))
        port: int = sock.getsockname()[1]
        return port


def get(port: int, path: str) -> tuple[int, bytes]:
    """One request on a connection of its own: status and body."""
    connection = http.client.HTTPConnection("127.0.0.1", port, timeout=30)
    try:
        connection.request("GET", path)
        answer = connection.getresponse()
        return answer.status, answer.read()
    finally:
        connection.close()


def is_ready(port: int) -> bool:
    """Whether the server says that it is ready."""
    try:
        return get(port, "/health/ready")[0] == 200
    except OSError:
        return False


@contextlib.contextmanager
def server(command: Sequence[str], port: int, cpu: int | None = None) -> Iterator[tuple[int, float]]:
    """Run a server until the block ends; gives its process id and the seconds until it was ready."""
    with tempfile.TemporaryFile(mode="w+") as log:
        started = time.perf_counter()
        process = subprocess.Popen(
            command,
            stdout=log,
            stderr=log,
            env={"OPENBLAS_NUM_THREADS": "1", **os.environ},
            preexec_fn=None if cpu is None else lambda: os.sched_setaffinity(0, {cpu}),
        )
        try:
            while not is_ready(port):
                if process.poll() is not None or time.perf_counter() - started > PATIENCE_SECONDS:
                    log.seek(0)
                    raise RuntimeError(f"{command[0]} did not become ready: {log.read()[-2000:]}")
                time.sleep(0.005)
            yield process.pid, time.perf_counter() - started
        finally:
            process.send_signal(signal.SIGTERM)
            try:
                process.wait(30)
            except subprocess.TimeoutExpired:
                process.kill()


def cpu_seconds(pid: int) -> float:
    """User and system time of a process."""
    fields = pathlib.Path(f"/proc/{pid}/stat").read_text().rpartition(")")[2].split()
    return (int(fields[11]) + int(fields[12])) / TICKS_PER_SECOND


def resident_megabytes(pid: int) -> float:
    """Resident memory of a process in MB (10^6 bytes)."""
    for row in pathlib.Path(f"/proc/{pid}/status").read_text().splitlines():
        if row.startswith("VmRSS:"):
            return int(row.split()[1]) * 1024 / 1e6
    raise RuntimeError(f"no memory of process {pid}")
