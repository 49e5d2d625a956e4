"""Wanted laser frequencies and the points that lasers are locked to, with what their difference rests on.

A lock is a spectroscopic feature, a stated frequency, a comb or cavity with its spacing (any of its lines will do), or
a beat with another laser of the plan: that of a wanted frequency, or one locked to another lock. A lock may add a beat
frequency within a range, of either sign.
"""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from levels.errors import OutsideValidity, UnknownName
from levels.positions import Place, difference_spread, own_spread, slope_spread
from levels.quantity import combine

FEATURE, FREQUENCY, COMB, BEAT = "feature", "frequency", "comb", "beat"
DEFAULT_SPAN_MHZ = 1e7  # a fibre comb, amplified and broadened
KINDS = (FEATURE, FREQUENCY, COMB, BEAT)
LOWEST_MHZ, HIGHEST_MHZ = 1e5, 1e10  # light, from the far infrared to the vacuum ultraviolet


@dataclass(frozen=True, slots=True, eq=False)
class Point:
    """One optical frequency: its value and standard uncertainty, its slope in a field, and its place on a line."""

    frequency_mhz: float
    uncertainty_mhz: float | None
    slope_mhz_per_gauss: float | None = None
    slope_uncertainty: float | None = None
    place: Place | None = None


@dataclass(frozen=True, slots=True, eq=False)
class Wanted:
    """A laser frequency that is wanted; `locks` names those it may use (all when empty)."""

    name: str
    point: Point
    locks: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True, eq=False)
class Lock:
    """A lock point. `spacing_mhz` makes it a comb, whose lines reach `span_mhz` to either side of the stated one.

    `beat_mhz` is the range of a beat frequency that it adds.
    """

    name: str
    kind: str
    point: Point | None = None
    spacing_mhz: float | None = None
    beat_mhz: tuple[float, float] | None = None
    partner: str = ""
    span_mhz: float = DEFAULT_SPAN_MHZ

    @property
    def last_tooth(self) -> int:
        """The number of its outermost lines."""
        return int(self.span_mhz // self.spacing_mhz) if self.spacing_mhz else 0


def point_of_place(place: Place, detuning_mhz: float = 0.0, by_sublevel: bool = False) -> Point:
    """Make a point of a place on a line; only that of a pair of sublevels has a slope."""
    frequency, spread = place.frequency_mhz + detuning_mhz, own_spread(place)
    slope = place.slope_mhz_per_gauss if by_sublevel else None
    return Point(frequency, spread, slope, slope_spread(place) if by_sublevel else None, place)


def check_point(parameter: str, frequency_mhz: float) -> float:
    """Refuse what is not the frequency of light."""
    if not LOWEST_MHZ <= frequency_mhz <= HIGHEST_MHZ:
        raise OutsideValidity(parameter, f"{frequency_mhz:g} MHz", f"from {LOWEST_MHZ:g} to {HIGHEST_MHZ:g} MHz")
    return frequency_mhz


def resolved(locks: Sequence[Lock], wanted: Sequence[Wanted]) -> dict[str, Point]:
    """Find the optical frequency of each lock; a beat's is that of its partner, followed to the end."""
    by_name = {lock.name: lock for lock in locks}
    points = {one.name: one.point for one in wanted}
    for name in by_name:
        if name in points:
            raise OutsideValidity("locks", name, "a name that no wanted frequency has")
    return {lock.name: _point(lock, by_name, points, ()) for lock in locks}


def _point(lock: Lock, locks: Mapping[str, Lock], points: Mapping[str, Point], through: tuple[str, ...]) -> Point:
    if lock.kind != BEAT:
        if lock.point is None:
            raise OutsideValidity(f"lock {lock.name}", lock.kind, "a frequency")
        return lock.point
    if lock.partner in points:
        return points[lock.partner]
    partner = locks.get(lock.partner)
    if partner is None:
        known = [*points, *(name for name in locks if name != lock.name)]
        raise UnknownName("with", lock.partner, known[:6], f"a wanted frequency or a lock that {lock.name} beats with")
    if lock.name in through:
        raise OutsideValidity(f"lock {lock.name} with", lock.partner, "no beat that leads back to itself")
    if partner.spacing_mhz or partner.beat_mhz:
        allowed = "a wanted frequency, a feature or a stated frequency: one whose frequency is fixed"
        raise OutsideValidity(f"lock {lock.name} with", lock.partner, allowed)
    return _point(partner, locks, points, (*through, lock.name))


def gap_uncertainty(wanted: Point, lock: Point, multiplier: float) -> float | None:
    """Return the standard uncertainty of what the modulators must make: wanted less M times lock."""
    if multiplier == 1.0 and wanted.place is not None and lock.place is not None:
        return difference_spread(wanted.place, lock.place)
    if wanted is lock and multiplier == 1.0:
        return 0.0
    scaled = None if lock.uncertainty_mhz is None else abs(multiplier) * lock.uncertainty_mhz
    return combine(wanted.uncertainty_mhz, scaled)
