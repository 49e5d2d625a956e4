"""Long computations beside the event loop: a few threads, a bounded queue and a bound on the seconds."""

import asyncio
import contextvars
from collections.abc import Callable
from concurrent.futures import Future, ThreadPoolExecutor
from typing import TypeVar

from service.problems import Problem
from service.settings import Settings

Result = TypeVar("Result")


class HeavyWork:
    """Runs computations of more than a few milliseconds. numpy leaves the event loop running meanwhile."""

    def __init__(self, settings: Settings) -> None:
        self._seconds = settings.max_seconds
        self._bound = settings.heavy_threads + settings.heavy_queue
        self._threads = ThreadPoolExecutor(settings.heavy_threads, thread_name_prefix="heavy")
        self._pending = 0

    async def run(self, compute: Callable[[], Result]) -> Result:
        """The result; a Problem when the queue is full or the seconds are over."""
        if self._pending >= self._bound:
            detail = f"{self._pending} long computations are waiting already"
            raise Problem("busy", detail, given=self._pending, allowed=str(self._bound), headers={"Retry-After": "2"})
        self._pending += 1
        context = contextvars.copy_context()
        future = self._threads.submit(context.run, compute)
        loop = asyncio.get_running_loop()
        future.add_done_callback(lambda done: self._count_down(loop, done))
        try:
            return await asyncio.wait_for(asyncio.shield(asyncio.wrap_future(future)), self._seconds)
        except TimeoutError:
            future.cancel()
            bound = f"{self._seconds:g} s"
            raise Problem("took-too-long", f"the computation took more than {bound}", allowed=bound) from None

    def _count_down(self, loop: asyncio.AbstractEventLoop, _: Future[Result]) -> None:
        if not loop.is_closed():
            loop.call_soon_threadsafe(self._one_less)

    def _one_less(self) -> None:
        self._pending -= 1

    def close(self) -> None:
        """Drop what waits; what runs comes to its bounded end."""
        self._threads.shutdown(wait=False, cancel_futures=True)
