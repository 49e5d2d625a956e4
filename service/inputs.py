"""What an answer rests on: the curated constants of levels and lines that a computation used, with their names."""

from levels.multiplet import caution
from levels.notation import format_half
from levels.quantity import Quantity
from levels.records import Level, Line
from levels.sublevels import cautions

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
    """The constants of a line's two levels, the frequency of its centroid and of components measured themselves."""
    centroid: Used = [] if line.centroid is None else [(f"centroid of {line.name}", line.centroid)]
    measured = [(f"{format_half(F)}-{format_half(F_up)} of {line.name}", known) for F, F_up, known in line.measured]
    return [*level_inputs(line.lower), *level_inputs(line.upper), *centroid, *measured]


def level_warnings(level: Level, largest_field_gauss: float) -> list[str]:
    """Where the model of a level is stretched at fields up to the given one."""
    return [*cautions(level), *caution(level, largest_field_gauss)]


def line_warnings(line: Line, largest_field_gauss: float) -> list[str]:
    """Where the model of a line is stretched at fields up to the given one."""
    ends = [*level_warnings(line.lower, largest_field_gauss), *level_warnings(line.upper, largest_field_gauss)]
    if line.centroid is not None and line.centroid_isotope == "natural":
        ends.append(f"the frequency of {line.name} is that of the natural mixture of isotopes")
    return list(dict.fromkeys(ends))
