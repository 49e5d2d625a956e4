"""The fine-structure levels of one LS term, and the intervals between them.

A level's partners share its configuration, term and parity, in LS coupling, with known energies. The interval to each
is taken from two lines that share a level, where both frequencies are stated with uncertainties, since lines are
known better than tabulated energies; else from the energies.
"""

from dataclasses import dataclass

from levels.constants import MHZ_PER_WAVENUMBER
from levels.errors import OutsideValidity
from levels.notation import format_half, term_quantum_numbers
from levels.quantity import Quantity, combine, derived
from levels.records import Atom, Level, Line

ZERO_GAP = Quantity(0.0, 0.0, "MHz", "0 MHz", "", "computed", "the level itself")


@dataclass(frozen=True, slots=True)
class Term:
    """A level with its partners, by J; `gaps` are their centroids above that of `level`, in MHz."""

    level: Level
    levels: tuple[Level, ...]
    gaps: tuple[Quantity, ...]

    @property
    def own(self) -> int:
        """The position of the level asked for."""
        return next(at for at, one in enumerate(self.levels) if one.twice_J == self.level.twice_J)

    @property
    def missing(self) -> tuple[int, ...]:
        """The doubled J of the term that the catalogue does not have and that lie next to one it has."""
        numbers = term_quantum_numbers(self.level.term)
        held = {one.twice_J for one in self.levels}
        every = range(abs(numbers["L"] - numbers["S"]), numbers["L"] + numbers["S"] + 1, 2)
        return tuple(J for J in every if J not in held and held & {J - 2, J + 2})


def is_partner(level: Level, other: Level) -> bool:
    """Say whether two levels are of one LS term and have energies."""
    same = (level.configuration, level.term, level.parity) == (other.configuration, other.term, other.parity)
    known = level.energy is not None and other.energy is not None
    return same and level.coupling == other.coupling == "LS" and known and level.twice_J != other.twice_J


def alone(level: Level) -> Term:
    """Return the level as a term of its own."""
    return Term(level, (level,), (ZERO_GAP,))


def term_of(atom: Atom, level: Level) -> Term:
    """Collect a level's term; a level without partners is refused."""
    partners = [other for other in atom.levels if is_partner(level, other)]
    if not partners:
        allowed = "level: no other level of its term with a known energy is in the catalogue"
        raise OutsideValidity("model", "multiplet", f"{allowed} ({atom.isotope.name} {level.name})")
    levels = sorted([level, *partners], key=lambda one: one.twice_J)
    if len({one.twice_J for one in levels}) < len(levels):
        raise OutsideValidity("model", "multiplet", f"level: {level.name} has two partners of one J")
    return Term(level, tuple(levels), tuple(interval(atom, level, other) for other in levels))


def interval(atom: Atom, level: Level, other: Level) -> Quantity:
    """Return E(other) - E(level) between the hyperfine centroids, in MHz: of the sharpest lines, or of energies."""
    if level.twice_J == other.twice_J:
        return ZERO_GAP
    pairs = [
        _between(one, two, up)
        for up in (True, False)
        for one in (line for line in atom.lines if _sharp(line, level, up))
        for two in (line for line in atom.lines if _sharp(line, other, up))
        if _share(one, two, up)
    ]
    known = [(pair.uncertainty, pair) for pair in pairs if pair.uncertainty is not None]
    if known:
        return min(known, key=lambda item: item[0])[1]
    return _of_energies(level, other)


def _sharp(line: Line, level: Level, up: bool) -> bool:
    end = line.upper if up else line.lower
    return end.name == level.name and line.centroid is not None and line.centroid.uncertainty is not None


def _share(one: Line, two: Line, up: bool) -> bool:
    same_end = one.lower.name == two.lower.name if up else one.upper.name == two.upper.name
    return same_end and one.centroid_isotope == two.centroid_isotope


def _between(one: Line, two: Line, up: bool) -> Quantity:
    first, second = one.centroid, two.centroid
    assert first is not None
    assert second is not None
    value = (second.value - first.value) * (1 if up else -1)
    formula = f"difference of the lines {two.name} and {one.name}"
    return derived(value, combine(first.uncertainty, second.uncertainty), "MHz", formula, inputs=(first, second))


def _of_energies(level: Level, other: Level) -> Quantity:
    low, high = level.energy, other.energy
    assert low is not None
    assert high is not None
    spread = combine(low.uncertainty, high.uncertainty)
    return derived(
        (high.value - low.value) * MHZ_PER_WAVENUMBER,
        None if spread is None else spread * MHZ_PER_WAVENUMBER,
        "MHz",
        f"difference of the energies of {other.name} and {level.name}",
        inputs=(low, high),
    )


def term_notes(term: Term) -> tuple[str, ...]:
    """Say what the model of a whole term leaves out."""
    notes = []
    if term.missing:
        absent = ", ".join(f"J = {format_half(J)}" for J in term.missing)
        notes.append(f"{absent} of {term.level.term} is not in the catalogue: its mixing is left out")
    largest = max((abs(one.A.value) for one in term.levels if one.A is not None and one.twice_I), default=0.0)
    if largest and len(term.levels) > 1:
        notes.append(
            f"the hyperfine interaction of {term.level.name} with other J of its term is left out; where the field "
            f"mixes them fully it is of the size of A, up to {largest:.3g} MHz"
        )
    return tuple(notes)
