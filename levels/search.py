"""Finds lines and levels over many atoms: by what they are and by how near a line lies to what a laser can reach.

A line is placed by the laser's photon: the vacuum wavelength of each photon, for a two-photon line that of half the
sum. A line without published frequency is placed by its nominal wavelength. Air wavelengths exist where the dispersion
of air is known (`air`).
"""

from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass
from typing import Literal

from levels import air
from levels.constants import MHZ_NM, MHZ_PER_WAVENUMBER
from levels.errors import UnknownName
from levels.notation import level_keys, nearest, squeeze
from levels.quantity import Quantity
from levels.records import Atom, Level, Line

GROUND = "ground"
Unit = Literal["nm", "THz", "cm-1"]
MHZ_PER_UNIT = {"THz": 1e6, "cm-1": MHZ_PER_WAVENUMBER}


@dataclass(frozen=True, slots=True)
class Target:
    """Where to look and how far around: a wavelength in vacuum or air (nm), a frequency (THz), a wavenumber (cm-1)."""

    near: float
    within: float
    unit: Unit = "nm"
    in_air: bool = False

    @property
    def frequency_mhz(self) -> float:
        """The frequency of light there."""
        if self.unit != "nm":
            return self.near * MHZ_PER_UNIT[self.unit]
        return MHZ_NM / (air.vacuum_of_air(self.near) if self.in_air else self.near)


@dataclass(frozen=True, slots=True)
class Wanted:
    """What a line must be; a value of None, or no name, asks for nothing."""

    multipole: str = ""
    lower: str = ""
    upper: str = ""
    min_width_mhz: float | None = None
    max_width_mhz: float | None = None
    without_recalled: bool = False


@dataclass(frozen=True, slots=True)
class Found:
    """A line with its place; `distance_nm` (in the target's medium) and `distance_ghz` count from the target."""

    line: Line
    vacuum_nm: float
    air_nm: float | None
    distance_nm: float | None = None
    distance_ghz: float | None = None


def find_lines(atoms: Iterable[Atom], wanted: Wanted, target: Target | None = None) -> list[Found]:
    """The lines that are wanted, by distance from the target, or by wavelength without one."""
    chosen = list(atoms)
    lines = [line for atom in chosen for line in atom.lines if _fits(line, atom, wanted)]
    if not lines:
        for name in filter(None, (wanted.lower, wanted.upper)):
            _check_name(chosen, name)
    placed = [_placed(line, target) for line in lines]
    if target is None:
        return sorted(placed, key=lambda one: one.vacuum_nm)
    near = [(abs(distance), one) for one in placed if abs(distance := _distance(one, target)) <= target.within]
    return [one for _, one in sorted(near, key=lambda pair: pair[0])]


def _fits(line: Line, atom: Atom, wanted: Wanted) -> bool:
    if wanted.multipole and line.multipole != wanted.multipole:
        return False
    ends = ((wanted.lower, line.lower), (wanted.upper, line.upper))
    if not all(is_named(level, name, atom.isotope.ground) for name, level in ends if name):
        return False
    if wanted.without_recalled and usable(line.centroid, wanted) is None:
        return False
    width = usable(line.upper.width, wanted)
    low, high = wanted.min_width_mhz, wanted.max_width_mhz
    if low is None and high is None:
        return True
    return width is not None and (low is None or width.value >= low) and (high is None or width.value <= high)


def usable(quantity: Quantity | None, wanted: Wanted) -> Quantity | None:
    """The quantity, unless it rests on memory and that is not wanted."""
    return None if quantity and wanted.without_recalled and quantity.evidence == "recalled" else quantity


def is_named(level: Level, name: str, ground: str) -> bool:
    """Whether a level is the ground level (`ground`), or has the name, an alias or a short spelling of it."""
    if name.casefold() == GROUND:
        return level.name == ground
    spellings = {*level_keys(level.name), *(alias.casefold() for alias in level.aliases)}
    return bool({name.strip().casefold(), squeeze(name)} & spellings)


def _check_name(atoms: Sequence[Atom], name: str) -> None:
    """Raises UnknownName where no level of any atom has the name."""
    levels = {level.name: (level, atom.isotope.ground) for atom in atoms for level in atom.levels}
    if not any(is_named(level, name, ground) for level, ground in levels.values()):
        raise UnknownName("level", name, nearest(name, levels, key=squeeze))


def _placed(line: Line, target: Target | None) -> Found:
    vacuum_nm = line.wavelength.value if line.wavelength else line.nominal_nm
    is_known = air.SHORTEST_NM <= vacuum_nm <= air.LONGEST_NM
    air_nm = air.air_of_vacuum(vacuum_nm) if is_known else None
    if target is None:
        return Found(line, vacuum_nm, air_nm)
    from_target_nm = MHZ_NM / target.frequency_mhz
    distance_nm = vacuum_nm - from_target_nm
    if target.in_air and air_nm is not None:
        distance_nm = air_nm - target.near
    photon_mhz = MHZ_NM / vacuum_nm
    return Found(line, vacuum_nm, air_nm, distance_nm, (photon_mhz - target.frequency_mhz) * 1e-3)


def _distance(one: Found, target: Target) -> float:
    if target.unit == "nm":
        return one.distance_nm or 0.0
    return (one.distance_ghz or 0.0) * 1e3 / MHZ_PER_UNIT[target.unit]


@dataclass(frozen=True, slots=True)
class LevelWanted:
    """What a level must be; None, or no text, asks for nothing. Bounds in cm-1 and seconds."""

    name: str = ""
    term: str = ""
    twice_J: int | None = None
    parity: int | None = None
    min_energy_cm: float | None = None
    max_energy_cm: float | None = None
    min_lifetime_s: float | None = None
    max_lifetime_s: float | None = None


def find_levels(atoms: Sequence[Atom], wanted: LevelWanted) -> list[Level]:
    """The levels that are wanted, atom by atom by energy; one without a value that is bounded is left out.

    A name or term that no level of any of the atoms has raises UnknownName with the nearest.
    """
    if wanted.name:
        _check_name(atoms, wanted.name)
    terms = {level.term.casefold(): level.term for atom in atoms for level in atom.levels}
    if wanted.term and wanted.term.casefold() not in terms:
        raise UnknownName("term", wanted.term, nearest(wanted.term, terms.values()))
    found = []
    for atom in atoms:
        fitting = [level for level in atom.levels if _level_fits(level, atom, wanted)]
        found += sorted(fitting, key=lambda level: level.energy.value if level.energy else float("inf"))
    return found


def _level_fits(level: Level, atom: Atom, wanted: LevelWanted) -> bool:
    tests: tuple[Callable[[], bool], ...] = (
        lambda: not wanted.name or is_named(level, wanted.name, atom.isotope.ground),
        lambda: not wanted.term or level.term.casefold() == wanted.term.casefold(),
        lambda: wanted.twice_J is None or level.twice_J == wanted.twice_J,
        lambda: wanted.parity is None or level.parity == wanted.parity,
        lambda: _within(level.energy, wanted.min_energy_cm, wanted.max_energy_cm),
        lambda: _within(level.lifetime, wanted.min_lifetime_s, wanted.max_lifetime_s),
    )
    return all(test() for test in tests)


def _within(quantity: Quantity | None, low: float | None, high: float | None) -> bool:
    if low is None and high is None:
        return True
    return quantity is not None and (low is None or quantity.value >= low) and (high is None or quantity.value <= high)
