"""Audit rules across species: what must grow or shrink smoothly along the alkalis and the alkaline earths."""

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from itertools import pairwise

from levels.audit_structure import Broken, Species
from levels.constants import H, U
from levels.records import Atom, Line

ALKALIS = ("Li", "Na", "K", "Rb", "Cs", "Fr")
EARTHS = ("Be", "Mg", "Ca", "Sr", "Ba", "Ra")
EARTH_IONS = ("Be+", "Mg+", "Ca+", "Sr+", "Ba+", "Ra+")


def _line(atom: Atom, lower: str, upper: str) -> Line | None:
    """The line between the ground level, of term `lower`, and the lowest level of term and J `upper`."""
    found = [
        line
        for line in atom.lines
        if line.lower.name == atom.isotope.ground
        and line.lower.name.endswith(lower)
        and line.upper.name.endswith(upper)
    ]
    return min(found, key=lambda line: line.centroid.value if line.centroid else float("inf"), default=None)


def _frequency(atom: Atom, lower: str, upper: str) -> float | None:
    line = _line(atom, lower, upper)
    return line.centroid.value if line and line.centroid else None


def _splitting(lower: str, first: str, second: str) -> Callable[[Atom], float | None]:
    def of(atom: Atom) -> float | None:
        ends = _frequency(atom, lower, first), _frequency(atom, lower, second)
        return ends[1] - ends[0] if ends[0] is not None and ends[1] is not None else None

    return of


def _energy_splitting(first: str, second: str) -> Callable[[Atom], float | None]:
    def of(atom: Atom) -> float | None:
        low, high = _lowest(atom, first), _lowest(atom, second)
        return high - low if low is not None and high is not None else None

    return of


def _lowest(atom: Atom, term: str) -> float | None:
    energies = [level.energy.value for level in atom.levels if level.energy and level.name.endswith(term)]
    return min(energies, default=None)


def _recoil_khz(upper: str) -> Callable[[Atom], float | None]:
    def of(atom: Atom) -> float | None:
        line = _line(atom, "2S1/2", upper)
        if line is None or line.wavelength is None or atom.isotope.mass is None:
            return None
        return H / (2 * atom.isotope.mass.value * U * (line.wavelength.value * 1e-9) ** 2) * 1e-3

    return of


def _width(lower: str, upper: str) -> Callable[[Atom], float | None]:
    def of(atom: Atom) -> float | None:
        line = _line(atom, lower, upper)
        return line.upper.width.value if line and line.upper.width else None

    return of


@dataclass(frozen=True, slots=True)
class Trend:
    """A number along a column of the periodic table; `direction` is +1 where it grows, -1 where it shrinks, 0 where
    neighbours differ by less than `factor` only."""

    name: str
    species: tuple[str, ...]
    number: Callable[[Atom], float | None]
    direction: int
    factor: float


TRENDS = (
    Trend("fine structure of the D lines", ALKALIS, _splitting("2S1/2", "2P1/2", "2P3/2"), 1, 100.0),
    Trend("recoil on the D2 line", ALKALIS, _recoil_khz("2P3/2"), -1, 200.0),
    Trend("width of the D2 line", ALKALIS, _width("2S1/2", "2P3/2"), 0, 1.8),
    Trend("fine structure of the resonance lines", EARTH_IONS, _splitting("2S1/2", "2P1/2", "2P3/2"), 1, 20.0),
    Trend("3P2 - 3P1 interval", EARTHS, _energy_splitting("3P1", "3P2"), 1, 30.0),
    Trend("width of the resonance line", EARTHS, _width("1S0", "1P1"), 0, 3.0),
    Trend("width of the intercombination line", EARTHS, _width("1S0", "3P1"), 1, 200.0),
)


def smooth_trends(books: Mapping[str, Species]) -> Broken:
    """Each trend of the table holds between neighbours in its column."""
    for trend in TRENDS:
        known = [(name, trend.number(books[name].reference)) for name in trend.species if name in books]
        numbers = [(name, value) for name, value in known if value]
        for (first, before), (second, after) in pairwise(numbers):
            ratio = after / before
            grows = ratio > 1
            if (trend.direction and grows != (trend.direction > 0)) or not 1 / trend.factor < ratio < trend.factor:
                yield f"{second}: trends.{trend.name}", f"{before:.4g} in {first} to {after:.4g} in {second}"
