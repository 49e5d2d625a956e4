"""The lines that a level's polarisability is summed over, what the sum leaves out, and how sure it is.

Beside the lines of the book stands a remainder: the core, and levels that the book does not have. It is taken as
scalar, the same for every sublevel. Where the whole static polarisability is published, the remainder is that value
less the lines at zero frequency (`anchored`); else it is what is published of core and tail. At a light frequency nu
the part that is not the core grows by no more than a factor 1/(1 - (nu/nu')^2) and has bounded vector and tensor
parts, nu' being the lowest frequency at which something left out can resonate (of a line left out, else above the
highest of the book, which is taken to have every strong line below): the value is not corrected for that, its
uncertainty holds all of it.

Strengths and frequencies of lines are taken as independent of each other. Where an input has no stated uncertainty and
a change by `UNSTATED_SHARE` of its contribution would outweigh the rest, or where the remainder is not known, there is
no uncertainty (NaN), and `Doubt` says why.
"""

from collections.abc import Hashable, Iterable, Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from levels.constants import HARTREE_MHZ, MHZ_NM
from levels.errors import NotPublished
from levels.quantity import Quantity, parse_number, resolution
from levels.records import Atom, Level, Line

Array = NDArray[np.float64]
UNSTATED_SHARE = 0.01
NOTABLE = 0.01  # of the stated uncertainty: doubts below this are not named


@dataclass(frozen=True, slots=True)
class Remainder:
    """Scalar polarisability beyond the lines, in a0^3 at zero frequency.

    `uncertainty` is that of its own inputs, without the lines'; None where something is missing or unstated.
    `dispersing` is the part that is not the core, `opens_mhz` the lowest frequency at which it can resonate.
    """

    value: float = 0.0
    uncertainty: float | None = None
    anchored: bool = False
    dispersing: float = 0.0
    opens_mhz: float = 0.0
    inputs: tuple[tuple[str, Quantity], ...] = ()


@dataclass(frozen=True, slots=True, eq=False)
class Partners:
    """A level with its electric-dipole lines that have a strength and a frequency, and with those that lack one."""

    level: Level
    lines: tuple[Line, ...]
    left_out: tuple[Line, ...]
    remainder: Remainder

    @property
    def complete(self) -> bool:
        """Whether what the lines leave out is known at zero frequency: as a static value, or as core and tail."""
        return self.remainder.uncertainty is not None

    def line(self, name: str) -> Line:
        """Return one of the lines by its name."""
        return next(line for line in self.lines if line.name == name)


def signed_frequency_mhz(level: Level, line: Line) -> float:
    """Return the line's frequency as seen from a level: positive upwards, negative downwards."""
    if line.centroid is None:
        raise NotPublished("frequency", f"{line.atom} {line.name}")
    return line.centroid.value if line.lower.name == level.name else -line.centroid.value


def other_end(level: Level, line: Line) -> Level:
    """Return the level at the line's other end."""
    return line.upper if line.lower.name == level.name else line.lower


def dipole_of(line: Line) -> float:
    """Return the size of the reduced dipole element in e a0; a line without one raises NotPublished."""
    if line.reduced_dipole is None:
        raise NotPublished("reduced dipole element", f"{line.atom} {line.name}")
    return abs(line.reduced_dipole.value)


def strength_uncertainty(line: Line) -> float | None:
    """Return the relative standard uncertainty of a line's strength (the dipole element squared), None if unstated."""
    dipole = line.reduced_dipole
    return None if dipole is None or dipole.uncertainty is None else 2 * dipole.uncertainty / abs(dipole.value)


def frequency_uncertainty_mhz(line: Line) -> tuple[float | None, float]:
    """Return a line's stated frequency uncertainty in MHz, None if unstated, and what one unit of its last digit is."""
    centroid = line.centroid
    if centroid is None:
        raise NotPublished("frequency", f"{line.atom} {line.name}")
    digits = centroid.text.partition(" ")[0]
    value = parse_number(digits)[0]
    return centroid.uncertainty, abs(resolution(digits) / value * centroid.value) if value else 0.0


def static_scalar(level: Level, line: Line) -> float:
    """Compute what a line adds to the static scalar polarisability, in a0^3: 2 d^2/(3 (2J+1) omega)."""
    omega = signed_frequency_mhz(level, line) / HARTREE_MHZ
    return 2 * dipole_of(line) ** 2 / (3 * (level.twice_J + 1) * omega)


def partners_of(atom: Atom, level: Level) -> Partners:
    """Collect the lines of a level and its remainder from the book."""
    lines = [line for line in atom.lines if _counts(level, line)]
    good = tuple(line for line in lines if line.reduced_dipole is not None and line.centroid is not None)
    left_out = tuple(line for line in lines if line not in good)
    return Partners(level, good, left_out, _remainder(atom, level, good, left_out))


def _counts(level: Level, line: Line) -> bool:
    ends = (line.lower.name, line.upper.name)
    return level.name in ends and line.multipole == "E1" and line.photons == 1 and not line.induced


def _remainder(atom: Atom, level: Level, lines: Iterable[Line], left_out: Iterable[Line]) -> Remainder:
    core = atom.core_polarisability.get(level.name)
    tail = atom.tail_polarisability.get(level.name)
    static = atom.static_polarisability.get(level.name)
    opens = _opens_mhz(level, lines, left_out)
    named = (("core polarisability", core), ("tail polarisability", tail), ("static polarisability", static))
    inputs = tuple((f"{name} of {level.name}", part) for name, part in named if part is not None)
    if static is not None:
        value = static.value - sum(static_scalar(level, line) for line in lines)
        dispersing = value - (0.0 if core is None else core.value)
        return Remainder(value, static.uncertainty, True, dispersing, opens, inputs)
    value = sum(part.value for part in (core, tail) if part is not None)
    if core is None or tail is None or tuple(left_out):
        return Remainder(value, None, False, 0.0 if tail is None else tail.value, opens, inputs)
    stated = core.uncertainty is not None and tail.uncertainty is not None
    spread = float(np.hypot(core.uncertainty or 0.0, tail.uncertainty or 0.0)) if stated else None
    return Remainder(value, spread, False, tail.value, opens, inputs)


def _opens_mhz(level: Level, lines: Iterable[Line], left_out: Iterable[Line]) -> float:
    """Find the lowest frequency at which what is not summed can resonate: of a line left out, or above the highest."""
    missing = [line.centroid.value if line.centroid else MHZ_NM / line.nominal_nm for line in left_out]
    known = [signed_frequency_mhz(level, line) for line in lines]
    return min(missing) if missing else max((frequency for frequency in known if frequency > 0), default=0.0)


# How sure a sum is.

Term = tuple[Array, float | None, str]
Terms = dict[Hashable, Term]


@dataclass(frozen=True, slots=True, eq=False)
class Doubt:
    """Standard uncertainties (n,) of n numbers, NaN where not known; `stated` is what stated inputs make of it."""

    uncertainty: Array
    stated: Array
    excludes: tuple[str, ...] = ()
    reasons: tuple[str, ...] = ()


def line_terms(
    partners: Partners,
    shares: Mapping[str, Array],
    slopes: Mapping[str, Array],
    anchor: float = 0.0,
    sign: float = 1.0,
) -> Terms:
    """Say how numbers move with each line's strength, per relative change (its share), and with its frequency.

    `anchor` is how much of the static scalar is in the numbers (1 for a scalar polarisability): an anchored remainder
    takes the opposite change there. `slopes` are per MHz; a frequency without a stated uncertainty is doubted by a
    unit of its last digit.
    """
    terms: Terms = {}
    for line in partners.lines:
        moved = shares[line.name]
        if partners.remainder.anchored and anchor:
            moved = moved - anchor * static_scalar(partners.level, line)
        terms["strength", line.name] = (sign * moved, strength_uncertainty(line), f"strength of {line.name}")
        stated, unit = frequency_uncertainty_mhz(line)
        scale = sign if stated is not None else sign * unit / UNSTATED_SHARE
        terms["frequency", line.name] = (scale * slopes[line.name], stated, f"frequency of {line.name}")
    return terms


@dataclass(frozen=True, slots=True, eq=False)
class Weighing:
    """How much of each part of a remainder enters a number: its scalar, vector and tensor part, and its energy shift.

    `turned` and `tilted` bound what multiplies the scalar to give the vector and tensor part; `moved_mhz` is by how
    much the sublevels' energies differ. `caps` are other bounds of the same, per light frequency, where there are any.
    """

    scalar: float = 1.0
    turned: float | Array = 0.0
    tilted: float | Array = 0.0
    moved_mhz: float = 0.0
    caps: tuple[Array, Array] | None = None


SCALAR = Weighing()


def remainder_terms(partners: Partners, light_mhz: Array, weighing: Weighing = SCALAR) -> Terms:
    """Say how a polarisability at n light frequencies moves with the remainder and what bounds its dispersion."""
    rest, name = partners.remainder, partners.level.name
    bound = np.full_like(light_mhz, np.nan)
    if rest.uncertainty is not None and rest.opens_mhz > 0:
        ratio = np.where(light_mhz < rest.opens_mhz, light_mhz / rest.opens_mhz, np.nan)
        turned, tilted = weighing.turned * ratio / (1 - ratio**2), weighing.tilted / (1 - ratio**2)
        if weighing.caps is not None:
            turned, tilted = np.fmin(turned, weighing.caps[0]), np.fmin(tilted, weighing.caps[1])
        growth = abs(weighing.scalar) * ratio**2 + 2 * weighing.moved_mhz / rest.opens_mhz / (1 - ratio**2)
        bound = abs(rest.dispersing) * (growth / (1 - ratio**2) + turned + tilted)
    terms: Terms = {("dispersion", name): (bound, 1.0, f"what the sum of {name} leaves out")}
    if weighing.scalar:
        spread = np.nan if rest.uncertainty is None else rest.uncertainty
        terms["remainder", name] = (np.full_like(light_mhz, weighing.scalar), spread, f"remainder of {name}")
    return terms


def add_strengths(first: Terms, second: Terms) -> Terms:
    """Add the movements of two numbers; those of the same line are one."""
    total = dict(first)
    for key, (moved, spread, name) in second.items():
        known = total.get(key)
        total[key] = (moved if known is None else known[0] + moved, spread, name)
    return total


def doubt_of(terms: Terms, size: int) -> Doubt:
    """Combine the movements of n numbers into their uncertainties, and say what they leave out."""
    variance, unknown = np.zeros(size), np.zeros(size, dtype=np.bool_)
    doubts, reasons = {}, []
    for moved, spread, name in terms.values():
        if spread is None:
            doubts[name] = np.abs(moved) * UNSTATED_SHARE
            continue
        part = moved * spread
        variance += np.nan_to_num(part) ** 2
        unknown |= np.isnan(part)
        if np.any(np.isnan(part)):
            reasons.append(f"{name} is not known")
    stated = np.sqrt(variance)
    lost = np.any(np.array([part > stated for part in doubts.values()]).reshape(-1, size), axis=0)
    if np.any(lost):
        reasons.append("inputs without a stated uncertainty could outweigh those with one")
    excludes = tuple(name for name, part in doubts.items() if np.any(part > NOTABLE * stated))
    return Doubt(np.where(lost | unknown, np.nan, stated), stated, excludes, tuple(reasons))
