"""Counts how much of each species the catalogue holds and how far its values were compared."""

from collections import Counter
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from levels.audit_values import alternatives_of, values_of
from levels.schema import DataFile


@dataclass(frozen=True, slots=True)
class Tally:
    """How much of a species is in the catalogue and how far it was compared."""

    species: str
    isotopes: int
    levels: int
    lines: int
    values: int
    checked: int
    recalled: int
    computed: int
    alternatives: int
    exceptions: int


def tally(elements: Mapping[str, DataFile]) -> list[Tally]:
    """One row per species: recommended values by evidence, and the alternatives kept beside them."""
    return [_tally(name, data) for name, data in sorted(elements.items())]


def _tally(name: str, data: DataFile) -> Tally:
    values = [value for _, value in values_of(data)]
    evidence = Counter(value.evidence for value in values)
    return Tally(
        species=name,
        isotopes=len(data.isotopes),
        levels=len(data.levels),
        lines=len(data.lines),
        values=len(values),
        checked=evidence["checked"],
        recalled=evidence["recalled"],
        computed=evidence["computed"],
        alternatives=sum(len(list(alternatives_of(value))) for value in values),
        exceptions=len(data.exceptions),
    )


_COLUMNS = ("isotopes", "levels", "lines", "values", "checked", "recalled", "computed", "alternatives", "exceptions")


def format_tally(rows: Sequence[Tally]) -> str:
    """The tally as a table, with a line of sums."""
    table = [["species", *_COLUMNS]]
    table += [[row.species, *(str(getattr(row, column)) for column in _COLUMNS)] for row in rows]
    table.append(["all", *(str(sum(getattr(row, column) for row in rows)) for column in _COLUMNS)])
    widths = [max(len(line[place]) for line in table) for place in range(len(table[0]))]
    return "\n".join("  ".join(cell.rjust(width) for cell, width in zip(line, widths, strict=True)) for line in table)
