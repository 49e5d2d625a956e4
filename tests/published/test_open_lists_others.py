"""Gases, lanthanides and metals against open data sets, value by value: the rows of `tests/data/open_lists_others.csv`.

The rows were copied once from the packages that they name: AME2020 masses, NUBASE2020 abundances, Stone's moments
(mendeleev), Morton's resonance lines of 2000 and 2003 (linetools), the NIST compilations of lines (rascal) and the
Atomic Line List v3.00b4 (pyemili). A `checked` value that rests on one of them must agree to its last printed digit.
"""

import csv
from pathlib import Path

import pytest

from levels.audit_values import values_of
from levels.catalogue import load
from levels.published import Value
from levels.quantity import resolution

LISTS = Path(__file__).parents[1] / "data" / "open_lists_others.csv"
ROWS = list(csv.DictReader(LISTS.read_text(encoding="utf-8").splitlines()))
SPECIES = sorted({row["species"] for row in ROWS})


@pytest.fixture(scope="module")
def book() -> dict[str, dict[str, Value]]:
    elements = load().elements
    return {name: dict(values_of(elements[name])) for name in SPECIES}


@pytest.mark.parametrize("species", SPECIES)
def test_values_agree_with_the_open_lists(species: str, book: dict[str, dict[str, Value]]) -> None:
    """Every value copied from an open list is that list's value, to the last digit that the catalogue prints."""
    wrong = []
    for row in ROWS:
        if row["species"] == species:
            given = book[species][row["key"]]
            value = given.quantity().value
            expected = 1e9 / float(row["value"]) if row["key"].endswith(".lifetime") else float(row["value"])
            if row["key"].endswith(".lifetime"):  # the list prints the total rate
                value *= {"ns": 1.0, "us": 1e3, "ms": 1e6}[given.quantity().unit]
                allowed = 1e-3 * expected
            else:
                assert given.quantity().unit == row["unit"]
                allowed = 0.5001 * resolution(given.value)
            if abs(value - expected) > allowed:
                wrong.append((row["key"], given.value, row["value"]))
    assert wrong == []


def test_every_value_said_to_be_of_an_open_list_is_compared(book: dict[str, dict[str, Value]]) -> None:
    """No value of these species claims a list as its checked source without standing in the comparison."""
    lists = {"morton2000", "morton2003", "nistasd", "vanhoof2018", "wang2021"}
    compared = {(row["species"], row["key"]) for row in ROWS}
    unseen = [
        (species, key)
        for species, values in book.items()
        for key, value in values.items()
        if value.evidence == "checked" and value.source in lists and (species, key) not in compared
    ]
    assert unseen == []
