"""Which published results are tested, and why the others are not: `coverage.csv`, row by row.

The table lists every derived result that was gathered while the catalogue was made, with the checks that cover it or
the reason why none does. Where the environment variable PUBLISHED_VALUES names the folder of gathered values, the
table is compared with its `checks.csv`; nothing else reads that folder.
"""

import csv
import os
from pathlib import Path

import pytest

from tests.published.checks import CHECKS

KEYS = ("species", "isotope", "level_or_line", "quantity", "value")
ROWS = list(csv.DictReader((Path(__file__).parent / "coverage.csv").read_text(encoding="utf-8").splitlines()))
MODULES = {path.stem for path in Path(__file__).parents[1].glob("*/test_*.py")}
CONCERNED = {"magic_field", "quadratic_zeeman", "linear_zeeman", "clock_frequency", "frequency", "g_I", "g_J", "A_hfs"}


def key(row: dict[str, str]) -> tuple[str, ...]:
    return tuple(row[name] for name in KEYS)


def test_every_row_is_covered_or_says_why_not() -> None:
    """A row has the names of its checks or a reason, never both and never neither; no row stands twice."""
    assert [key(row) for row in ROWS if bool(row["covered_by"]) == bool(row["reason"])] == []
    assert len({key(row) for row in ROWS}) == len(ROWS)


def test_named_checks_exist() -> None:
    """Every check that a row names exists; a name that begins with test_ is a file of tests."""
    known = {check.name for check in CHECKS} | MODULES
    assert {name for row in ROWS for name in row["covered_by"].split()} - known == set()


def test_fields_clocks_and_offsets_are_all_covered() -> None:
    """Of the results on fields, clocks, g factors and offsets, only one is not covered, by the model's own limit."""
    open_rows = [key(row) for row in ROWS if row["quantity"] in CONCERNED and not row["covered_by"]]
    assert open_rows == [("Be+", "9", "2s 2S1/2", "A_hfs", "-625008837.371(11)")]


def test_checks_beyond_the_table_are_intervals_and_slopes_of_level_tables() -> None:
    """Checks that no row asks for are hyperfine intervals and one slope that papers on single levels print."""
    asked = {name for row in ROWS for name in row["covered_by"].split()}
    extra = {check.name for check in CHECKS} - asked
    assert {name for name in extra if not name.startswith("interval-")} == {"stretched-133cs"}


def test_the_table_lists_every_gathered_result() -> None:
    """The table has the rows of the gathered results, no more and no less (where the folder is at hand)."""
    folder = os.environ.get("PUBLISHED_VALUES")
    if not folder:
        pytest.skip("PUBLISHED_VALUES does not name the folder of gathered values")
    gathered = csv.DictReader(Path(folder, "checks.csv").read_text(encoding="utf-8").splitlines())
    assert sorted(map(key, gathered)) == sorted(map(key, ROWS))
