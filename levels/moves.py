"""How the settings of a plan move when data, detunings or hardware change: the new plan against an earlier one."""

from collections.abc import Sequence
from dataclasses import dataclass

from levels.plan import Plan, Structure, structure_of
from levels.reaching import Route

KEPT, REPLANNED, LOST, ADDED, GONE = "kept", "replanned", "out of reach", "added", "gone"


@dataclass(frozen=True, slots=True)
class Earlier:
    """What an earlier plan set for one wanted frequency; settings are (modulator, order, radio frequency in MHz)."""

    wanted: str
    frequency_mhz: float
    lock: str
    lock_light_mhz: float
    beat_mhz: float
    settings: tuple[tuple[str, int, float], ...]

    @property
    def structure(self) -> Structure:
        """The lock and the chain with its orders."""
        return self.lock, tuple((name, order) for name, order, _ in self.settings)


@dataclass(frozen=True, slots=True)
class Move:
    """What moved for one wanted frequency, in kHz; settings only where the structure was kept.

    `lock_khz` is how far the light at the lock moved, `beat_khz` its beat.
    """

    wanted: str
    status: str
    frequency_khz: float | None
    lock_khz: float | None
    beat_khz: float | None
    settings: tuple[tuple[str, float], ...]


def moves_of(plan: Plan, earlier: Sequence[Earlier]) -> list[Move]:
    """Compare a plan with an earlier one, wanted frequency by wanted frequency."""
    before = {one.wanted: one for one in earlier}
    now = {one.wanted.name: one for one in plan.served}
    found = [_move(before.get(name), one.wanted.point.frequency_mhz, name, one.route) for name, one in now.items()]
    return found + [Move(name, GONE, None, None, None, ()) for name in before if name not in now]


def _move(old: Earlier | None, frequency_mhz: float, name: str, route: Route | None) -> Move:
    if old is None:
        return Move(name, ADDED, None, None, None, ())
    shift = 1e3 * (frequency_mhz - old.frequency_mhz)
    if route is None:
        return Move(name, LOST, shift, None, None, ())
    if structure_of(route) != old.structure:
        return Move(name, REPLANNED, shift, None, None, ())
    pairs = zip(route.settings, old.settings, strict=True)
    moved = tuple((new.modulator.name, 1e3 * (new.rf_mhz - rf)) for new, (_, _, rf) in pairs)
    lock = 1e3 * (route.lock_light_mhz - old.lock_light_mhz)
    return Move(name, KEPT, shift, lock, 1e3 * (abs(route.beat_mhz) - abs(old.beat_mhz)), moved)
