"""Makes the records of all isotopes of one data file: published values first, what follows from them second.

Rules: a value of the isotope wins over one of the level; a published number wins over a derived one; lifetime and
width, rate and branching fraction are filled in from each other where one is missing.
"""

from dataclasses import replace

from levels.constants import MHZ_PER_WAVENUMBER
from levels.derive import (
    branching_of_rate,
    constants_of_intervals,
    dipole_of_rate,
    g_I_of_moment,
    lande,
    lifetime_of_rate,
    rate_of_branching,
    rate_of_dipole,
    rate_of_oscillator_strength,
)
from levels.frequencies import (
    Centroid,
    Edge,
    edges_of,
    level_energy,
    line_centroids,
    measured_components,
    own_centroids,
)
from levels.notation import MULTIPOLE_RANK, format_isotope, parse_component, parse_half, parse_isotope
from levels.published import Value
from levels.quantity import (
    Quantity,
    in_unit,
    lifetime_of_width,
    wavelength_of,
    wavenumber_of,
    width_of_lifetime,
)
from levels.records import Atom, Isotope, Level, Line
from levels.schema import DataFile, Hyperfine, LevelTable, LineTable

_PHOTONS = {1: "", 2: "two-photon line: the frequency is the sum of both photons, the wavelength that of each"}
_GROUND_ENERGY = Quantity(0.0, 0.0, "cm-1", "0 cm-1", "", "computed", "the ground level")


def _read(table: Value | None, unit: str) -> Quantity | None:
    return None if table is None else in_unit(table.quantity(), unit)


def isotope_record(data: DataFile, mass_number: int) -> Isotope:
    """The nucleus and mass of one isotope; g_I falls back on the tabulated moment."""
    table, element = data.isotopes[mass_number], data.element
    twice_I = parse_half(table.spin)
    moment = _read(table.moment, "muN")
    g_I = _read(table.g_I, "1")
    if g_I is None and moment is not None and twice_I > 0:
        g_I = g_I_of_moment(moment, twice_I)
    return Isotope(
        name=format_isotope(element.symbol, mass_number, element.charge),
        symbol=element.symbol,
        charge=element.charge,
        Z=element.Z,
        mass_number=mass_number,
        twice_I=twice_I,
        ground=element.ground,
        mass=_read(table.mass, "u"),
        abundance=_read(table.abundance, "1"),
        half_life=_read(table.half_life, "s"),
        g_I=g_I,
        moment=moment,
        quadrupole=_read(table.quadrupole, "b"),
    )


def hyperfine_constants(table: Hyperfine, twice_J: int, twice_I: int) -> dict[str, Quantity]:
    """A, B, C in MHz of one level: as published, those missing from the published intervals."""
    published = {name: _read(getattr(table, name), "MHz") for name in ("A", "B", "C")}
    given = {name: quantity for name, quantity in published.items() if quantity is not None}
    intervals = [(*parse_component(item.between, "between"), item.quantity()) for item in table.intervals]
    return {**constants_of_intervals(twice_J, twice_I, intervals, given), **given}


def level_record(data: DataFile, name: str, isotope: Isotope) -> Level:
    """One level of one isotope."""
    table = data.levels[name]
    hyperfine = table.hyperfine.get(isotope.mass_number) or Hyperfine()
    twice_J = parse_half(table.J)
    constants = hyperfine_constants(hyperfine, twice_J, isotope.twice_I)
    tabulated = wavenumber_of(table.energy.quantity()) if table.energy else None
    energy = _GROUND_ENERGY if name == data.element.ground else tabulated
    lifetime, width = _decay(table, hyperfine)
    return Level(
        atom=isotope.name,
        name=name,
        twice_J=twice_J,
        twice_I=isotope.twice_I,
        parity=1 if table.parity == "even" else -1,
        configuration=table.configuration,
        term=table.term,
        coupling=table.coupling,
        aliases=table.aliases,
        g_J=_read(hyperfine.g_J or table.g_J, "1") or lande(name, table.term, table.coupling, twice_J),
        g_I=_read(hyperfine.g_I, "1") or isotope.g_I,
        A=constants.get("A"),
        B=constants.get("B"),
        C=constants.get("C"),
        energy=energy,
        energy_of=str(table.energy.isotope) if table.energy else str(isotope.mass_number) if energy else "",
        lifetime=lifetime,
        width=width,
        notes=tuple(filter(None, (table.note, hyperfine.note))),
    )


def _decay(table: LevelTable, hyperfine: Hyperfine) -> tuple[Quantity | None, Quantity | None]:
    lifetime = _read(hyperfine.lifetime or table.lifetime, "s")
    width = None if hyperfine.lifetime else _read(table.width, "MHz")
    return lifetime or (lifetime_of_width(width) if width else None), width or (
        width_of_lifetime(lifetime) if lifetime else None
    )


def line_record(name: str, table: LineTable, lower: Level, upper: Level, centroid: Centroid | None) -> Line:
    """One line of one isotope, with the rate, branching and dipole element that follow from what is published."""
    frequency = centroid.quantity if centroid else None
    notes = (table.note, table.induced, _PHOTONS[table.photons], centroid.note if centroid else "")
    rate, branching, dipole = _strengths(table, lower, upper, frequency)
    return Line(
        atom=upper.atom,
        name=name,
        lower=lower,
        upper=upper,
        multipole=table.multipole,
        rank=_rank(table, lower, upper),
        aliases=table.aliases,
        nominal_nm=table.nominal_nm,
        photons=table.photons,
        induced=_induced(table, upper),
        centroid=frequency,
        centroid_isotope=centroid.isotope if centroid else "",
        measured=measured_components(table, parse_isotope(upper.atom).mass_number or 0),
        wavelength=wavelength_of(frequency, table.photons) if frequency else None,
        einstein_A=rate,
        branching=branching,
        reduced_dipole=dipole,
        notes=tuple(filter(None, notes)),
    )


def _rank(table: LineTable, lower: Level, upper: Level) -> int:
    """The rank of what drives the line: of its multipole, or of two equal dipole photons, 0 or 2 (never 1).

    Where J allows both, as from J = 1, the scalar part is left out.
    """
    if table.photons == 1:
        return MULTIPOLE_RANK[table.multipole]
    return 2 if lower.twice_J + upper.twice_J >= 4 else 0


def _induced(table: LineTable, upper: Level) -> str:
    if not table.induced:
        return ""
    return "hyperfine" if upper.twice_I else "magnetic field"


def _strengths(
    table: LineTable, lower: Level, upper: Level, frequency: Quantity | None
) -> tuple[Quantity | None, Quantity | None, Quantity | None]:
    """Rate (s-1), branching fraction and reduced dipole element (e a0)."""
    rate, branching = _read(table.einstein_A, "s-1"), _read(table.branching, "1")
    dipole = _read(table.reduced_dipole, "e*a0")
    is_dipole = table.multipole == "E1" and table.photons == 1 and not table.induced
    if frequency is not None and frequency.value <= 0:
        frequency = None  # levels in the wrong order: the audit says so, no rate follows from it
    if rate is None and branching is not None and upper.lifetime is not None:
        rate = rate_of_branching(branching, upper.lifetime)
    if rate is None and is_dipole and frequency is not None:
        if dipole is not None:
            rate = rate_of_dipole(dipole, frequency, upper.twice_J)
        elif table.oscillator_strength is not None:
            strength = table.oscillator_strength.quantity()
            rate = rate_of_oscillator_strength(strength, frequency, lower.twice_J, upper.twice_J)
    if branching is None and rate is not None and upper.lifetime is not None:
        branching = branching_of_rate(rate, upper.lifetime)
    if dipole is None and rate is not None and frequency is not None and is_dipole:
        dipole = dipole_of_rate(rate, frequency, upper.twice_J)
    return rate, branching, dipole


def with_lifetimes_of_lines(data: DataFile, levels: dict[str, Level]) -> dict[str, Level]:
    """Levels without lifetime or width get one from a line that has both rate and branching fraction published."""
    filled = dict(levels)
    for line in data.lines.values():
        upper = filled[line.upper]
        if upper.lifetime is None and line.einstein_A is not None and line.branching is not None:
            lifetime = lifetime_of_rate(line.branching.quantity(), line.einstein_A.quantity())
            filled[line.upper] = replace(upper, lifetime=lifetime, width=width_of_lifetime(lifetime))
    return filled


def with_energies_of_lines(data: DataFile, levels: dict[str, Level], edges: dict[str, list[Edge]]) -> dict[str, Level]:
    """Levels without tabulated energy get what the lines of their isotope, or else the reference isotope, add up to."""
    filled = dict(levels)
    for name, level in levels.items():
        for owner, known in edges.items() if level.energy is None else ():
            energy = level_energy(data, known, name)
            if energy is not None:
                filled[name] = replace(level, energy=energy, energy_of=owner)
                break
    return filled


def with_neighbours(levels: dict[str, Level]) -> dict[str, Level]:
    """Levels told of their fine-structure neighbours: same configuration and LS term, J +- 1, energy known."""
    filled = {}
    for name, level in levels.items():
        near = [other for other in levels.values() if _are_neighbours(level, other)]
        gaps = tuple((other.twice_J, _energy_mhz(other) - _energy_mhz(level)) for other in near)
        filled[name] = replace(level, neighbours=gaps)
    return filled


def _are_neighbours(level: Level, other: Level) -> bool:
    same_term = (level.configuration, level.term, level.parity) == (other.configuration, other.term, other.parity)
    known = level.energy is not None and other.energy is not None
    return same_term and level.coupling == other.coupling == "LS" and known and abs(level.twice_J - other.twice_J) == 2


def _energy_mhz(level: Level) -> float:
    return level.energy.value * MHZ_PER_WAVENUMBER if level.energy else 0.0


def assemble(data: DataFile) -> dict[int, Atom]:
    """Every isotope of a data file with its levels and lines."""
    isotopes = {mass_number: isotope_record(data, mass_number) for mass_number in data.isotopes}
    levels: dict[int | str, dict[str, Level]] = {
        mass_number: with_lifetimes_of_lines(data, {name: level_record(data, name, isotope) for name in data.levels})
        for mass_number, isotope in isotopes.items()
    }
    centroids, own = line_centroids(data, levels), own_centroids(data, levels)
    core, tail, static = (_polarisabilities(data, kind) for kind in ("core", "tail", "static"))
    atoms = {}
    for mass_number, isotope in isotopes.items():
        edges = {str(A): edges_of(data, own, A) for A in (mass_number, data.element.reference_isotope)}
        found = with_neighbours(with_energies_of_lines(data, levels[mass_number], edges))
        lines = tuple(
            line_record(name, line, found[line.lower], found[line.upper], centroids[mass_number].get(name))
            for name, line in data.lines.items()
        )
        atoms[mass_number] = Atom(isotope, tuple(found.values()), lines, core, tail, static)
    return atoms


def _polarisabilities(data: DataFile, kind: str) -> dict[str, Quantity]:
    tables = {name: getattr(table, kind) for name, table in data.polarisability.items()}
    return {name: in_unit(table.quantity(), "a0^3") for name, table in tables.items() if table is not None}
