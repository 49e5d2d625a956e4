"""The states of one level that light tells apart: its hyperfine levels F without a field, its sublevels (F, m) in one.

Each state has a label, how many sublevels it stands for, its energy in MHz from the level's hyperfine centroid, its
slope, and how its energy moves with the level's constants. Without a field only A, B and C are needed, so that a level
whose g factors nobody has published still has its hyperfine structure.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from levels.blocks import hyperfine_weights
from levels.errors import NotPublished, UnknownName
from levels.notation import format_half, format_sublevel
from levels.records import Level
from levels.sensitivity import ENERGY, MIXING, Movement
from levels.sublevels import constants_of, labels_of, sublevels
from levels.uncertainty import NUMBERS, movements

Array = NDArray[np.float64]
Label = tuple[int, int | None]  # 2F and 2m; None for a whole hyperfine level


@dataclass(frozen=True, slots=True, eq=False)
class Manifold:
    """One level at one field; arrays have shape (k,), `movement` (4, constants, 1, k)."""

    level: Level
    field_gauss: float
    labels: tuple[Label, ...]
    multiplicity: NDArray[np.int64]
    energy_mhz: Array
    slope_mhz_per_gauss: Array
    movement: Movement

    def index_of(self, label: Label) -> int:
        """Return the position of a label, or raise UnknownName with the labels there are."""
        if label not in self.labels:
            known = [format_label(other) for other in self.labels]
            kind = "hyperfine level" if label[1] is None else "sublevel"
            raise UnknownName(kind, format_label(label), known[:6], f"of {self.level.atom} {self.level.name}")
        return self.labels.index(label)


def format_label(label: Label) -> str:
    """Write a state: `2` for a hyperfine level, `2,-1` for a sublevel."""
    twice_F, twice_m = label
    return format_half(twice_F) if twice_m is None else format_sublevel(twice_F, twice_m)


def manifold(level: Level, field_gauss: float = 0.0, by_sublevel: bool = False) -> Manifold:
    """Solve a level: hyperfine levels for a field of exactly zero unless sublevels are asked for, else sublevels."""
    return _sublevels(level, field_gauss) if field_gauss or by_sublevel else _hyperfine_levels(level)


def _hyperfine_levels(level: Level) -> Manifold:
    if level.A is None and level.twice_J > 0 and level.twice_I > 0:
        raise NotPublished("A", f"{level.atom} {level.name}", "a lab overlay can supply it")
    momenta = range(abs(level.twice_J - level.twice_I), level.twice_J + level.twice_I + 1, 2)
    weights = np.array([hyperfine_weights(level.twice_J, level.twice_I, F) for F in momenta])
    constants = [0.0 if constant is None else constant.value for constant in (level.A, level.B, level.C)]
    numbers = np.zeros((NUMBERS, MIXING + 1, 1, len(momenta)))
    numbers[ENERGY, : len(constants), 0] = weights.T
    return Manifold(
        level,
        0.0,
        tuple((F, None) for F in momenta),
        np.array([F + 1 for F in momenta]),
        weights @ np.array(constants),
        np.zeros(len(momenta)),
        Movement(numbers),
    )


def _sublevels(level: Level, field_gauss: float) -> Manifold:
    labels = labels_of(constants_of(level))
    found = sublevels(level, field_gauss, quadratic=False)
    return Manifold(
        level,
        field_gauss,
        tuple(labels),
        np.ones(len(labels), dtype=np.int64),
        found.energy_mhz[0],
        found.slope_mhz_per_gauss[0],
        movements(level, field_gauss),
    )
