"""Where a level decays to, with what is known kept apart from what is not.

A share is published (a branching fraction, or a rate with the level's lifetime), follows from a selection rule (only
one level of the book can be reached), or is unknown. An unknown share is never guessed: it is bounded, and so are the
levels that it may go to: those below that electric-dipole light joins, and those of lines without a published share.
Levels that the book does not hold are not considered.
"""

from dataclasses import dataclass

import numpy as np

from levels.angular import triangle_reason
from levels.decays import CLOSURE_TOLERANCE, own_rate, total_rate
from levels.quantity import in_unit, resolution
from levels.records import Atom, Level, Line

DATA, RULE, UNKNOWN, METASTABLE = "data", "selection rule", "unknown", "metastable"


@dataclass(frozen=True, slots=True)
class Channel:
    """One way down: its line, its share in the known decays (they sum to 1) and the share's standard uncertainty."""

    line: Line
    share: float
    uncertainty: float


@dataclass(frozen=True, slots=True)
class Branching:
    """How a level decays.

    `total_per_s` is None where neither lifetime nor width is known. `unknown` bounds the share without a published
    destination, `possible` lists the levels that it may go to. `closure` says what closes the decays: published data, a
    selection rule, or that they are unknown; a metastable level has no electric-dipole decay in the book.
    """

    level: Level
    total_per_s: float | None
    channels: tuple[Channel, ...]
    unknown: tuple[float, float]
    possible: tuple[Level, ...]
    closure: str
    note: str = ""

    @property
    def is_known(self) -> bool:
        """Whether every decay has a published or deduced destination."""
        return self.unknown[1] == 0.0


def reaches_by_dipole(upper: Level, lower: Level) -> bool:
    """Whether electric-dipole light may join two levels: energy, parity and triangle rule."""
    if upper.energy is None or lower.energy is None or not lower.energy.value < upper.energy.value:
        return False
    return upper.parity != lower.parity and not triangle_reason(upper.twice_J, 2, lower.twice_J)


def branching_of(atom: Atom, level: Level) -> Branching:
    """Work out what is known of a level's decays."""
    lines = [line for line in atom.lines if line.upper.name == level.name and line.photons == 1]
    total = total_rate(level)
    known = _published(lines, None if total is None else (total.value, total.uncertainty or 0.0))
    named = {channel.line.lower.name for channel in known}
    open_lines = [line.lower for line in lines if line.lower.name not in named]
    by_rule = [other for other in atom.levels if reaches_by_dipole(level, other) and other.name not in named]
    possible = tuple({other.name: other for other in (*open_lines, *by_rule)}.values())
    rate = None if total is None else total.value
    dipole = any(channel.line.multipole == "E1" and not channel.line.induced for channel in known) or bool(by_rule)
    complete = total is not None or any(line.branching is not None for line in lines)
    return _closed(level, rate, known, possible, dipole, complete)


def _published(lines: list[Line], total: tuple[float, float] | None) -> list[Channel]:
    """Collect the shares that are published; without any total, those of rates relative to each other."""
    found = []
    for line in lines:
        if line.branching is not None:
            fraction = in_unit(line.branching, "1")
            found.append(Channel(line, fraction.value, fraction.uncertainty or 0.0))
            continue
        own = own_rate(line) if total is not None else None
        if own is not None and own[0] > 0 and total is not None:
            relative = np.hypot(own[1] / own[0], total[1] / total[0])
            found.append(Channel(line, own[0] / total[0], float(own[0] / total[0] * relative)))
    if found or total is not None:
        return found
    rates = [(line, own) for line in lines if (own := own_rate(line)) is not None and own[0] > 0]
    whole = sum(own[0] for _, own in rates)
    return [Channel(line, own[0] / whole, own[1] / whole) for line, own in rates]


def _closed(
    level: Level, rate: float | None, known: list[Channel], possible: tuple[Level, ...], dipole: bool, complete: bool
) -> Branching:
    """Decide how much is unknown and scale the known shares to 1."""
    if not known:
        if not possible:
            return Branching(level, rate, (), (0.0, 0.0), (), METASTABLE, "no decay in the book")
        unknown, note = (1.0, 1.0), "no branching of it is published"
    else:
        unknown, note = _remainder(known, possible, complete)
    whole = sum(channel.share for channel in known)
    channels = tuple(Channel(c.line, c.share / whole, c.uncertainty / whole) for c in known)
    if unknown[1] > 0:
        closure = RULE if len(possible) == 1 else UNKNOWN
    else:
        closure = RULE if len(channels) == 1 and not possible else DATA
    if not dipole:
        closure = METASTABLE
    return Branching(level, rate, channels, unknown, possible if unknown[1] > 0 else (), closure, note)


def _remainder(known: list[Channel], possible: tuple[Level, ...], complete: bool) -> tuple[tuple[float, float], str]:
    """Bound the share without a destination, and say what is assumed."""
    if not complete:
        return ((0.0, 1.0), "rates of other decays are not published") if possible else ((0.0, 0.0), "")
    if any(channel.share == 1.0 for channel in known):
        names = ", ".join(level.name for level in possible)
        return (0.0, 0.0), f"stated as the only decay; decays to {names} neglected" if names else ""
    rest = 1.0 - sum(channel.share for channel in known)
    spread = _spread(known)
    if rest < -max(CLOSURE_TOLERANCE, 2 * spread):
        return (0.0, 0.0), f"published shares add up to {1 - rest:.6g}; scaled to 1"
    if possible:
        if rest > spread:
            return (rest, rest), f"published shares leave {rest:.3g}"
        return (0.0, min(spread + max(rest, 0.0), 1.0)), f"published shares add up to 1 within {spread:.1g}"
    if rest > max(CLOSURE_TOLERANCE, 2 * spread):
        return (rest, rest), f"{rest:.3g} of its decays have no published destination"
    return (0.0, 0.0), ""


def _spread(known: list[Channel]) -> float:
    """Return how well the sum of the published shares is known; the last digit where none is stated."""
    parts = [channel.uncertainty or _last_digit(channel) for channel in known]
    return float(np.sqrt(sum(part**2 for part in parts)))


def _last_digit(channel: Channel) -> float:
    """Return one unit in the last printed digit of a share without a stated uncertainty, at most the tolerance."""
    printed = channel.line.branching
    return CLOSURE_TOLERANCE if printed is None else min(resolution(printed.text), CLOSURE_TOLERANCE)
