"""Uncertainties of whole tables: of every sublevel of a level, and of every component of a line.

The derivatives of `sensitivity` are put in the tables' own order; constants that a line's two levels share (g_I of the
isotope) enter a difference once.
"""

import numpy as np
from numpy.typing import ArrayLike, NDArray

from levels.blocks import block_ms
from levels.components import pairs_of
from levels.records import Level, Line
from levels.sensitivity import MIXING, Movement, Spread, add_terms, movement, spread, terms_of
from levels.sublevels import as_fields, constants_of, labels_of, solve_block

NUMBERS = 4  # energy, slope, quadratic coefficient, shift


def movements(level: Level, field_gauss: ArrayLike) -> Movement:
    """Differentiate every sublevel of a level by its constants, in the order of the table of sublevels."""
    constants, fields = constants_of(level), as_fields(field_gauss)
    order = {label: k for k, label in enumerate(labels_of(constants))}
    numbers = np.zeros((NUMBERS, MIXING + 1, fields.size, len(order)))
    for twice_m in block_ms(constants.twice_J, constants.twice_I):
        eigen = solve_block(constants, twice_m, fields)
        numbers[..., [order[F, twice_m] for F in eigen.twice_F]] = movement(eigen, fields).numbers
    return Movement(numbers)


def sublevel_spread(level: Level, field_gauss: ArrayLike) -> Spread:
    """Compute the standard uncertainties of the table of sublevels, shape (4, n, s)."""
    return spread(terms_of(level, movements(level, field_gauss)))


def component_spread(line: Line, field_gauss: ArrayLike, q: int | None = None) -> Spread:
    """Compute the standard uncertainties of the table of components, shape (4, n, c), without the centroid's."""
    pairs = pairs_of(line, q)
    low = _picked(line.lower, field_gauss, [pair[0] for pair in pairs])
    up = _picked(line.upper, field_gauss, [pair[1] for pair in pairs])
    return spread(add_terms(terms_of(line.upper, up), terms_of(line.lower, low, sign=-1.0)))


def _picked(level: Level, field_gauss: ArrayLike, labels: list[tuple[int, int]]) -> Movement:
    order = {label: k for k, label in enumerate(labels_of(constants_of(level)))}
    at: NDArray[np.int64] = np.array([order[label] for label in labels], dtype=np.int64)
    return Movement(movements(level, field_gauss).numbers[..., at])
