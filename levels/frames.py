"""The rotating frame of a scheme: one frequency per level or hyperfine level, such that every laser stands still.

Each beam ties a lower to an upper group of sublevels by its frequency. First whole levels are tried. Where that leads
to a contradiction (a cooling and a repump beam on one line), groups are hyperfine levels F and ties are taken in the
order of their strength; a tie that contradicts stronger ones is not in the frame. Such a tie may be treated as plain
absorption and stimulated emission with its light shift when it is weak: saturation at most 1e-3 and at most one
hundredth of the strongest tie at the same lower group. Otherwise there is no frame and the reason says which beams
disagree: their beat note would have to be followed in time.
"""

from collections.abc import Hashable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from levels.driven import Coupling, Drive
from levels.notation import format_half

Array = NDArray[np.float64]
SAME_FREQUENCY_MHZ = 1e-6
WEAK_SATURATION = 1e-3
WEAK_SHARE = 1e-2


@dataclass(frozen=True, slots=True, eq=False)
class Frame:
    """Frame frequencies (MHz, from each level's centroid) and laser photon numbers of every sublevel.

    `photons` has shape (sublevels, beams): how often each laser's phase enters the sublevel's frame. `coherent` tells,
    per beam, which components stand still; the rest is incoherent. `reason` is empty when the frame is good.
    """

    shift_mhz: Array
    photons: NDArray[np.int64]
    coherent: tuple[NDArray[np.bool_], ...]
    reason: str
    notes: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class _Tie:
    """One beam between two groups; `strength` is its largest saturation parameter."""

    beam: int
    lower: Hashable
    upper: Hashable
    offset_mhz: float
    strength: float


class _Potentials:
    """Groups joined by frequency differences: each knows its set's root, its frequency and photons above the root."""

    def __init__(self, beams: int) -> None:
        self.beams = beams
        self.root: dict[Hashable, Hashable] = {}
        self.shift: dict[Hashable, float] = {}
        self.photons: dict[Hashable, NDArray[np.int64]] = {}

    def add(self, group: Hashable) -> None:
        if group not in self.root:
            self.root[group], self.shift[group] = group, 0.0
            self.photons[group] = np.zeros(self.beams, dtype=np.int64)

    def tie(self, lower: Hashable, upper: Hashable, offset_mhz: float, beam: int | None) -> bool:
        """Join two groups, or say whether an existing path agrees."""
        gap = self.shift[lower] + offset_mhz - self.shift[upper]
        if self.root[lower] == self.root[upper]:
            return abs(gap) <= SAME_FREQUENCY_MHZ
        photons = self.photons[lower] - self.photons[upper]
        if beam is not None:
            photons = photons + np.eye(self.beams, dtype=np.int64)[beam]
        moved = self.root[upper]
        for group in [g for g, root in self.root.items() if root == moved]:
            self.root[group] = self.root[lower]
            self.shift[group] += gap
            self.photons[group] = self.photons[group] + photons
        return True


def frame_of(drive: Drive) -> Frame:
    """Find the rotating frame of a scheme, or say why there is none."""
    structure = drive.structure
    levels = [int(k) for k in structure.level_index]
    whole = _Potentials(len(drive.couplings))
    for level in levels:
        whole.add(level)
    ties = [_whole_tie(k, coupling, levels) for k, coupling in enumerate(drive.couplings)]
    if all(whole.tie(tie.lower, tie.upper, tie.offset_mhz, tie.beam) for tie in ties):
        everything = tuple(np.ones(coupling.rabi_mhz.shape, dtype=np.bool_) for coupling in drive.couplings)
        return _frame(whole, levels, everything, "", _shared_notes(drive))
    return _by_hyperfine(drive)


def _whole_tie(beam: int, coupling: Coupling, levels: list[int]) -> _Tie:
    return _Tie(beam, levels[coupling.lower.start], levels[coupling.upper.start], coupling.beam.offset_mhz, 1.0)


def _by_hyperfine(drive: Drive) -> Frame:
    """Take hyperfine levels as groups and the strongest ties first."""
    structure = drive.structure
    groups = [(int(k), int(F)) for k, F in zip(structure.level_index, structure.twice_F, strict=True)]
    joined = _Potentials(len(drive.couplings))
    for group in groups:
        joined.add(group)
    ties = sorted(_hyperfine_ties(drive, groups), key=lambda tie: -tie.strength)
    strongest: dict[Hashable, float] = {}
    coherent = [np.zeros(coupling.rabi_mhz.shape, dtype=np.bool_) for coupling in drive.couplings]
    left_out: list[_Tie] = []
    reason = ""
    for tie in ties:
        if joined.tie(tie.lower, tie.upper, tie.offset_mhz, tie.beam):
            strongest.setdefault(tie.lower, tie.strength)
            coherent[tie.beam] |= _members(drive.couplings[tie.beam], groups, tie)
        else:
            left_out.append(tie)
            if tie.strength > min(WEAK_SATURATION, WEAK_SHARE * strongest.get(tie.lower, 0.0)):
                reason = reason or _clash(drive, tie)
    for level in dict.fromkeys(k for k, _ in groups):  # groups that no light ties rotate with their level's first
        same = list(dict.fromkeys(group for group in groups if group[0] == level))
        for other in same[1:]:
            joined.tie(same[0], other, 0.0, None)
    return _frame(joined, groups, tuple(coherent), reason, (*_shared_notes(drive), *_left_out_notes(drive, left_out)))


def _hyperfine_ties(drive: Drive, groups: list[tuple[int, int]]) -> list[_Tie]:
    ties = []
    for k, coupling in enumerate(drive.couplings):
        lows, ups = groups[coupling.lower], groups[coupling.upper]
        saturation = coupling.saturation
        for low in dict.fromkeys(lows):
            for up in dict.fromkeys(ups):
                part = saturation[np.ix_([g == up for g in ups], [g == low for g in lows])]
                if part.max() > 0.0:
                    ties.append(_Tie(k, low, up, coupling.beam.offset_mhz, float(part.max())))
    return ties


def _members(coupling: Coupling, groups: list[tuple[int, int]], tie: _Tie) -> NDArray[np.bool_]:
    ups = np.array([group == tie.upper for group in groups[coupling.upper]])
    lows = np.array([group == tie.lower for group in groups[coupling.lower]])
    both: NDArray[np.bool_] = ups[:, None] & lows[None, :]
    return both


def _frame(
    joined: _Potentials,
    groups: list[Hashable] | list[int] | list[tuple[int, int]],
    coherent: tuple[NDArray[np.bool_], ...],
    reason: str,
    notes: tuple[str, ...],
) -> Frame:
    shift = np.array([joined.shift[group] for group in groups])
    return Frame(shift, np.stack([joined.photons[group] for group in groups]), coherent, reason, notes)


def _shared_notes(drive: Drive) -> tuple[str, ...]:
    """Point out beams of one frequency, whose fields add with the phases given."""
    by_frequency: dict[tuple[str, float], list[str]] = {}
    for coupling in drive.couplings:
        key = (coupling.beam.line.name, round(coupling.beam.offset_mhz / SAME_FREQUENCY_MHZ))
        by_frequency.setdefault(key, []).append(coupling.beam.name)
    return tuple(
        f"beams {', '.join(names)} have one frequency: their fields add as they do at one point in space, with the"
        " phases of the polarisations given"
        for names in by_frequency.values()
        if len(names) > 1
    )


def _label(drive: Drive, group: Hashable) -> str:
    if not isinstance(group, tuple):
        raise TypeError(group)
    level = drive.structure.levels[group[0]]
    return f"{level.name} {'F' if level.twice_I else 'J'}={format_half(group[1])}"


def _clash(drive: Drive, tie: _Tie) -> str:
    low, up = _label(drive, tie.lower), _label(drive, tie.upper)
    name = drive.couplings[tie.beam].beam.name
    return (
        f"beam {name} drives {low} - {up} with saturation {tie.strength:.2g}, at a frequency that does not stand still"
        " in the frame of the stronger beams"
    )


def _left_out_notes(drive: Drive, left_out: list[_Tie]) -> tuple[str, ...]:
    if not left_out:
        return ()
    names = ", ".join(dict.fromkeys(drive.couplings[tie.beam].beam.name for tie in left_out))
    worst = max(tie.strength for tie in left_out)
    return (
        f"far-detuned driving of other hyperfine levels by beams {names} (saturation up to {worst:.1e}) enters as"
        " absorption, stimulated emission and light shift, without coherences",
    )
