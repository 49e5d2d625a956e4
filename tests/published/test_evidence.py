"""Every `checked` value against what it was compared with: texts, tables and installed nuclear data sets.

Sources stand beside the numbers in `evidence/texts.csv` (citation, year, DOI or arXiv number) and `evidence/tables.csv`
(package, version, file, place in it and the publication that the package takes the number from).
"""

from collections import defaultdict

import pytest

from levels.catalogue import Catalogue, load
from levels.published import Value
from tests.published.ledger import (
    RELATIONS,
    Key,
    Row,
    disagreement,
    every_value,
    nuclear_support,
    rows,
)

SPECIES = sorted(load().elements)
LEDGER: dict[Key, list[Row]] = defaultdict(list)
for _row in rows():
    LEDGER[_row.species, _row.key].append(_row)


def supported(book: Catalogue, species: str, key: str, value: Value) -> bool:
    """Whether a row of the ledgers or an installed data set has this very number."""
    entries = [row for row in LEDGER.get((species, key), ()) if row.relation != "sign"]
    if entries:
        return not any(disagreement(value, row) for row in LEDGER[species, key])
    signs = LEDGER.get((species, key), ())
    return nuclear_support(book.elements[species], key, value) and not any(disagreement(value, row) for row in signs)


@pytest.mark.parametrize("species", SPECIES)
def test_every_checked_value_has_evidence(species: str, book: Catalogue) -> None:
    """A value said to be checked, recommended or alternative, is a number that a text, a table or a data set has."""
    unsupported = [
        f"{key} = {value.value} ({value.source})"
        for key, value in every_value(book.elements[species])
        if value.evidence == "checked" and not supported(book, species, key, value)
    ]
    assert unsupported == []


def test_every_row_of_the_ledgers_is_of_a_value(book: Catalogue) -> None:
    """No row outlives its value, each says one of the known relations, and each agrees with its value."""
    values = {(name, key): value for name, data in book.elements.items() for key, value in every_value(data)}
    assert sorted(key for key in LEDGER if key not in values) == []
    relations = {row.relation.split(" ")[0] for entries in LEDGER.values() for row in entries}
    assert relations <= {relation.split(" ")[0] for relation in RELATIONS}
    wrong = [disagreement(values[key], row) for key, entries in LEDGER.items() for row in entries]
    assert [text for text in wrong if text] == []


def _changed(text: str, place: int, step: int = 1) -> str:
    return text[:place] + str((int(text[place]) + step) % 10) + text[place + 1 :]


def _slips(key: str, text: str) -> list[str]:
    """The text with another last digit, another last digit of its uncertainty, another sign."""
    number = text.partition(" ")[0].partition("e")[0]
    step = 2 if key.endswith(".mass") else 1  # the two data sets round the masses of AME2020 differently, by one
    slips = [_changed(text, len(number.partition("(")[0]) - 1, step)]
    if "(" in number:
        last = max(place for place, character in enumerate(number) if character.isdigit())
        slips.append(_changed(text, last, step))
    return [*slips, text.removeprefix("-") if text.startswith("-") else f"-{text}"]


@pytest.mark.parametrize("species", SPECIES)
def test_a_changed_digit_is_noticed(species: str, book: Catalogue) -> None:
    """Another last digit of any checked value or of its uncertainty, or another sign, loses the support."""
    unnoticed = []
    for key, value in every_value(book.elements[species]):
        if value.evidence != "checked":
            continue
        for text in _slips(key, value.value):
            if value.quantity().value and supported(book, species, key, value.model_copy(update={"value": text})):
                unnoticed.append(f"{key} = {value.value}: {text}")
    assert unnoticed == []
