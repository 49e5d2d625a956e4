"""What answers about a level or a line rest on: its curated constants, their sources, and the limits of the model."""

from collections.abc import Mapping
from dataclasses import dataclass

from levels.features import has_own_centroid
from levels.multiplet import caution, quiet_field_gauss
from levels.quantity import Quantity
from levels.records import Level, Line
from levels.sublevels import cautions
from service.answers import Basis
from service.citations import Publication

Used = list[tuple[str, Quantity]]


def level_inputs(level: Level) -> Used:
    """The constants of a level's Hamiltonian that exist and matter."""
    named = (
        ("A", level.A, level.twice_J > 0 and level.twice_I > 0),
        ("B", level.B, level.twice_J > 1 and level.twice_I > 1),
        ("C", level.C, level.twice_J > 2 and level.twice_I > 2),
        ("g_J", level.g_J, level.twice_J > 0),
        ("g_I", level.g_I, level.twice_I > 0),
    )
    return [(f"{name} of {level.name}", value) for name, value, matters in named if matters and value is not None]


def line_inputs(line: Line) -> Used:
    """The constants of a line's two levels and the frequency of its centroid."""
    centroid: Used = [] if line.centroid is None else [(f"centroid of {line.name}", line.centroid)]
    return [*level_inputs(line.lower), *level_inputs(line.upper), *centroid]


def line_cautions(line: Line) -> tuple[str, ...]:
    """What a line leaves out at any field."""
    borrowed: tuple[str, ...] = ()
    if line.centroid is not None and line.centroid_isotope == "natural":
        borrowed = (f"the frequency of {line.name} is that of the natural mixture of isotopes",)
    elif line.centroid is not None and not has_own_centroid(line):
        whose = f"mass number {line.centroid_isotope}"
        borrowed = (
            f"the frequency of {line.name} is that of {whose}: the shift of {line.atom} is not in the catalogue",
        )
    return (*cautions(line.lower), *cautions(line.upper), *borrowed)


def line_warnings(line: Line, largest_field_gauss: float) -> list[str]:
    """Where the model of a line is stretched at fields up to the given one."""
    mixed = (*caution(line.lower, largest_field_gauss), *caution(line.upper, largest_field_gauss))
    return list(dict.fromkeys((*line_cautions(line), *mixed)))


@dataclass(frozen=True, slots=True)
class Grounds:
    """What answers about some levels, and perhaps the line between them, rest on."""

    levels: tuple[Level, ...]
    basis: Basis
    always: tuple[str, ...]
    quiet_field_gauss: float

    def warnings(self, largest_field_gauss: float) -> list[str]:
        """Where the model is stretched at fields up to the given one."""
        if abs(largest_field_gauss) <= self.quiet_field_gauss:
            return list(self.always)
        mixed = [text for level in self.levels for text in caution(level, largest_field_gauss)]
        return list(dict.fromkeys((*self.always, *mixed)))


def level_grounds(*levels: Level, publications: Mapping[str, Publication]) -> Grounds:
    """The grounds of answers about one level, or about two."""
    used = dict(item for level in levels for item in level_inputs(level))
    always = tuple(dict.fromkeys(text for level in levels for text in cautions(level)))
    return Grounds(levels, Basis(tuple(used.items()), publications), always, min(map(quiet_field_gauss, levels)))


def line_grounds(line: Line, publications: Mapping[str, Publication]) -> Grounds:
    """The grounds of answers about a line."""
    quiet = min(quiet_field_gauss(line.lower), quiet_field_gauss(line.upper))
    basis = Basis(tuple(line_inputs(line)), publications)
    return Grounds((line.lower, line.upper), basis, line_cautions(line), quiet)
