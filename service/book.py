"""The whole book as rows, as published: species, isotopes, levels, lines, values and publications; and as one zip.

Nothing here is derived: what the loader works out is in the answers about atoms. The zip's bytes depend on the release
alone: members in a fixed order, with a fixed time.
"""

import io
import zipfile
from collections.abc import Iterator, Mapping
from typing import Any

import orjson

from levels.audit_values import values_of
from levels.catalogue import Catalogue
from levels.notation import parse_half
from levels.published import Value
from levels.schema import DataFile
from service import VERSION
from service.citations import Publication
from service.formats import Table, csv_pieces

Rows = list[dict[str, Any]]
EPOCH = (1980, 1, 1, 0, 0, 0)  # the earliest time a zip can state: the same book has the same bytes
COMPRESSION = 6
CITATION = """\
cff-version: 1.2.0
message: >-
  Cite the publications that stand beside the values you use, and this release for their collection.
title: "Sublevel: levels and lines of laser-cooled atoms with their sources"
type: dataset
authors:
  - name: the Sublevel developers
version: "{release}"
license: MIT
keywords: [atomic physics, laser cooling, hyperfine structure, isotope shifts]
"""
README = """\
Levels and lines of laser-cooled atoms with their sources, release {release}, program {version}.

species.csv       element and charge, ground level, the isotope that isotope shifts count from
isotopes.csv      mass numbers and nuclear spins
levels.csv        configuration, term, J, parity
lines.csv         lower and upper level, multipole, nominal vacuum wavelength in nm
values.csv        every published number: `key` says what it is of, `rank` 0 is the recommended one and 1, 2, ... are
                  alternatives; value and uncertainty (one standard deviation) are in `unit`, `text` has the digits as
                  published; evidence is checked (compared with the publication or an open data set), recalled
                  (entered from memory) or computed (by `formula`)
publications.csv  the publications by the keys that `source` names
references.json   the same as CSL-JSON
CITATION.cff      how to cite this collection

An isotope shift is nu(isotope) - nu(reference isotope). A, B, C and g_I follow
H/h = A I.J + B (quadrupole) + C (octupole) + (muB/h)(g_J J_z + g_I I_z) B.
"""


def species_rows(catalogue: Catalogue) -> Rows:
    """One row for each element and charge."""
    return [
        {
            "species": name,
            "element": data.element.name,
            "symbol": data.element.symbol,
            "charge": data.element.charge,
            "Z": data.element.Z,
            "ground_level": data.element.ground,
            "reference_isotope": data.element.reference_isotope,
        }
        for name, data in _books(catalogue)
    ]


def isotope_rows(catalogue: Catalogue) -> Rows:
    """One row for each isotope."""
    return [
        {"species": name, "mass_number": number, "nuclear_spin": parse_half(table.spin) / 2}
        for name, data in _books(catalogue)
        for number, table in sorted(data.isotopes.items())
    ]


def level_rows(catalogue: Catalogue) -> Rows:
    """One row for each level."""
    return [
        {
            "species": name,
            "level": level,
            "aliases": ", ".join(table.aliases),
            "configuration": table.configuration,
            "term": table.term,
            "coupling": table.coupling,
            "J": parse_half(table.J) / 2,
            "parity": table.parity,
            "note": table.note,
        }
        for name, data in _books(catalogue)
        for level, table in data.levels.items()
    ]


def line_rows(catalogue: Catalogue) -> Rows:
    """One row for each line."""
    return [
        {
            "species": name,
            "line": line,
            "aliases": ", ".join(table.aliases),
            "lower_level": table.lower,
            "upper_level": table.upper,
            "multipole": table.multipole,
            "photons": table.photons,
            "induced": table.induced,
            "nominal_nm": table.nominal_nm,
            "note": table.note,
        }
        for name, data in _books(catalogue)
        for line, table in data.lines.items()
    ]


def value_rows(catalogue: Catalogue) -> Rows:
    """One row for each published value, the recommended one before its alternatives."""
    return [
        _value_row(name, key, rank, value)
        for name, data in _books(catalogue)
        for key, recommended in values_of(data)
        for rank, value in enumerate(_with_alternatives(recommended))
    ]


def publication_rows(publications: Mapping[str, Publication]) -> Rows:
    """One row for each publication."""
    return [{"id": one.id, "citation": one.citation, "doi": one.doi} for one in publications.values()]


def _books(catalogue: Catalogue) -> list[tuple[str, DataFile]]:
    return sorted(catalogue.elements.items(), key=lambda item: (item[1].element.Z, item[1].element.charge))


def _with_alternatives(value: Value) -> Iterator[Value]:
    yield value
    for other in value.alternatives:
        yield from _with_alternatives(other)


def _value_row(species: str, key: str, rank: int, value: Value) -> dict[str, Any]:
    quantity = value.quantity()
    isotope = getattr(value, "isotope", None)
    return {
        "species": species,
        "key": key,
        "rank": rank,
        "value": quantity.value,
        "uncertainty": quantity.uncertainty,
        "unit": quantity.unit,
        "text": quantity.text,
        "isotope": "" if isotope is None else str(isotope),
        "of": value.of,
        "medium": getattr(value, "medium", ""),
        "source": value.source,
        "evidence": value.evidence,
        "formula": value.formula,
        "note": value.note,
    }


def table_of(rows: Rows) -> Table:
    """Rows as columns."""
    return Table({name: [row[name] for row in rows] for name in rows[0]} if rows else {})


def zip_of(catalogue: Catalogue, publications: Mapping[str, Publication]) -> bytes:
    """The book as a zip of CSV files with release, bibliography and citation."""
    tables = {
        "species.csv": species_rows(catalogue),
        "isotopes.csv": isotope_rows(catalogue),
        "levels.csv": level_rows(catalogue),
        "lines.csv": line_rows(catalogue),
        "values.csv": value_rows(catalogue),
        "publications.csv": publication_rows(publications),
    }
    texts = {
        "README.txt": README.format(release=catalogue.release, version=VERSION),
        "CITATION.cff": CITATION.format(release=catalogue.release),
    }
    references = orjson.dumps([dict(one.csl) for one in publications.values()], option=orjson.OPT_INDENT_2)
    members = {
        **{name: text.encode() for name, text in texts.items()},
        **{name: b"".join(csv_pieces(table_of(rows))) for name, rows in tables.items()},
        "references.json": references + b"\n",
    }
    packed = io.BytesIO()
    with zipfile.ZipFile(packed, "w") as archive:
        for name, content in members.items():
            entry = zipfile.ZipInfo(f"sublevel-book/{name}", EPOCH)
            entry.external_attr = 0o644 << 16
            archive.writestr(entry, content, zipfile.ZIP_DEFLATED, COMPRESSION)
    return packed.getvalue()
