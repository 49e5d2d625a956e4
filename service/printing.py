"""An answer as lines for a terminal: single members, then tables, then what is missing, warnings and sources."""

from collections.abc import Iterator, Mapping, Sequence
from math import floor, log10
from typing import Any

NOTHING = "-"
META = ("query", "columns", "missing", "warnings", "uncertainty_excludes", "sources", "release")


def table_lines(answer: Mapping[str, Any]) -> Iterator[str]:
    """An answer as lines: single members, then its tables under their names, then warnings and sources."""
    own = {name: value for name, value in answer.items() if name not in META}
    tables = {name: table for name, value in own.items() if (table := _table(value)) is not None}
    yield from _aligned(_singles({name: value for name, value in own.items() if name not in tables}))
    if answer.get("columns"):
        yield from _aligned(_rows(answer["columns"]))
    for name, table in tables.items():
        if len(tables) > 1 or answer.get("columns"):
            yield f"{name}:"
        yield from _aligned(table)
    yield from (f"{item['column']}: {item['reason']}" for item in answer.get("missing", ()))
    yield from (f"warning: {text}" for text in answer["warnings"])
    if answer["uncertainty_excludes"]:
        yield f"uncertainties leave out {', '.join(answer['uncertainty_excludes'])}"
    for item in answer["sources"]:
        yield f"source: {item['citation']} ({item['evidence']}): {', '.join(item['used_for'])}"
    yield f"release: {answer['release']}"


def _table(value: Any) -> list[list[str]] | None:
    """Records or columns as a header and rows; None for everything else."""
    if isinstance(value, list) and value and isinstance(value[0], dict):
        return [list(value[0]), *([_cell(cell) for cell in record.values()] for record in value)]
    if isinstance(value, dict) and value and all(isinstance(column, list) for column in value.values()):
        return _rows(value)
    return None


def _rows(columns: Mapping[str, Sequence[Any]]) -> list[list[str]]:
    cells = [
        [_spread(cell) if "uncertainty" in name else _cell(cell) for cell in column] for name, column in columns.items()
    ]
    return [list(columns), *map(list, zip(*cells, strict=True))]


def _singles(members: Mapping[str, Any], of: str = "") -> list[list[str]]:
    """One row for each member, those of a record within under its name."""
    rows = []
    for name, value in members.items():
        if isinstance(value, dict) and "unit" not in value:
            rows += _singles(value, f"{of}{name}.")
        else:
            rows.append([f"{of}{name}", _cell(value)])
    return rows


def _cell(value: Any) -> str:
    if isinstance(value, dict):
        within = (f"{name} {_cell(part)}" for name, part in value.items() if part not in (None, "", []))
        return _quantity(value) if "unit" in value else " ".join(within)
    if isinstance(value, list):
        return ("; " if value and isinstance(value[0], dict) else ", ").join(map(_cell, value))
    if value is None:
        return NOTHING
    if isinstance(value, bool):
        return "yes" if value else "no"
    return f"{value:.12g}" if isinstance(value, float) else str(value)


def _spread(value: Any) -> str:
    return f"{value:.2g}" if isinstance(value, float) else _cell(value)


def _quantity(value: Mapping[str, Any]) -> str:
    number, uncertainty = value["value"], value["uncertainty"]
    if number is None:
        return f"{NOTHING} ({value['reason']})"
    spread = f" ± {uncertainty:.2g}" if uncertainty is not None else ""
    unit = "" if value["unit"] == "1" else f" {value['unit']}"
    return f"{number:.{_digits(number, uncertainty)}g}{spread}{unit}"


def _digits(number: float, uncertainty: float | None) -> int:
    """How many digits a number deserves: down to the second one of its uncertainty."""
    if not number or not uncertainty:
        return 15
    return min(15, max(1, floor(log10(abs(number))) - floor(log10(uncertainty)) + 2))


def _aligned(rows: Sequence[Sequence[str]]) -> Iterator[str]:
    widths = [max(map(len, column)) for column in zip(*rows, strict=True)] if rows else []
    for row in rows:
        yield "  ".join(cell.ljust(width) for cell, width in zip(row, widths, strict=True)).rstrip()
