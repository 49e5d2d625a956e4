"""How an excited level decays: the rate of each line, and what leaks to levels the catalogue does not hold.

The total rate comes from the lifetime or the width, else from the sum of the lines. A line's share is its branching
fraction, else its Einstein A or reduced dipole element over the total. Shares that add up to 1 within their
uncertainties are scaled to exactly 1; a clear remainder goes to the one line without a value, or else is a leak.
"""

from dataclasses import dataclass

import numpy as np

from levels.constants import EA0, EPS0, HBAR, MHZ_NM, C
from levels.errors import NotPublished
from levels.quantity import Quantity, in_unit
from levels.records import Atom, Level, Line

STAND_IN_PER_S = 1e7  # the rate of a level whose branching is published and whose lifetime is not
CLOSURE_TOLERANCE = 1e-3  # shares that miss 1 by no more are taken as complete, whatever their stated uncertainty


@dataclass(frozen=True, slots=True)
class Channel:
    """One line out of an upper level with its partial rate in s-1."""

    line: Line
    rate_per_s: float


@dataclass(frozen=True, slots=True)
class Decay:
    """Every way out of one level: total rate, lines, and the rate into levels that are not in the catalogue.

    Where no rate is published but shares are, `is_timed` is False: the rates say where decays go, not how fast.
    """

    level: Level
    total_per_s: float
    channels: tuple[Channel, ...]
    leak_per_s: float
    notes: tuple[str, ...] = ()
    is_timed: bool = True

    @property
    def width_mhz(self) -> float:
        """The natural width Gamma/2pi."""
        return self.total_per_s / (2e6 * np.pi)

    def rate_of(self, line: Line) -> float:
        """The partial rate of one line, zero when it has none."""
        return next((channel.rate_per_s for channel in self.channels if channel.line.name == line.name), 0.0)


def frequency_mhz_of(line: Line) -> float:
    """Return a line's frequency, from its nominal wavelength where nothing better is known."""
    if line.centroid is not None:
        return line.centroid.value
    if line.nominal_nm <= 0.0:
        raise NotPublished("frequency", f"{line.atom} {line.name}")
    return MHZ_NM / line.nominal_nm


def total_rate(level: Level) -> Quantity | None:
    """Return the total decay rate in s-1 from lifetime or width, or None when neither is published."""
    if level.lifetime is not None:
        value = in_unit(level.lifetime, "s")
        return _with(value, 1.0 / value.value)
    if level.width is not None:
        width = in_unit(level.width, "MHz")
        return _with(width, width.value * 2e6 * np.pi)
    return None


def _with(old: Quantity, value: float) -> Quantity:
    spread = None if old.uncertainty is None else abs(old.uncertainty / old.value) * value
    return Quantity(value, spread, "s-1", f"{value:.6g} s-1", old.source, old.evidence)


def own_rate(line: Line) -> tuple[float, float] | None:
    """Return a line's own partial rate in s-1 and its uncertainty: from its Einstein A, else its reduced dipole.

    A = omega^3 |<J||d||J'>|^2 / [3 pi eps0 hbar c^3 (2J'+1)], with the dipole element that is symmetric in J and J'.
    """
    if line.einstein_A is not None:
        rate = in_unit(line.einstein_A, "s-1")
        return rate.value, rate.uncertainty or 0.0
    if line.reduced_dipole is not None and line.multipole == "E1":
        dipole = in_unit(line.reduced_dipole, "e*a0")
        omega = 2e6 * np.pi * frequency_mhz_of(line)
        strength = (dipole.value * EA0) ** 2 / (line.upper.twice_J + 1)
        value = float(omega**3 * strength / (3 * np.pi * EPS0 * HBAR * C**3))
        return value, 2 * value * (dipole.uncertainty or 0.0) / abs(dipole.value)
    return None


def _share(line: Line, total: Quantity) -> tuple[float, float] | None:
    if line.branching is not None:
        fraction = in_unit(line.branching, "1")
        return fraction.value, fraction.uncertainty or 0.0
    own = own_rate(line)
    if own is None:
        return None
    relative = np.hypot(own[1] / own[0], (total.uncertainty or 0.0) / total.value) if own[0] else 0.0
    return own[0] / total.value, float(own[0] / total.value * relative)


def decay_of(atom: Atom, level: Level) -> Decay:
    """Work out how a level decays, with notes on every assumption."""
    lines = [line for line in atom.lines if line.upper.name == level.name and line.photons == 1]
    total = total_rate(level)
    if total is None:
        return _from_lines(level, lines)
    shares = {line.name: _share(line, total) for line in lines}
    known = {name: share for name, share in shares.items() if share is not None}
    missing = [line.name for line in lines if shares[line.name] is None]
    rest = 1.0 - sum(value for value, _ in known.values())
    tolerance = max(CLOSURE_TOLERANCE, 2 * float(np.sqrt(sum(spread**2 for _, spread in known.values()))))
    fractions, leak, notes = _complete(
        level, {name: value for name, (value, _) in known.items()}, missing, rest, tolerance
    )
    channels = tuple(Channel(line, fractions[line.name] * total.value) for line in lines if fractions.get(line.name))
    return Decay(level, total.value, channels, leak * total.value, notes)


def _complete(
    level: Level, fractions: dict[str, float], missing: list[str], rest: float, tolerance: float
) -> tuple[dict[str, float], float, tuple[str, ...]]:
    """Close the shares: scale them to 1, or give the remainder to the one line without a value, or to a leak."""
    owner = f"{level.atom} {level.name}"
    if rest > tolerance and len(missing) == 1:
        note = f"branching of {missing[0]} from {owner} is not published and taken as what remains, {rest:.6g}"
        return {**fractions, missing[0]: rest}, 0.0, (note,)
    unknown = (f"branching of {', '.join(missing)} from {owner} is not published and neglected",) if missing else ()
    if rest > tolerance:
        note = f"{rest:.3g} of the decays of {owner} go to levels or lines without a published share: counted as lost"
        return fractions, rest, (note, *unknown)
    if not fractions:
        return {}, 0.0, unknown
    notes = unknown
    if rest < -tolerance:
        notes = (f"the decays of {owner} add up to {1 - rest:.6g} of its total rate; scaled to 1", *unknown)
    return {name: value / (1.0 - rest) for name, value in fractions.items()}, 0.0, notes


def _from_lines(level: Level, lines: list[Line]) -> Decay:
    """Add up the lines of a level without a lifetime; one with dipole shares only decays by those, else is stable."""
    rates = {line.name: own_rate(line) for line in lines}
    channels = tuple(Channel(line, own[0]) for line in lines if (own := rates[line.name]) is not None)
    missing = [line.name for line in lines if rates[line.name] is None]
    if not channels and any(line.branching and line.multipole == "E1" and not line.induced for line in lines):
        return _untimed(level, lines)
    owner = f"{level.atom} {level.name}"
    notes: tuple[str, ...] = ()
    if missing and channels:
        notes = (f"rates of {', '.join(missing)} from {owner} are not published and neglected",)
    elif missing:
        notes = (f"neither lifetime nor rates of {owner} are published: taken as stable",)
    return Decay(level, sum(channel.rate_per_s for channel in channels), channels, 0.0, notes)


def _untimed(level: Level, lines: list[Line]) -> Decay:
    """Share out the decays of a level without a lifetime, at a rate that stands in for its own."""
    known = {line.name: in_unit(line.branching, "1").value for line in lines if line.branching is not None}
    missing = [line.name for line in lines if line.name not in known]
    fractions, leak, notes = _complete(level, known, missing, 1.0 - sum(known.values()), CLOSURE_TOLERANCE)
    channels = tuple(Channel(line, fractions[line.name] * STAND_IN_PER_S) for line in lines if fractions.get(line.name))
    owner = f"{level.atom} {level.name}"
    told = f"the lifetime of {owner} is not published: {1e6 / STAND_IN_PER_S:g} us stands in, its branching is known"
    return Decay(level, STAND_IN_PER_S, channels, leak * STAND_IN_PER_S, (told, *notes), is_timed=False)


def driven_decay(atom: Atom, line: Line) -> Decay:
    """Return the decay of a line's upper level, which must give this line a rate: no rate, no Rabi frequency."""
    decay = decay_of(atom, line.upper)
    if decay.rate_of(line) <= 0.0 or not decay.is_timed:
        hint = "without it the light's Rabi frequency is unknown; a lab overlay can supply it"
        raise NotPublished("Einstein A (or lifetime and branching)", f"{line.atom} {line.name}", hint)
    return decay
