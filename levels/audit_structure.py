"""Audit rules on names, quantum numbers and nuclei: what must hold whatever the numbers are."""

import re
from collections import Counter
from collections.abc import Iterator
from dataclasses import dataclass
from functools import cached_property

from levels.assemble import assemble
from levels.notation import MULTIPOLE_RANK, format_half, parse_feature, parse_half, parse_level, term_quantum_numbers
from levels.records import Atom
from levels.schema import DataFile, LevelTable, LineTable

Broken = Iterator[tuple[str, str]]  # (key in the file, message)
_ORBITALS = "spdfghik"
NOMINAL_RELATIVE = 2e-6  # a nominal wavelength serves names and searches, not tuning
ABUNDANCE_ROUNDING = 2e-4
PARITY_CHANGES = {"E1": True, "M1": False, "E2": False, "M2": True, "E3": True}


@dataclass(frozen=True)
class Species:
    """What a rule is given: one data file and the records made from it."""

    data: DataFile

    @cached_property
    def atoms(self) -> dict[int, Atom]:
        """The records of every isotope."""
        return assemble(self.data)

    @property
    def reference(self) -> Atom:
        """The records of the reference isotope."""
        return self.atoms[self.data.element.reference_isotope]


def parity(species: Species) -> Broken:
    """E1, M2 and E3 change parity; M1, E2 and two equal photons do not."""
    for name, line in species.data.lines.items():
        lower, upper = _ends(species, line)
        must_change = PARITY_CHANGES[line.multipole] and line.photons == 1
        if (lower.parity != upper.parity) != must_change:
            kind = "two-photon" if line.photons == 2 else line.multipole
            yield f"lines.{name}", f"{kind} between {lower.parity} {line.lower} and {upper.parity} {line.upper}"


def multipole(species: Species) -> Broken:
    """|J - J'| <= k <= J + J' for multipole rank k, unless the line is induced; then the rule must forbid it."""
    for name, line in species.data.lines.items():
        low, up = (parse_half(level.J) for level in _ends(species, line))
        rank = 2 * MULTIPOLE_RANK[line.multipole]
        allowed = abs(low - up) <= rank <= low + up and (low + up) % 2 == 0
        if line.photons == 2:  # two dipole photons carry rank 0 or 2
            allowed = abs(low - up) <= 4 and (low + up) % 2 == 0
        if allowed == bool(line.induced):
            states = "is allowed without being induced" if allowed else "is forbidden"
            yield f"lines.{name}", f"{line.multipole} between J = {format_half(low)} and {format_half(up)} {states}"


def _ends(species: Species, line: LineTable) -> tuple[LevelTable, LevelTable]:
    return species.data.levels[line.lower], species.data.levels[line.upper]


def configuration(species: Species) -> Broken:
    """Parity is the sum of the electrons' l, and the name's configuration is the end of the full one."""
    for name, level in species.data.levels.items():
        letters = _electrons(level.configuration)
        if letters is None:
            continue
        even = sum(_ORBITALS.index(letter) for letter in letters) % 2 == 0
        if even != (level.parity == "even"):
            yield f"levels.{name}.parity", f"{level.configuration} is not {level.parity}"
        if not _bare(level.configuration).endswith(_bare(parse_level(name).configuration)):
            yield f"levels.{name}.configuration", f"{level.configuration} does not end as the name does"


def _bare(text: str) -> str:
    return re.sub(r"\([^)]*\)|[^0-9a-z]", "", _without_j(text))


def _without_j(text: str) -> str:
    """A configuration without the j that jj coupling writes behind an orbital: `5d3/2` as `5d`."""
    return re.sub(r"(?<=[a-z])[0-9]+/2", "", text)


def _electrons(text: str) -> list[str] | None:
    """The orbital letter of every electron, or None where the configuration is not spelled out."""
    pieces = [piece for piece in re.split(r"[.\s]+", re.sub(r"\([^)]*\)", ".", _without_j(text))) if piece]
    found = [re.fullmatch(r"[0-9]{1,2}([spdfghik])([0-9]{0,2})", piece) for piece in pieces]
    if not found or None in found:
        return None
    return [match[1] for match in found if match for _ in range(int(match[2] or 1))]


def term(species: Species) -> Broken:
    """J couples from the term's quantum numbers."""
    for name, level in species.data.levels.items():
        if level.coupling == "none":
            continue
        numbers, twice_J = term_quantum_numbers(level.term), parse_half(level.J)
        if level.coupling == "JJ" and "j1" in numbers:
            pair = (numbers["j1"], numbers["j2"])
        elif level.coupling == "JK" and "K" in numbers:
            pair = (numbers["K"], numbers["multiplicity"] - 1)
        elif level.coupling == "LS" and "L" in numbers:
            pair = (numbers["L"], numbers["S"])
        else:
            yield f"levels.{name}.coupling", f"term {level.term} is not written in {level.coupling} coupling"
            continue
        if not abs(pair[0] - pair[1]) <= twice_J <= sum(pair) or (sum(pair) - twice_J) % 2:
            yield f"levels.{name}.term", f"J = {level.J} does not couple from {level.term}"


def line_name(species: Species) -> Broken:
    """A line is named by its vacuum wavelength, rounded or cut to the digits of the name."""
    for name, line in species.data.lines.items():
        last_digit = 10.0 ** -len(name.partition(".")[2])
        if abs(line.nominal_nm - float(name)) > last_digit * (1 + 1e-9):
            yield f"lines.{name}.nominal_nm", f"{line.nominal_nm} nm is not what the name says"


def nominal_wavelength(species: Species) -> Broken:
    """The nominal vacuum wavelength is that of the derived frequency, to its printed digits."""
    for line in species.reference.lines:
        if line.wavelength is None:
            continue
        decimals = len(f"{line.nominal_nm}".removesuffix(".0").partition(".")[2])
        allowed = max(1.1 * 10.0**-decimals, NOMINAL_RELATIVE * line.nominal_nm)
        if abs(line.wavelength.value - line.nominal_nm) > allowed + 2 * (line.wavelength.uncertainty or 0.0):
            message = f"{line.nominal_nm} nm, the frequency gives {line.wavelength.value:.9g}"
            yield f"lines.{line.name}.nominal_nm", message


def order(species: Species) -> Broken:
    """The upper level of a line lies above the lower one."""
    for line in species.reference.lines:
        if line.centroid is not None and line.centroid.value <= 0:
            yield f"lines.{line.name}", f"{line.upper.name} lies below {line.lower.name}"
        elif line.lower.energy and line.upper.energy and line.lower.energy.value >= line.upper.energy.value:
            yield f"lines.{line.name}", f"{line.upper.name} lies below {line.lower.name} by their energies"


def unique_names(species: Species) -> Broken:
    """No two levels and no two lines of a file share a name or an alias."""
    for kind, tables in (("levels", species.data.levels), ("lines", species.data.lines)):
        given = list(tables) + [alias for table in tables.values() for alias in table.aliases]
        for name, count in Counter(given).items():
            if count > 1:
                yield kind, f"{name} names {count} {kind}"


def spin(species: Species) -> Broken:
    """A is odd exactly when I is half-integer; an even-even nucleus has no spin in its ground state."""
    for number, isotope in species.data.isotopes.items():
        twice_I = parse_half(isotope.spin)
        if (twice_I + number) % 2:
            yield f"isotopes.{number}.spin", f"I = {isotope.spin} with mass number {number}"
        elif twice_I and number % 2 == 0 and species.data.element.Z % 2 == 0:
            yield f"isotopes.{number}.spin", f"I = {isotope.spin} in an even-even nucleus"


def mass(species: Species) -> Broken:
    """An atomic mass is within 0.12 u of the mass number (the mass excess of every known nucleus is smaller)."""
    for atom in species.atoms.values():
        isotope = atom.isotope
        if isotope.mass is not None and abs(isotope.mass.value - isotope.mass_number) > 0.12:
            yield f"isotopes.{isotope.mass_number}.mass", f"{isotope.mass.text} for mass number {isotope.mass_number}"


def abundance(species: Species) -> Broken:
    """The abundances of an element sum to one, as published tables make them; a missing isotope shows too."""
    known = [atom.isotope.abundance.value for atom in species.atoms.values() if atom.isotope.abundance]
    if known and abs(sum(known) - 1) > ABUNDANCE_ROUNDING:
        yield "isotopes", f"abundances sum to {sum(known):.5f}"


def hyperfine_numbers(species: Species) -> Broken:
    """A needs I, J > 0, B needs both at least 1, C at least 3/2; F runs from |J - I| to J + I."""
    for name, level in species.data.levels.items():
        for number, table in level.hyperfine.items():
            twice_J, twice_I = parse_half(level.J), parse_half(species.data.isotopes[number].spin)
            key = f"levels.{name}.hyperfine.{number}"
            for constant, least in (("A", 1), ("B", 2), ("C", 3)):
                if getattr(table, constant) is not None and min(twice_J, twice_I) < least:
                    yield f"{key}.{constant}", f"no {constant} with J = {level.J}, I = {format_half(twice_I)}"
            for interval in table.intervals:
                yield from _bad_F(f"{key}.intervals", interval.between, ((twice_J, twice_I), (twice_J, twice_I)))
    for name, line in species.data.lines.items():
        low, up = (parse_half(level.J) for level in _ends(species, line))
        stated = [(entry.isotope, entry.of) for entry in line.frequency]
        stated += [(entry.isotope, entry.of) for entry in line.shift]
        for isotope, of in stated:
            if of not in ("centroid", "average") and isinstance(isotope, int):
                twice_I = parse_half(species.data.isotopes[isotope].spin)
                yield from _bad_F(f"lines.{name}.{isotope}", of, ((low, twice_I), (up, twice_I)))


def _bad_F(key: str, text: str, spins: tuple[tuple[int, int], tuple[int, int]]) -> Broken:
    feature = parse_feature(text)
    for numbers, (twice_J, twice_I) in zip((feature.lower, feature.upper), spins, strict=True):
        for twice_F in numbers:
            if not abs(twice_J - twice_I) <= twice_F <= twice_J + twice_I or (twice_J + twice_I - twice_F) % 2:
                yield key, f"no F = {format_half(twice_F)} with J = {format_half(twice_J)}, I = {format_half(twice_I)}"
