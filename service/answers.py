"""Shapes answers for the wire: scalars, curated values, sources, and the flat row that CSV makes of a record.

Every record of a kind has the same keys in the same order; a missing value is null with a reason beside it.
"""

import re
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from functools import cached_property
from math import isfinite, isnan
from typing import Any, NamedTuple

import numpy as np
import orjson
from numpy.typing import NDArray

from levels.quantity import Quantity
from service.citations import Publication
from service.formats import Column, NotFinite, Table

NOT_IN_CATALOGUE = "not in the catalogue"
UNSOURCED = "computed"
DOUBTED = "inputs without a stated uncertainty (uncertainty_excludes) could outweigh those with one"


Used = Sequence[tuple[str, Quantity]]  # curated inputs, each with what it was used for


@dataclass(frozen=True)
class Basis(Sequence[tuple[str, Quantity]]):
    """The curated inputs of answers about one thing, with the sources that makes worked out once."""

    used: tuple[tuple[str, Quantity], ...]
    publications: Mapping[str, Publication]

    def __len__(self) -> int:
        return len(self.used)

    def __getitem__(self, at: Any) -> Any:
        return self.used[at]

    @cached_property
    def sources(self) -> list[dict[str, Any]]:
        """One record for each publication and evidence among the inputs."""
        return sources_of(self.used, self.publications)

    @cached_property
    def encoded(self) -> orjson.Fragment:
        """The sources as JSON."""
        return orjson.Fragment(orjson.dumps(self.sources))


def basis_of(used: Used, publications: Mapping[str, Publication]) -> Basis:
    """The inputs with their sources, as they are or made now."""
    return used if isinstance(used, Basis) else Basis(tuple(used), publications)


class Answer(NamedTuple):
    """What a question is answered with: its own members, perhaps a table, and what the numbers rest on.

    `used` has the curated inputs: sources and the refusal of recalled inputs come from it.
    """

    content: Mapping[str, Any]
    table: Table | None = None
    columnar: bool = True  # the table is part of the JSON; records are listed there instead
    used: Used = ()
    warnings: Sequence[str] = ()
    uncertainty_excludes: Sequence[str] = ()


def finite(value: float) -> float:
    """The value, or NotFinite: NaN and infinity never leave."""
    if not isfinite(value):
        raise NotFinite("a computed number is not finite")
    return value


def scalar(value: float | None, uncertainty: float | None, unit: str, reason: str = "") -> dict[str, Any]:
    """A computed number. `reason` says why the value, or failing that its uncertainty, is null."""
    if not ((value is None or isfinite(value)) and (uncertainty is None or isfinite(uncertainty))):
        raise NotFinite("a computed number is not finite")
    return {"value": value, "uncertainty": uncertainty, "unit": unit, "reason": reason}


def uncertain(value: float, uncertainty: float, stated: float, unit: str) -> dict[str, Any]:
    """A computed number whose uncertainty is NaN where an input without a stated one could outweigh the rest."""
    if isnan(uncertainty):
        return scalar(value, None, unit, f"{DOUBTED}; the others make {stated:.2g} {unit}")
    return scalar(value, uncertainty, unit)


def uncertainty_columns(
    columns: Mapping[str, Sequence[float] | NDArray[Any]],
) -> tuple[dict[str, Column], dict[str, str]]:
    """Columns of uncertainties with null for NaN, and the reason for each that has one."""
    arrays = {name: np.asarray(column, dtype=np.float64) for name, column in columns.items()}
    doubted = {name: DOUBTED for name, array in arrays.items() if np.isnan(array).any()}
    written: dict[str, Column] = {
        name: [None if isnan(item) else item for item in array.tolist()] if name in doubted else array
        for name, array in arrays.items()
    }
    return written, doubted


def with_uncertainties(
    columns: Mapping[str, Column], spreads: Iterable[NDArray[Any]]
) -> tuple[dict[str, Column], dict[str, str]]:
    """Each column with that of its uncertainty behind it, and the reason of each uncertainty that has nulls."""
    names = [name.replace("_", "_uncertainty_", 1) for name in columns]
    sigma, doubted = uncertainty_columns(dict(zip(names, spreads, strict=True)))
    pairs = zip(columns.items(), sigma.items(), strict=True)
    return {name: column for pair in pairs for name, column in pair}, doubted


def curated(quantity: Quantity | None, unit: str, reason: str = NOT_IN_CATALOGUE) -> dict[str, Any]:
    """A curated number with the digits as published, where they come from and what others published."""
    if quantity is None:
        empty = {"text": "", "source": "", "evidence": "", "note": ""}
        return {"value": None, "uncertainty": None, "unit": unit, **empty, "alternatives": [], "reason": reason}
    return {
        **_published(quantity),
        "alternatives": [_published(other) for other in quantity.alternatives],
        "reason": "" if quantity.uncertainty is not None else "no uncertainty is stated",
    }


def _published(quantity: Quantity) -> dict[str, Any]:
    return {
        "value": finite(quantity.value),
        "uncertainty": quantity.uncertainty,
        "unit": quantity.unit,
        "text": quantity.text,
        "source": quantity.source,
        "evidence": quantity.evidence,
        "note": quantity.note,
    }


def sources_of(used: Iterable[tuple[str, Quantity]], publications: Mapping[str, Publication]) -> list[dict[str, Any]]:
    """One record for each publication and evidence among the inputs, with what it was used for."""
    records: dict[tuple[str, str, str], dict[str, Any]] = {}
    for purpose, quantity in used:
        for key in quantity.sources or (UNSOURCED,):
            place = (key, quantity.evidence, quantity.note if key == UNSOURCED else "")
            if place not in records:
                records[place] = _source(key, quantity, publications)
            if purpose not in records[place]["used_for"]:
                records[place]["used_for"].append(purpose)
    return list(records.values())


def _source(key: str, quantity: Quantity, publications: Mapping[str, Publication]) -> dict[str, Any]:
    known = publications.get(key)
    if known is None:
        note = "a value of this laboratory's own" if key.startswith("overlay:") else quantity.note
        return {"id": key, "citation": note, "doi": "", "evidence": quantity.evidence, "used_for": []}
    return {"id": key, "citation": known.citation, "doi": known.doi, "evidence": quantity.evidence, "used_for": []}


def records_table(records: Sequence[Mapping[str, Any]]) -> Table:
    """Records as columns: a number's unit moves into its column's name, lists become text."""
    rows = [flat_row(record) for record in records]
    columns: dict[str, Column] = {name: [row.get(name) for row in rows] for row in rows[:1] for name in row}
    return Table(columns)


def flat_row(record: Mapping[str, Any]) -> dict[str, Any]:
    """One record as the cells of one row."""
    row: dict[str, Any] = {}
    for name, value in record.items():
        if isinstance(value, Mapping) and "value" in value and "unit" in value:
            suffix = unit_suffix(str(value["unit"]))
            row[name + suffix] = value["value"]
            row[f"{name}_uncertainty{suffix}"] = value["uncertainty"]
            row.update({f"{name}_{key}": value[key] for key in ("text", "source", "evidence") if key in value})
        elif isinstance(value, Mapping):
            row.update({f"{name}_{key}": cell for key, cell in flat_row(value).items()})
        elif isinstance(value, (list, tuple)):
            row[name] = "; ".join(map(str, value))
        else:
            row[name] = value
    return row


def unit_suffix(unit: str) -> str:
    """The end of a key that names the unit, as an identifier: "MHz/G" is `_MHz_per_G`, "s-1" is `_per_s`."""
    spelt = f"/{unit.removesuffix('-1')}" if unit.endswith("-1") else unit
    words = re.sub(r"[^A-Za-z0-9]+", "_", spelt.replace("/", "_per_").replace("^", "")).strip("_")
    return f"_{words}" if words and words != "1" else ""
