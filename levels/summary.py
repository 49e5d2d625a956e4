"""What an atom can be cooled on, as far as its data tells: strong lines from levels that live long, and their leaks.

Hints, no proof: a channel that the catalogue does not hold is not known to be closed, and what happens in a field with
given beams is the business of the scheme.
"""

from dataclasses import dataclass

from levels.quantity import Quantity
from levels.records import Atom, Level, Line

LONG_LIVED_S = 1e-3  # a lower level for cooling keeps atoms at least so long
NEARLY_ALL = 0.99


@dataclass(frozen=True, slots=True)
class CoolingLine:
    """A dipole line from a long-lived level. `leaks` are the lines by which the upper level decays elsewhere.

    `returned` is the fraction that decays back on the line, None where it is not known. `is_cycling` says that J grows
    by one, so that the stretched sublevels (F to F + 1) have no other decay to the lower level.
    """

    line: Line
    is_cycling: bool
    returned: Quantity | None
    leaks: tuple[Line, ...]

    @property
    def is_closed(self) -> bool | None:
        """Whether the line returns all but a percent of the atoms; None where the data does not say."""
        if self.returned is not None:
            return self.returned.value >= NEARLY_ALL
        return None if not self.leaks else False


def cooling_lines(atom: Atom) -> list[CoolingLine]:
    """The dipole lines of known width from the ground level, then from long-lived ones, the widest first."""
    found = [_of(line, atom) for line in atom.lines if _is_candidate(line, atom)]
    return sorted(found, key=lambda one: (one.line.lower.name != atom.isotope.ground, -_width_mhz(one.line)))


def _width_mhz(line: Line) -> float:
    return line.upper.width.value if line.upper.width else 0.0


def _is_candidate(line: Line, atom: Atom) -> bool:
    is_dipole = line.multipole == "E1" and line.photons == 1
    return is_dipole and line.upper.width is not None and is_long_lived(line.lower, atom)


def is_long_lived(level: Level, atom: Atom) -> bool:
    """Whether a level is the ground level, is known to live a millisecond or more, or has no allowed way down."""
    if level.name == atom.isotope.ground:
        return True
    if level.lifetime is not None:
        return level.lifetime.value >= LONG_LIVED_S
    return not any(line.upper.name == level.name and line.multipole == "E1" and not line.induced for line in atom.lines)


def _of(line: Line, atom: Atom) -> CoolingLine:
    leaks = tuple(other for other in atom.lines if other.upper.name == line.upper.name and other.name != line.name)
    return CoolingLine(line, line.upper.twice_J == line.lower.twice_J + 2, line.branching, leaks)
