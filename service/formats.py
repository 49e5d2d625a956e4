"""Representations of an answer: JSON, CSV and NDJSON from the same columns, their ETags and their negotiation.

Numbers are written as the shortest digits that read back as the same double. NaN and infinity never leave: a column
or scalar that holds one is a fault of the computation and raises `NotFinite`.
"""

import hashlib
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np
import orjson
from numpy.typing import NDArray

from service.problems import Problem

Column = Sequence[Any] | NDArray[Any]
ROWS_AT_ONCE = 4096


class NotFinite(ArithmeticError):
    """A computed number that is not finite."""


@dataclass(frozen=True, slots=True)
class Representation:
    """One row of the table of representations."""

    name: str
    media_type: str
    content_type: bytes
    accepted_as: tuple[str, ...]


REPRESENTATIONS = {
    row.name: row
    for row in (
        Representation("json", "application/json", b"application/json", ("application/json", "text/json")),
        Representation("csv", "text/csv", b"text/csv; charset=utf-8; header=present", ("text/csv",)),
        Representation(
            "ndjson",
            "application/x-ndjson",
            b"application/x-ndjson",
            ("application/x-ndjson", "application/ndjson", "application/jsonl", "application/json-lines"),
        ),
    )
}
JSON = REPRESENTATIONS["json"]


@dataclass(frozen=True, slots=True)
class Table:
    """Named columns of equal length, in wire order; `missing` says why a column holds null."""

    columns: Mapping[str, Column]
    missing: Mapping[str, str] = field(default_factory=dict)

    @property
    def rows(self) -> int:
        """How many rows the table has."""
        return len(next(iter(self.columns.values()))) if self.columns else 0


def with_reasons(columns: Mapping[str, Column], reasons: Mapping[str, str]) -> Table:
    """A table of these columns that gives the reason of every one that holds null."""
    nulls = (name for name, column in columns.items() if not isinstance(column, np.ndarray) and None in column)
    return Table(columns, {name: reasons[name] for name in nulls})


def choose(asked: str | None, accept: str) -> Representation:
    """The representation of an answer: `format` if given, else the best match of the Accept header, else JSON."""
    if asked is not None:
        if asked not in REPRESENTATIONS:
            allowed = ", ".join(REPRESENTATIONS)
            raise Problem(
                "invalid-parameter", f"format: one of {allowed}", parameter="format", given=asked, allowed=allowed
            )
        return REPRESENTATIONS[asked]
    if not accept or accept == "*/*":
        return JSON
    ranked = sorted(_accepted(accept), key=lambda item: -item[0])
    for weight, media_type in ranked:
        for row in REPRESENTATIONS.values():
            if weight > 0 and _matches(media_type, row):
                return row
    allowed = ", ".join(row.media_type for row in REPRESENTATIONS.values())
    raise Problem(
        "not-acceptable", f"none of the accepted media types exists: {allowed} do", given=accept, allowed=allowed
    )


def _accepted(accept: str) -> Iterator[tuple[float, str]]:
    for item in accept.split(","):
        media_type, *parameters = (part.strip().lower() for part in item.split(";"))
        weight = next((part[2:] for part in parameters if part.startswith("q=")), "1")
        try:
            yield float(weight), media_type
        except ValueError:
            yield 0.0, media_type


def _matches(media_type: str, row: Representation) -> bool:
    return media_type in row.accepted_as or (
        media_type in ("*/*", f"{row.media_type.partition('/')[0]}/*") and (row is JSON or media_type != "*/*")
    )


def etag(*parts: bytes) -> bytes:
    """A strong ETag of everything that decides an answer's bytes: release, version, canonical query, representation."""
    return b'"' + hashlib.blake2b(b"\0".join(parts), digest_size=12).hexdigest().encode() + b'"'


def etag_matches(if_none_match: bytes, tag: bytes) -> bool:
    """Whether an If-None-Match header names this ETag (the weak comparison that RFC 9110 wants here)."""
    return any(item.strip().removeprefix(b"W/") == tag for item in if_none_match.split(b","))


def encode_json(value: object) -> bytes:
    """The value as JSON; numpy arrays become arrays of numbers."""
    return orjson.dumps(value, option=orjson.OPT_SERIALIZE_NUMPY)


def check_finite(table: Table) -> None:
    """Refuse a table with a number that is not finite: encoders would turn it silently into null."""
    for name, column in table.columns.items():
        if isinstance(column, np.ndarray):
            bad = column.dtype.kind == "f" and not np.isfinite(column).all()
        else:
            bad = any(isinstance(item, float) and not np.isfinite(item) for item in column)
        if bad:
            raise NotFinite(f"column {name} holds a number that is not finite")


def _dense(column: Column) -> Column:
    if isinstance(column, np.ndarray):
        return column if column.dtype.kind not in "US" else column.tolist()
    return column


def json_pieces(before: Mapping[str, Any], table: Table | None, after: Mapping[str, Any]) -> Iterator[bytes]:
    """The answer as JSON: members before the table, its columns one by one, members after it."""
    if table is None:
        yield encode_json({**before, **after})
        return
    check_finite(table)
    start = encode_json(before)[:-1]
    yield start + (b'"columns":{' if start == b"{" else b',"columns":{')
    for index, (name, column) in enumerate(table.columns.items()):
        yield (b"," if index else b"") + encode_json(name) + b":" + _encode_column(column)
    missing = [{"column": name, "reason": reason} for name, reason in table.missing.items()]
    yield b"}," + encode_json({"missing": missing, **after})[1:]


def _encode_column(column: Column) -> bytes:
    dense = _dense(column)
    return encode_json(np.ascontiguousarray(dense) if isinstance(dense, np.ndarray) else list(dense))


def csv_pieces(table: Table) -> Iterator[bytes]:
    """The table as CSV (RFC 4180): a header of column names, then rows; null is an empty field."""
    check_finite(table)
    yield ",".join(_quoted(name) for name in table.columns).encode() + b"\r\n"
    for cells in _batches(table, _csv_cells):
        yield b"\r\n".join(map(b",".join, zip(*cells, strict=True))) + b"\r\n"


def ndjson_pieces(table: Table) -> Iterator[bytes]:
    """The table as NDJSON: one object with the same keys for each row."""
    check_finite(table)
    template = b"{" + b",".join(encode_json(name).replace(b"%", b"%%") + b":%b" for name in table.columns) + b"}\n"
    for cells in _batches(table, _json_cells):
        yield b"".join(template % row for row in zip(*cells, strict=True))


def _batches(table: Table, cells: Any) -> Iterator[list[list[bytes]]]:
    for start in range(0, table.rows, ROWS_AT_ONCE):
        yield [cells(column[start : start + ROWS_AT_ONCE]) for column in table.columns.values()]


def _number_cells(column: NDArray[Any]) -> list[bytes]:
    return encode_json(np.ascontiguousarray(column))[1:-1].split(b",")


def _json_cells(column: Column) -> list[bytes]:
    dense = _dense(column)
    return _number_cells(dense) if isinstance(dense, np.ndarray) else [encode_json(item) for item in dense]


def _csv_cells(column: Column) -> list[bytes]:
    dense = _dense(column)
    if isinstance(dense, np.ndarray):
        return _number_cells(dense)
    if not all(item is None or isinstance(item, int | float) for item in dense):
        return [_csv_cell(item) for item in dense]
    # one call for the column: a call for each cell leaves the memory of a thread in pieces, tens of megabytes of them
    return [b"" if cell == b"null" else cell for cell in encode_json(list(dense))[1:-1].split(b",")]


def _csv_cell(item: object) -> bytes:
    if item is None:
        return b""
    return _quoted(item).encode() if isinstance(item, str) else encode_json(item)


def _quoted(text: str) -> str:
    if text[:1] in ("=", "@") or any(character in text for character in ',"\r\n'):
        return '"' + text.replace('"', '""') + '"'
    return text
