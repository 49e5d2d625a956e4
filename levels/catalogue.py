"""Loads, validates and indexes the data; finds isotope, level and line by name; applies a lab's overlay.

The only module of the library that reads files. A catalogue is built once and never changes; the records of a species
are assembled when first asked for and kept.
"""

import hashlib
import json
import re
import tomllib
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field
from functools import cached_property
from importlib.resources import files
from importlib.resources.abc import Traversable
from pathlib import Path
from typing import Any

from levels import overlay as overlays
from levels.assemble import assemble, isotope_record
from levels.errors import DataError, OverlayError, UnknownName
from levels.notation import format_isotope, level_keys, nearest, parse_isotope, parse_line, shown, squeeze
from levels.records import Atom, Isotope, Level, Line
from levels.schema import DataFile, validate

DATA = files("levels") / "data"
_DATA_FILE = re.compile(r"[A-Z][a-z]?([0-9]?\+)?\.toml")
_SHOWN_NEAREST = 6


@dataclass(frozen=True)
class Catalogue:
    """The whole book: one validated data file per species, the bibliography and the release they make up."""

    elements: Mapping[str, DataFile]
    references: Mapping[str, Mapping[str, Any]]
    release: str
    overlaid: tuple[str, ...] = ()
    _atoms: dict[str, dict[int, Atom]] = field(default_factory=dict, repr=False, compare=False)

    def atom(self, name: str) -> Atom:
        """The isotope of a name in any common spelling, with levels and lines; UnknownName names the nearest."""
        species, mass_number = self._locate(name)
        return self.species(species)[mass_number]

    def find_atom(self, name: str) -> Atom:
        """The same as `atom`."""
        return self.atom(name)

    def species(self, name: str) -> Mapping[int, Atom]:
        """All isotopes of a species (`Rb`, `Ca+`) by mass number."""
        if name not in self.elements:
            raise UnknownName("species", shown(name), nearest(name, self.elements))
        if name not in self._atoms:
            self._atoms[name] = assemble(self.elements[name])
        return self._atoms[name]

    def atoms(self) -> tuple[Isotope, ...]:
        """Every isotope, in the order of nuclear charge, ionic charge and mass; no levels are assembled for it."""
        return self._isotopes

    @cached_property
    def _isotopes(self) -> tuple[Isotope, ...]:
        ordered = sorted(self.elements.values(), key=lambda data: (data.element.Z, data.element.charge))
        return tuple(isotope_record(data, number) for data in ordered for number in sorted(data.isotopes))

    @cached_property
    def names(self) -> tuple[str, ...]:
        """The names of every isotope, in the order of `atoms`."""
        return tuple(isotope.name for isotope in self._isotopes)

    def _locate(self, name: str) -> tuple[str, int]:
        try:
            wanted = parse_isotope(name)
        except UnknownName as error:
            raise UnknownName("atom", error.given, nearest(name, self.names), error.hint) from None
        species = format_isotope(wanted.symbol, None, wanted.charge)
        data = self.elements.get(species)
        if data is None:
            same_symbol = [other for other in self.names if parse_isotope(other).symbol == wanted.symbol]
            raise UnknownName("atom", shown(name), (same_symbol or nearest(name, self.names))[:_SHOWN_NEAREST])
        isotopes = sorted(data.isotopes)
        number = isotopes[0] if wanted.mass_number is None and len(isotopes) == 1 else wanted.mass_number
        if number not in data.isotopes:
            hint = "name the isotope" if number is None else ""
            close = sorted(isotopes, key=lambda other: abs(other - (number or data.element.reference_isotope)))
            names = [format_isotope(wanted.symbol, other, wanted.charge) for other in close[:_SHOWN_NEAREST]]
            raise UnknownName("atom", shown(name), names, hint)
        return species, int(number or 0)

    def find_level(self, atom: Atom | str, name: str) -> Level:
        """The level of a name, `5p_2P3/2`, or of a short spelling that fits only one level, `5P3/2` or `3P1`."""
        return find_level(self.atom(atom) if isinstance(atom, str) else atom, name)

    def find_line(self, atom: Atom | str, name: str) -> Line:
        """The line of a wavelength, an alias or a pair of levels."""
        return find_line(self.atom(atom) if isinstance(atom, str) else atom, name)


def find_level(atom: Atom, name: str) -> Level:
    """The level of an atom by its name, an alias, or a short spelling that fits only one level."""
    wanted, squeezed = name.strip().casefold(), squeeze(name)
    by_alias = [level for level in atom.levels if wanted in (alias.casefold() for alias in level.aliases)]
    by_name = [level for level in atom.levels if squeezed in level_keys(level.name)[:2] or level.name == name.strip()]
    short = [level for level in atom.levels if {wanted, squeezed} & set(level_keys(level.name))]
    for found in (by_name, by_alias, short):
        if len(found) == 1:
            return found[0]
        if found:
            names = [level.name for level in found[:_SHOWN_NEAREST]]
            raise UnknownName("level", shown(name), names, f"several levels of {atom.isotope.name} fit")
    raise UnknownName("level", shown(name), _near_levels(atom, name))


def _near_levels(atom: Atom, name: str) -> list[str]:
    names = [level.name for level in atom.levels]
    squeezed = squeeze(name)
    prefixed = [other for other in names if squeezed and squeeze(other).startswith(squeezed[:2])]
    close = [*nearest(name, names, key=squeeze), *prefixed, *names]
    return list(dict.fromkeys(close))[:_SHOWN_NEAREST]


def find_line(atom: Atom, name: str) -> Line:
    """The line of an atom by nominal wavelength (`780`, `780.24`), alias (`D2`) or levels (`5S1/2->5P3/2`).

    A wavelength fits a line that it names, or one whose vacuum wavelength it gives within its last digit.
    """
    wanted = parse_line(name)
    given = (wanted.wavelength or wanted.alias).casefold()
    found = [line for line in atom.lines if line.name == given]
    found = found or [line for line in atom.lines if given in (alias.casefold() for alias in line.aliases)]
    if not found and wanted.wavelength:
        found = _of_wavelength(atom, wanted.wavelength)
    if not found and wanted.levels:
        ends = {find_level(atom, end).name for end in wanted.levels}
        found = [line for line in atom.lines if {line.lower.name, line.upper.name} == ends]
    if len(found) == 1:
        return found[0]
    hint = f"several lines of {atom.isotope.name} fit" if found else ""
    raise UnknownName("line", shown(name), [line.name for line in found] or _near_lines(atom, name), hint)


def _nanometres(line: Line) -> float:
    return line.wavelength.value if line.wavelength else line.nominal_nm


def _of_wavelength(atom: Atom, text: str) -> list[Line]:
    """The lines whose wavelength, rounded or cut to the digits of the text, is the text."""
    last_digit = 10.0 ** -len(text.partition(".")[2])
    return [line for line in atom.lines if -last_digit / 2 <= _nanometres(line) - float(text) < last_digit]


def _near_lines(atom: Atom, name: str) -> list[str]:
    wanted = parse_line(name)
    if wanted.wavelength:
        close = sorted(atom.lines, key=lambda line: abs(_nanometres(line) - float(wanted.wavelength)))
        return [line.name for line in close[:_SHOWN_NEAREST]]
    aliases = {alias: line.name for line in atom.lines for alias in line.aliases}
    return list(dict.fromkeys([*nearest(name, aliases), *(line.name for line in atom.lines)]))[:_SHOWN_NEAREST]


# Reading


def load(paths: Iterable[Path | str] | None = None, overlay: Path | str | None = None) -> Catalogue:
    """Builds a catalogue from data files or directories (the packaged data when None), with an overlay directory.

    A file that does not hold raises DataError, an overlay file OverlayError, naming file, key and reason; in both cases
    there is no catalogue, so nothing is half applied.
    """
    sources = [DATA] if paths is None else [Path(path) for path in paths]
    found = [entry for source in sources for entry in _entries(source)]
    documents: dict[str, dict[str, Any]] = {}
    references: dict[str, Mapping[str, Any]] = {}
    version, digest = "unreleased", hashlib.sha256()
    for entry in sorted(found, key=lambda item: item.name):
        content = entry.read_bytes()
        digest.update(content)
        if entry.name == "references.json":
            references.update(_references(content, entry.name))
        elif entry.name == "release.toml":
            version = str(_parsed(content, entry.name).get("version", version))
        elif entry.name in documents:
            raise DataError(entry.name, "", "two files of this name")
        else:
            documents[entry.name] = _parsed(content, entry.name)
    elements = _validated(documents)
    release = f"{version}+{digest.hexdigest()[:12]}"
    if overlay is None:
        return Catalogue(elements, references, release)
    overlaid, overlay_digest = _overlaid(documents, Path(overlay))
    return Catalogue({**elements, **overlaid}, references, f"{release}.overlay.{overlay_digest}", tuple(overlaid))


def _entries(source: Path | Traversable) -> list[Path | Traversable]:
    if source.is_file():
        return [source]
    if not source.is_dir():
        raise DataError(str(source), "", "no such file or directory")
    special = ("references.json", "release.toml")
    return [entry for entry in source.iterdir() if _DATA_FILE.fullmatch(entry.name) or entry.name in special]


def _parsed(content: bytes, file: str) -> dict[str, Any]:
    try:
        return tomllib.loads(content.decode())
    except (tomllib.TOMLDecodeError, UnicodeDecodeError) as error:
        raise DataError(file, "", f"not TOML: {error}") from None


def _references(content: bytes, file: str) -> dict[str, Mapping[str, Any]]:
    try:
        items = json.loads(content)
        return {str(item["id"]): item for item in items}
    except (ValueError, TypeError, KeyError) as error:
        raise DataError(file, "", f"not a list of CSL-JSON items with an id: {error}") from None


def _validated(documents: Mapping[str, dict[str, Any]]) -> dict[str, DataFile]:
    elements = {}
    for file, document in documents.items():
        data = validate(document, file)
        if file != f"{data.species}.toml":
            raise DataError(file, "element", f"the file of {data.species} is named {data.species}.toml")
        elements[data.species] = data
    return elements


def _overlaid(documents: Mapping[str, dict[str, Any]], directory: Path) -> tuple[dict[str, DataFile], str]:
    """The species an overlay touches, validated after merging, and a digest of the overlay."""
    if not directory.is_dir():
        raise OverlayError(str(directory), "", "no such directory")
    merged = dict(documents)
    digest, touched = hashlib.sha256(), {}
    for path in sorted(directory.glob("*.toml")):
        try:
            content = path.read_bytes()
            digest.update(content)
            document = overlays.stamp(_parsed(content, path.name), path.stem)
            target = f"{_species_of(document, path)}.toml"
            merged[target] = overlays.merge(merged.get(target, {}), document)
            data = validate(merged[target], path.name)
        except DataError as error:
            raise OverlayError(path.name, error.key, error.reason) from None
        except OSError as error:
            raise OverlayError(path.name, "", f"cannot be read: {error.strerror}") from None
        if target != f"{data.species}.toml":
            raise OverlayError(path.name, "element", f"is of {data.species}, not of {target.removesuffix('.toml')}")
        touched[data.species] = data
    return touched, digest.hexdigest()[:12]


def _species_of(document: Mapping[str, Any], path: Path) -> str:
    """The species an overlay file is about: by its [element] table, or by its name."""
    element = document.get("element")
    if isinstance(element, Mapping) and isinstance(element.get("symbol"), str):
        charge = element.get("charge", 0)
        return format_isotope(element["symbol"], None, charge if isinstance(charge, int) else 0)
    if not _DATA_FILE.fullmatch(path.name):
        raise OverlayError(
            path.name, "element", "needs [element] with symbol and charge, or a file name such as Rb.toml"
        )
    return path.stem
