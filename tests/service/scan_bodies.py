"""What the tests of scans ask, and how they read what comes back."""

import json
from typing import Any

from service.routes.scheme import EXAMPLE

SMALL: dict[str, Any] = {
    **EXAMPLE,
    "axes": [
        {"parameter": "field_magnitude", "values": [0.5, "0.3 mT"]},
        {"parameter": "detuning", "beam": "cooling", "start": -30, "stop": 0, "points": 4},
        {"parameter": "linear", "beam": "repump", "values": [0, 45]},
    ],
    "columns": ["scattering_per_s", "excited", "photons_before_loss"],
}
LARGE: dict[str, Any] = {
    **EXAMPLE,
    "axes": [
        {"parameter": "field_magnitude", "start": 0.1, "stop": 10, "points": 200},
        {"parameter": "detuning", "beam": "cooling", "start": -40, "stop": 0, "points": 100},
    ],
}


def read_lines(text: str) -> tuple[list[dict[str, Any]], list[dict[str, Any]]]:
    """The rows of an NDJSON stream, and its other lines."""
    lines = [json.loads(line) for line in text.splitlines()]
    rows = [{name: cell for name, cell in line.items() if name != "type"} for line in lines if line["type"] == "row"]
    return rows, [line for line in lines if line["type"] != "row"]


def columns_of(rows: list[dict[str, Any]]) -> dict[str, list[Any]]:
    """Rows as columns."""
    return {name: [row[name] for row in rows] for name in rows[0]}
