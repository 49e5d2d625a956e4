"""The shape of a published check, and the short questions that checks ask of the catalogue."""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from levels.catalogue import Catalogue
from levels.components import component
from levels.constants import MU_B_MHZ_PER_GAUSS
from levels.insensitive import Difference, Insensitive, difference, insensitive
from levels.sublevels import sublevels

FOUND, MEMORY, PRACTICE = "found in its text", "value from memory", "common practice"
Label = tuple[int, int]


@dataclass(frozen=True)
class Check:
    """One published number and how the catalogue gives the same."""

    name: str
    claim: str
    source: str
    evidence: str
    expected: float
    tolerance: float
    unit: str
    why: str  # the reason of the tolerance
    computed: Callable[[Catalogue], float]


def half(text: str) -> float:
    """Half of the last printed digit of a number."""
    return 0.5 * 10.0 ** -len(text.partition(".")[2])


def gap(book: Catalogue, atom: str, level: str, low: Label, up: Label, field_gauss: float = 0.0) -> Difference:
    """E(up) - E(low) within one level; labels are (2F, 2m)."""
    return between(book, atom, level, low, level, up, field_gauss)


def between(
    book: Catalogue, atom: str, lower: str, low: Label, upper: str, up: Label, field_gauss: float = 0.0
) -> Difference:
    """E(up) - E(low) between two levels, each from its centroid."""
    ends = book.find_level(atom, lower), book.find_level(atom, upper)
    return difference(ends[0], low, ends[1], up, field_gauss)


def still_point(book: Catalogue, atom: str, level: str, ends: tuple[Label, Label], below_gauss: float) -> Insensitive:
    """The one field-insensitive point of a pair of sublevels below a field."""
    of = book.find_level(atom, level)
    (found,) = [p for p in insensitive(of, of, below_gauss) if {p.lower, p.upper} == set(ends) and p.field_gauss > 0]
    return found


def slope(book: Catalogue, atom: str, level: str, label: Label, field_gauss: float = 0.0) -> float:
    """dE/dB of one sublevel in MHz/G."""
    solved = sublevels(book.find_level(atom, level), field_gauss)
    at = np.nonzero((solved.twice_F == label[0]) & (solved.twice_m == label[1]))[0]
    return float(solved.slope_mhz_per_gauss[0, at][0])


def slope_per_m(book: Catalogue, atom: str, level: str, twice_F: int) -> float:
    """The weak-field slope per unit of m in MHz/G: g_F muB/h."""
    twice_m = 2 if twice_F % 2 == 0 else 1
    return slope(book, atom, level, (twice_F, twice_m)) * 2 / twice_m


def line_slope(book: Catalogue, atom: str, line: str, ends: tuple[Label, Label], field_gauss: float) -> float:
    """Slope of one component in MHz/G."""
    return component(book.find_line(atom, line), *ends, field_gauss).slope_mhz_per_gauss


def zero_field_offset(book: Catalogue, atom: str, line: str, ends: tuple[Label, Label]) -> float:
    """Offset of one component from the line's centroid at zero field in MHz."""
    return component(book.find_line(atom, line), *ends, 0.0).offset_mhz


def in_magnetons(slope_mhz_per_gauss: float) -> float:
    """A slope as a multiple of muB/h."""
    return slope_mhz_per_gauss / MU_B_MHZ_PER_GAUSS
