"""Runs a scan in pieces on the server's executor and gives them back in the order of the grid.

Pieces are small, so that progress is seen, a scan that nobody waits for any more ends soon, and several scans share the
executor fairly; and large enough that handing them over costs nothing to speak of.
"""

import asyncio
import contextlib
import time
from collections import deque
from collections.abc import AsyncIterator, Iterable, Iterator
from concurrent.futures import BrokenExecutor
from typing import NamedTuple

from levels.grid import Piece, Scan, solve_points
from service.executors import Executors, Place
from service.problems import Problem
from service.settings import Settings

PIECE_SECONDS = 0.15
PIECES_AHEAD = 3  # for each process
MOST_IN_A_PIECE = 2000
MOST_REBUILDS = 2


class _Sent(NamedTuple):
    start: int
    stop: int
    result: "asyncio.Future[Piece]"


class Scans:
    """Scans at the same time, up to a bound."""

    def __init__(self, settings: Settings) -> None:
        self._seconds, self._bound = settings.max_scan_seconds, settings.scans_at_once
        self._executors = Executors(settings)
        self._running = 0

    @contextlib.contextmanager
    def admitted(self) -> Iterator[None]:
        """Counts one scan while it lasts; a Problem when there are as many as may be."""
        if self._running >= self._bound:
            detail = f"{self._running} scans are running already"
            raise Problem("busy", detail, given=self._running, allowed=str(self._bound), headers={"Retry-After": "5"})
        self._running += 1
        try:
            yield
        finally:
            self._running -= 1

    async def ready(self) -> None:
        """Make sure that there is an executor, before an answer begins."""
        await self._executors.place()

    async def pieces(self, scan: Scan) -> AsyncIterator[Piece]:
        """The pieces of a scan, in the order of the grid."""
        until, rebuilds = time.monotonic() + self._seconds, 0
        place = await self._executors.place()
        sent: deque[_Sent] = deque()
        following, points = 0, 1
        try:
            while sent or following < scan.size:
                try:
                    while following < scan.size and len(sent) < PIECES_AHEAD * place.width:
                        stop = min(following + points, scan.size)
                        sent.append(_submitted(place, scan, following, stop))
                        following = stop
                    piece = await self._awaited(sent[0], until)
                except BrokenExecutor:
                    rebuilds += 1
                    if rebuilds > MOST_REBUILDS:
                        raise
                    self._executors.drop(place)
                    place = await self._executors.place()
                    _forget(sent)
                    sent = deque(_submitted(place, scan, one.start, one.stop) for one in sent)
                    continue
                sent.popleft()
                points = _points(piece, scan.size - following, place.width)
                yield piece
        finally:
            _forget(sent)

    async def _awaited(self, sent: _Sent, until: float) -> Piece:
        try:
            return await asyncio.wait_for(asyncio.shield(sent.result), until - time.monotonic())
        except TimeoutError:
            bound = f"{self._seconds:g} s"
            detail = f"the scan took more than {bound}"
            raise Problem("took-too-long", detail, parameter="axes", allowed=bound) from None
        except asyncio.CancelledError:
            task = asyncio.current_task()
            if sent.result.cancelled() and task is not None and not task.cancelling():
                raise BrokenExecutor("the executor gave a piece up") from None
            raise

    async def close(self) -> None:
        """End the executor."""
        await asyncio.to_thread(self._executors.close)


def _submitted(place: Place, scan: Scan, start: int, stop: int) -> _Sent:
    return _Sent(start, stop, asyncio.wrap_future(place.executor.submit(solve_points, scan, start, stop)))


def _forget(sent: Iterable[_Sent]) -> None:
    """Cancel what is not done; look at what went wrong, so that nobody complains that nobody did."""
    for one in sent:
        if not one.result.cancel() and not one.result.cancelled():
            one.result.exception()


def _points(last: Piece, left: int, width: int) -> int:
    """How many points the next piece has: some tenths of a second's worth, and fewer towards the end."""
    fitting = int(PIECE_SECONDS * last.size / max(last.seconds, 1e-6))
    return max(1, min(fitting, MOST_IN_A_PIECE, -(-left // (2 * width))))
