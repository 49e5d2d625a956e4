"""Audit rules on provenance: uncertainties, disagreements, references and the bibliography."""

import json
import re
from collections.abc import Iterator, Mapping
from typing import Any

from levels.audit_spectrum import allowance
from levels.audit_structure import Broken, Species
from levels.audit_values import alternatives_of, values_of
from levels.catalogue import Catalogue
from levels.published import LineFrequency
from levels.quantity import Quantity, frequency_of, in_unit
from levels.schema import DataFile
from levels.units import CANONICAL, UNITS

_DOI = re.compile(r"10\.[0-9]{4,9}/[!-~]*[A-Za-z0-9)>]")
_ARXIV = re.compile(r"arXiv:([0-9]{4}\.[0-9]{4,5}(v[0-9]+)?|[a-z-]+(\.[A-Z]{2})?/[0-9]{7})")
LIBRARY_SOURCES = ("ciddor1996",)  # cited by formulas of the library itself
OVERLAY = "overlay:"


def uncertainty(species: Species, references: Mapping[str, Mapping[str, Any]]) -> Broken:
    """A published value has an uncertainty, or a note of the value or of its publication says why not."""
    for key, value in values_of(species.data):
        quantity = value.quantity()
        explained = value.note or any(references.get(source, {}).get("note") for source in quantity.sources)
        is_whole = key.endswith(".abundance") and in_unit(quantity, "1").value == 1  # the element's only isotope
        if quantity.uncertainty is None and value.evidence != "computed" and not explained and not is_whole:
            yield key, f"{value.value} ({value.source}) has no uncertainty and no note"


def disagreement(species: Species, references: Mapping[str, Mapping[str, Any]]) -> Broken:
    """Where an alternative leaves the recommended value by more than both allow, a note says why it is second."""
    for key, value in values_of(species.data):
        first = _comparable(value.quantity())
        for table in alternatives_of(value):
            if isinstance(table, LineFrequency) and table.medium == "air":
                continue
            other = _comparable(table.quantity())
            is_explained = bool(value.note or table.note) or first.unit != other.unit
            if not is_explained and abs(first.value - other.value) > allowance((first, other)):
                yield key, f"{first.text} against {other.text} without a note"


def _comparable(quantity: Quantity) -> Quantity:
    dimension = UNITS[quantity.unit].dimension
    if dimension in ("wavenumber", "length"):
        return frequency_of(quantity)
    return in_unit(quantity, CANONICAL[dimension])


def sources_of(data: DataFile) -> Iterator[tuple[str, str]]:
    """Every reference key a data file uses, with where."""
    for key, value in values_of(data):
        for table in (value, *alternatives_of(value)):
            for source in table.quantity().sources:
                yield key, source


def known_sources(catalogue: Catalogue) -> Broken:
    """Every source that a value names is in the bibliography."""
    for name, data in catalogue.elements.items():
        for key, source in sources_of(data):
            if source not in catalogue.references and not source.startswith(OVERLAY):
                yield f"{name}: {key}", f"source {source!r} is not in references.json"


def used_references(catalogue: Catalogue) -> Broken:
    """Every reference is used by a value."""
    used = {source for data in catalogue.elements.values() for _, source in sources_of(data)}
    for name in catalogue.references:
        if name not in used and name not in LIBRARY_SOURCES:
            yield f"references: {name}", "no value uses it"


def reference_form(catalogue: Catalogue) -> Broken:
    """A reference has the form of a CSL-JSON item, and DOI and arXiv numbers have their syntax."""
    for name, item in catalogue.references.items():
        where = f"references: {name}"
        if not item.get("type"):
            yield where, "no type"
        if not any(item.get(part) for part in ("author", "editor", "title", "publisher", "DOI", "number", "URL")):
            yield where, "nothing to find it by: no author, title, publisher, DOI or number"
        doi = item.get("DOI")
        if doi is not None and not _DOI.fullmatch(str(doi)):
            yield where, f"DOI {doi!r} does not have the syntax of a DOI"
        number = str(item.get("number", ""))
        if number.casefold().startswith("arxiv") and not _ARXIV.fullmatch(number):
            yield where, f"{number!r} does not have the syntax of an arXiv number"
        year = re.search(r"[a-z](1[89][0-9]{2}|20[0-9]{2})[a-z]?$", name)
        if year and abs(int(year[1]) - _year(item)) > 1:  # preprint and journal may be a year apart
            yield where, f"the key says {year[1]}, the item {_year(item) or 'no year'}"


def _year(item: Mapping[str, Any]) -> int:
    try:
        return int(item["issued"]["date-parts"][0][0])
    except (KeyError, IndexError, TypeError, ValueError):
        return 0


def duplicate_references(catalogue: Catalogue) -> Broken:
    """No publication is in the bibliography twice, by DOI or by journal, volume and page."""
    seen: dict[str, str] = {}
    for name, item in catalogue.references.items():
        marks = [str(item["DOI"]).casefold()] if item.get("DOI") else []
        place = [item.get(part) for part in ("container-title", "volume", "page")]
        if all(place):
            marks.append(json.dumps(place).casefold())
        for mark in marks:
            if seen.setdefault(mark, name) != name:
                yield f"references: {name}", f"is the same publication as {seen[mark]}"
