"""Where scans are solved: a pool of processes on this machine, or a Dask scheduler. Both are executors to the rest.

The pool starts with the first scan and is made again when one of its processes was killed. Its processes are spawned,
not forked: a forked child would hold the server's sockets.
"""

import asyncio
import importlib
import multiprocessing
import os
import threading
from collections.abc import Callable
from concurrent.futures import Executor, ProcessPoolExecutor
from typing import Any, NamedTuple

from service import worker
from service.problems import Problem
from service.settings import Settings

CONNECT_SECONDS = 5.0
CLOSE_SECONDS = 5.0


class Place(NamedTuple):
    """An executor, how many pieces it solves at once, and how it is closed."""

    executor: Executor
    width: int
    close: Callable[[], None]


class Executors:
    """Holds the one executor of this server; `place` makes it when it is first needed."""

    def __init__(self, settings: Settings) -> None:
        self._scheduler, self._workers = settings.scheduler, settings.scan_workers or cores()
        self._place: Place | None = None
        self._making = asyncio.Lock()

    async def place(self) -> Place:
        """The executor; a Problem when the scheduler does not answer."""
        async with self._making:
            if self._place is None:
                if self._scheduler is None:
                    self._place = _pool(self._workers)
                else:
                    self._place = await asyncio.to_thread(_dask, self._scheduler)
            return self._place

    def drop(self, place: Place) -> None:
        """Give up an executor that broke; the next one asked for is new."""
        if self._place is place:
            self._place = None
            threading.Thread(target=place.close, daemon=True).start()

    def close(self) -> None:
        """Drop what waits, and wait a little for what runs: a process of the pool that stays ends with this one."""
        place, self._place = self._place, None
        if place is not None:
            closing = threading.Thread(target=place.close, daemon=True)
            closing.start()
            closing.join(CLOSE_SECONDS)


def cores() -> int:
    """How many processors this process may use."""
    return len(os.sched_getaffinity(0)) if hasattr(os, "sched_getaffinity") else os.cpu_count() or 1


def _pool(workers: int) -> Place:
    for name in worker.FEW_THREADS:  # children read it when they import numpy: pieces are the parallel part, not BLAS
        os.environ.setdefault(name, "1")
    spawn = multiprocessing.get_context("spawn")
    pool = ProcessPoolExecutor(workers, mp_context=spawn, initializer=worker.start)
    return Place(pool, workers, lambda: pool.shutdown(wait=True, cancel_futures=True))


def _dask(address: str) -> Place:
    distributed: Any = importlib.import_module("distributed")
    try:
        client = distributed.Client(address, timeout=CONNECT_SECONDS, set_as_default=False)
        width = sum(client.nthreads().values())
    except (OSError, TimeoutError, ValueError) as error:
        raise _away(address, str(error)) from error
    if width == 0:
        client.close()
        raise _away(address, "it has no workers")
    return Place(client.get_executor(pure=False), width, client.close)  # else equal pieces of two scans were one


def _away(address: str, why: str) -> Problem:
    detail = f"the scheduler at {address} cannot be used: {why}"
    return Problem("scheduler-away", detail, parameter="SUBLEVEL_SCHEDULER", headers={"Retry-After": "10"})
