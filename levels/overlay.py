"""Lays a lab's own values over the packaged ones, value by value, before anything is validated.

An overlay file has the schema of a data file, but any table may be missing or partial. A value table of the overlay
replaces the packaged one; entries of a list (frequencies, shifts, intervals) go first and replace those of the same
isotope and kind. Every value says so in its source: `overlay:<file stem>:<its source, or its key>`.
"""

from collections.abc import Mapping
from typing import Any

Document = dict[str, Any]

_LIST_KEYS = {"frequency": ("isotope", "of"), "shift": ("isotope", "of"), "intervals": ("between",)}
# a key of the overlay that states the same fact as other keys of the packaged table
_REPLACES = {"lifetime": ("width",), "width": ("lifetime",), "intervals": ("A", "B", "C")}


def stamp(node: Any, stem: str, path: tuple[str, ...] = ()) -> Any:
    """The overlay's document with the overlay named as the source of each of its values.

    A value without evidence is the lab's own statement, compared with the lab's own record: `checked`.
    """
    if isinstance(node, list):
        return [stamp(item, stem, (*path, str(position))) for position, item in enumerate(node)]
    if not isinstance(node, Mapping):
        return node
    stamped = {key: stamp(item, stem, (*path, str(key))) for key, item in node.items()}
    if "value" in node:
        stamped["source"] = f"overlay:{stem}:{node.get('source') or '.'.join(path)}"
        stamped.setdefault("evidence", "checked")
    return stamped


def merge(base: Document, over: Document) -> Document:
    """The base document with the overlay's tables and values laid over it; neither is changed."""
    merged = dict(base)
    for key in over:
        for replaced in _REPLACES.get(key, ()):
            if replaced not in over:
                merged.pop(replaced, None)
    for key, item in over.items():
        below = merged.get(key)
        if key in _LIST_KEYS and isinstance(item, list) and isinstance(below, list):
            merged[key] = _merge_list(below, item, _LIST_KEYS[key])
        elif key == "exceptions" and isinstance(item, list) and isinstance(below, list):
            merged[key] = [*below, *item]
        elif isinstance(item, Mapping) and isinstance(below, Mapping) and "value" not in item:
            merged[key] = merge(dict(below), dict(item))
        else:
            merged[key] = item
    return merged


def _merge_list(below: list[Any], above: list[Any], keys: tuple[str, ...]) -> list[Any]:
    def identity(entry: Any) -> Any:
        if not isinstance(entry, Mapping):
            return entry
        return tuple(entry.get(key, "centroid" if key == "of" else None) for key in keys)

    replaced = [identity(entry) for entry in above]
    return [*above, *(entry for entry in below if identity(entry) not in replaced)]
