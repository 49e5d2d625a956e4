"""Where components, crossovers and centroids of a line lie, and what the difference of two such places rests on.

A place is an offset from the line's centroid with the contributions of the constants that make it. The difference of
two places on one line of one isotope is free of the centroid, and a constant that both share enters it once; between
lines or isotopes the centroids enter as independent.
"""

from collections.abc import Sequence
from dataclasses import dataclass
from functools import reduce

import numpy as np
from numpy.typing import NDArray

from levels.errors import NotPublished
from levels.manifold import Label, Manifold, manifold
from levels.notation import FeatureName
from levels.quantity import combine
from levels.records import Line
from levels.sensitivity import ENERGY, SLOPE, Movement, Terms, add_terms, spread, terms_of

Indices = NDArray[np.int64]


@dataclass(frozen=True, slots=True, eq=False)
class Place:
    """One frequency on a line: offset from the centroid in MHz, slope in MHz/G, and how both ends move (None: not)."""

    line: Line
    offset_mhz: float
    slope_mhz_per_gauss: float
    lower: Movement | None
    upper: Movement | None

    @property
    def centroid_mhz(self) -> float:
        """The frequency of the line's centroid, which must be published."""
        if self.line.centroid is None:
            raise NotPublished("frequency", f"{self.line.atom} {self.line.name}", "a lab overlay can supply it")
        return self.line.centroid.value

    @property
    def frequency_mhz(self) -> float:
        """The absolute frequency."""
        return self.centroid_mhz + self.offset_mhz

    def terms(self, sign: float = 1.0) -> list[Terms]:
        """Return the contributions of the constants of both ends."""
        ends = ((self.line.upper, self.upper, sign), (self.line.lower, self.lower, -sign))
        return [terms_of(level, moved, weight) for level, moved, weight in ends if moved is not None]


def averaged(states: Manifold, members: Indices) -> tuple[NDArray[np.float64], NDArray[np.float64], Movement]:
    """Average energies, slopes and movements over the members of each row, shape (rows, members)."""
    numbers = states.movement.numbers[..., members].mean(axis=-1)
    return (
        states.energy_mhz[members].mean(axis=-1),
        states.slope_mhz_per_gauss[members].mean(axis=-1),
        Movement(numbers),
    )


def place(line: Line, lower: Sequence[Label], upper: Sequence[Label], field_gauss: float = 0.0) -> Place:
    """Locate the mean of the components between lower and upper states: one pair, or the two of a crossover."""
    by_sublevel = lower[0][1] is not None
    below, above = (manifold(level, field_gauss, by_sublevel) for level in (line.lower, line.upper))
    return place_between(line, below, above, lower, upper)


def place_between(
    line: Line, below: Manifold, above: Manifold, lower: Sequence[Label], upper: Sequence[Label]
) -> Place:
    """Locate the same between levels that are solved already."""
    low = averaged(below, np.array([[below.index_of(label) for label in lower]]))
    up = averaged(above, np.array([[above.index_of(label) for label in upper]]))
    return Place(line, float((up[0] - low[0])[0]), float((up[1] - low[1])[0]), low[2], up[2])


def place_of_feature(line: Line, feature: FeatureName) -> Place:
    """Locate a hyperfine component or crossover without a field."""
    pairs = feature.components
    return place(line, [(low, None) for low, _ in pairs], [(up, None) for _, up in pairs])


def place_of_centroid(line: Line) -> Place:
    """Locate the centroid itself."""
    return Place(line, 0.0, 0.0, None, None)


def energy_spread(terms: Sequence[Terms]) -> tuple[float | None, tuple[str, ...]]:
    """Combine contributions to one frequency: standard uncertainty in MHz (None where not known), what it excludes."""
    if not terms:
        return 0.0, ()
    found = spread(reduce(add_terms, terms))
    value = float(found.uncertainty[ENERGY, 0, 0])
    return (None if np.isnan(value) else value), found.excludes


def slope_spread(one: Place) -> float | None:
    """Return the standard uncertainty of a place's slope in MHz/G; None where not known."""
    terms = one.terms()
    if not terms:
        return None
    value = float(spread(reduce(add_terms, terms)).uncertainty[SLOPE, 0, 0])
    return None if np.isnan(value) else value


def _centroid_spread(line: Line) -> float | None:
    return None if line.centroid is None else line.centroid.uncertainty


def own_spread(one: Place) -> float | None:
    """Return the standard uncertainty of a place's absolute frequency."""
    return combine(_centroid_spread(one.line), energy_spread(one.terms())[0])


def difference_spread(one: Place, other: Place) -> float | None:
    """Return the standard uncertainty in MHz of one place minus another; None where an input states none."""
    if one.line.atom != other.line.atom:
        own = combine(energy_spread(one.terms())[0], energy_spread(other.terms())[0])
    else:
        own, _ = energy_spread([*one.terms(), *other.terms(-1.0)])
        if one.line.name == other.line.name:
            return own
    return combine(own, _centroid_spread(one.line), _centroid_spread(other.line))
