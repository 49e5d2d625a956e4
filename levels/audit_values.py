"""Walks the published values of a data file, each with the key under which it stands."""

from collections.abc import Iterator, Mapping
from typing import Any

from pydantic import BaseModel

from levels.published import Value
from levels.schema import DataFile


def values_of(data: DataFile) -> Iterator[tuple[str, Value]]:
    """Every recommended value with its key; alternatives are reached through `alternatives_of`."""
    yield from _walk(data, "")


def _walk(node: Any, path: str) -> Iterator[tuple[str, Value]]:
    if isinstance(node, Value):
        yield path, node
    elif isinstance(node, BaseModel):
        for name in type(node).model_fields:
            yield from _walk(getattr(node, name), f"{path}.{name}" if path else name)
    elif isinstance(node, Mapping):
        for key, item in node.items():
            yield from _walk(item, f"{path}.{key}")
    elif isinstance(node, tuple):
        for position, item in enumerate(node):
            yield from _walk(item, f"{path}.{_entry_name(item, position)}")


def _entry_name(item: Any, position: int) -> str:
    """A list entry is named by what tells it apart: the isotope and the component, or the two F of an interval."""
    parts = [getattr(item, "isotope", None), getattr(item, "of", ""), getattr(item, "between", "")]
    named = [str(part) for part in parts if part and part != "centroid"]
    return ".".join(named) or str(position)


def alternatives_of(value: Value) -> Iterator[Value]:
    """The alternatives of a value and theirs."""
    for other in value.alternatives:
        yield other
        yield from alternatives_of(other)
