"""Answers already given, as ready bytes: a release's answers never change, so a repeated question costs nothing."""

from collections import OrderedDict
from collections.abc import AsyncGenerator, Iterator
from typing import NamedTuple

Key = tuple[str, bytes, bytes]


Headers = tuple[tuple[bytes, bytes], ...]


class Reply(NamedTuple):
    """An answer as it goes over the wire; a body in pieces is sent as it is written."""

    status: int
    headers: Headers
    body: bytes | Iterator[bytes] | AsyncGenerator[bytes, None] = b""
    tag: bytes = b""


class AnswerCache:
    """The most recently used answers, bounded by the bytes of their bodies and keys."""

    def __init__(self, bytes_allowed: int) -> None:
        self._allowed, self._held = bytes_allowed, 0
        self._answers: OrderedDict[Key, Reply] = OrderedDict()

    def get(self, key: Key) -> Reply | None:
        """The answer to this very request, if it is still held."""
        reply = self._answers.get(key)
        if reply is not None:
            self._answers.move_to_end(key)
        return reply

    def put(self, key: Key, reply: Reply) -> None:
        """Hold an answer; the least recently used ones make room. One that would fill an eighth is not held."""
        size = _size(key, reply)
        if size * 8 > self._allowed or key in self._answers:
            return
        self._answers[key] = reply
        self._held += size
        while self._held > self._allowed:
            old_key, old = self._answers.popitem(last=False)
            self._held -= _size(old_key, old)

    @property
    def held_bytes(self) -> int:
        """How much is held."""
        return self._held


def _size(key: Key, reply: Reply) -> int:
    body = len(reply.body) if isinstance(reply.body, bytes) else 0
    return len(key[0]) + len(key[1]) + len(key[2]) + body + 512
