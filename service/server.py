"""Runs the application under uvicorn, in this process or in several."""

import importlib.util
import os
import subprocess
import sys
import tempfile
from pathlib import Path

import uvicorn

from levels.catalogue import load
from levels.errors import DataError
from service.settings import Settings

KEEP_ALIVE_SECONDS = 75  # longer than a proxy keeps an idle connection, so that it is the proxy that closes
GRACE_SECONDS = 25


def run(settings: Settings) -> int:
    """Serve until told to stop; returns the exit status."""
    if settings.workers == 1:
        return _serve(settings)
    with tempfile.TemporaryDirectory(prefix="sublevel-metrics-") as folder:
        os.environ["PROMETHEUS_MULTIPROC_DIR"] = folder
        return _serve(settings)


def _audit(overlay: Path) -> None:
    """Print what the audit finds in an overlay that holds; in a process of its own, whose memory no worker keeps."""
    subprocess.run([sys.executable, "-m", "levels.audit", str(overlay)], stdout=sys.stderr, check=False)


def _serve(settings: Settings) -> int:
    if settings.overlay is not None:
        try:
            load(overlay=settings.overlay)
        except DataError as error:
            print(f"sublevel serve: {error}", file=sys.stderr)
            return 2
        _audit(settings.overlay)
    if settings.scheduler is not None and importlib.util.find_spec("distributed") is None:
        print("sublevel serve: SUBLEVEL_SCHEDULER needs the package distributed (group dask)", file=sys.stderr)
        return 2
    uvicorn.run(
        "service.app:build_app",
        factory=True,
        host=settings.host,
        port=settings.port,
        workers=settings.workers,
        access_log=settings.access_log,
        server_header=False,
        ws="none",
        timeout_keep_alive=KEEP_ALIVE_SECONDS,
        timeout_graceful_shutdown=GRACE_SECONDS,
        timeout_worker_healthcheck=30,
    )
    return 0
