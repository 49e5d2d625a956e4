"""Fields at which two sublevels of a term have the same energy: level crossings.

Sublevels of one m repel each other and never meet, so a crossing joins two different m. Crossings are roots of the
difference of two energies, bracketed on a grid of fields and polished as in `insensitive`; those at zero field are not
listed. Uncertainty of the field: that of the difference over the difference of the slopes.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from levels.errors import OutsideValidity
from levels.insensitive import roots
from levels.sensitivity import ENERGY
from levels.strongfield import TermConstants, solve_term_block, term_constants, term_ms
from levels.strongfield_spread import contributions, joined, spread_of
from levels.sublevels import LARGEST_FIELD_GAUSS
from levels.terms import Term

Array = NDArray[np.float64]
GRID_POINTS = 1025
MOST_PAIRS = 20_000


@dataclass(frozen=True, slots=True)
class State:
    """A sublevel of a term: the position of its level and its doubled F and m."""

    position: int
    twice_F: int
    twice_m: int


@dataclass(frozen=True, slots=True)
class Crossing:
    """Two sublevels that meet; `first` belongs to the level asked for. Energies from that level's centroid.

    `slope_difference_mhz_per_gauss` is that of `second` less `first`; the uncertainty is None where a constant without
    one could outweigh the rest.
    """

    first: State
    second: State
    field_gauss: float
    uncertainty_gauss: float | None
    energy_mhz: float
    slope_difference_mhz_per_gauss: float
    excludes: tuple[str, ...]


def states_of(constants: TermConstants) -> list[State]:
    """List every sublevel of a term by level, F and m."""
    found = []
    for position, one in enumerate(constants.levels):
        for F in range(abs(one.twice_J - one.twice_I), one.twice_J + one.twice_I + 1, 2):
            found += [State(position, F, m) for m in range(-F, F + 1, 2)]
    return found


def _solve(constants: TermConstants, states: list[State], fields: Array) -> tuple[Array, Array]:
    """Return energies and slopes of the states at n fields, shape (n, s) each."""
    energy, slope = np.empty((fields.size, len(states))), np.empty((fields.size, len(states)))
    place = {state: k for k, state in enumerate(states)}
    for twice_m in term_ms(constants):
        eigen = solve_term_block(constants, twice_m, fields)
        at = [place[State(position, F, twice_m)] for position, F in eigen.block.labels]
        energy[:, at], slope[:, at] = eigen.energy_mhz, eigen.slope_mhz_per_gauss()
    return energy, slope


def crossings(term: Term, max_field_gauss: float, max_twice_dm: int = 4) -> list[Crossing]:
    """Find every crossing of a level with itself or its partners, for 0 < |m - m'| <= `max_twice_dm`/2, by field."""
    if not 0 < max_field_gauss <= LARGEST_FIELD_GAUSS:
        raise OutsideValidity("max_field", max_field_gauss, f"above 0 and up to {LARGEST_FIELD_GAUSS:g} G")
    constants = term_constants(term)
    states = states_of(constants)
    pairs = _pairs(states, constants.own, max_twice_dm)
    if not pairs.size:
        return []
    grid = np.concatenate([np.linspace(0, 0.03, 65)[:-1] ** 2, np.linspace(0.03**2, 1, GRID_POINTS)]) * max_field_gauss
    energy, slope = _solve(constants, states, grid)
    i, j = pairs.T
    values, rates = energy[:, j] - energy[:, i], slope[:, j] - slope[:, i]
    rounding = 1e-12 * float(np.abs(energy).max())
    values[np.abs(values) <= rounding] = 0.0
    values[0] = np.where(values[0] == 0.0, values[1], values[0])  # what starts together does not cross there

    def numbers(column: NDArray[np.int64], field: Array) -> tuple[Array, Array]:
        return _differences(constants, states, pairs[column], field)

    columns, fields = roots(numbers, grid, values, rates)
    found = [
        _crossing(term, constants, states[i[c]], states[j[c]], float(b))
        for c, b in zip(columns, fields, strict=True)
        if b > 0
    ]
    return sorted(found, key=lambda one: one.field_gauss)


def _pairs(states: list[State], own: int, max_twice_dm: int) -> NDArray[np.int64]:
    pairs = [
        (a, b)
        for a, one in enumerate(states)
        for b, two in enumerate(states)
        if one.position == own and 0 < abs(one.twice_m - two.twice_m) <= max_twice_dm and (two.position != own or a < b)
    ]
    if len(pairs) > MOST_PAIRS:
        raise OutsideValidity("max_dm", max_twice_dm // 2, f"smaller: {len(pairs)} pairs are more than {MOST_PAIRS}")
    return np.array(pairs, dtype=np.int64)


def _differences(
    constants: TermConstants, states: list[State], pairs: NDArray[np.int64], field: Array
) -> tuple[Array, Array]:
    """Evaluate E(second) - E(first) and its slope, each pair at its own field."""
    result = np.zeros((2, field.size))
    for sign, end in ((-1.0, 0), (1.0, 1)):
        ms = np.array([states[k].twice_m for k in pairs[:, end]])
        for twice_m in np.unique(ms):
            rows = np.nonzero(ms == twice_m)[0]
            eigen = solve_term_block(constants, int(twice_m), field[rows])
            ends = [states[k] for k in pairs[rows, end]]
            at = np.arange(rows.size), [eigen.block.labels.index((one.position, one.twice_F)) for one in ends]
            result[0, rows] += sign * eigen.energy_mhz[at]
            result[1, rows] += sign * eigen.slope_mhz_per_gauss()[at]
    return result[0], result[1]


def _crossing(term: Term, constants: TermConstants, first: State, second: State, field_gauss: float) -> Crossing:
    field = np.array([field_gauss])
    eigen = solve_term_block(constants, first.twice_m, field)
    rank = eigen.block.labels.index((first.position, first.twice_F))
    slope = float(_differences(constants, [first, second], np.array([[0, 1]]), field)[1][0])
    up = contributions(term, field, [(second.twice_F, second.twice_m)], 1.0, second.position)
    low = contributions(term, field, [(first.twice_F, first.twice_m)], -1.0, first.position)
    spread = spread_of(joined(up, low))
    moved = float(spread.uncertainty[ENERGY, 0, 0])
    known = not np.isnan(moved) and slope != 0.0
    return Crossing(
        first,
        second,
        field_gauss,
        moved / abs(slope) if known else None,
        float(eigen.energy_mhz[0, rank]),
        slope,
        spread.excludes,
    )
