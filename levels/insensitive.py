"""Fields where two sublevels move together, and the field that a measured splitting tells.

Both are roots of smooth functions of the field: of the difference of two slopes, and of a splitting less its measured
value. Roots are bracketed on a grid and polished on the function itself (never a minimum of the energy, which double
precision blurs). Between grid points a pair of roots can hide: there the derivative changes sign, so the turning point
is found first and its sign compared.
"""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from levels.errors import OutsideValidity
from levels.records import Level
from levels.sensitivity import ENERGY, SLOPE, Spread, add_terms, movement, spread, terms_of
from levels.sublevels import (
    LARGEST_FIELD_GAUSS,
    Constants,
    as_fields,
    constants_of,
    find_sublevel,
    solve_block,
    sublevels,
    zero_field_mhz,
)

Array = NDArray[np.float64]
Label = tuple[int, int]
GRID_POINTS = 4097
POLISHING_STEPS = 100
Numbers = Callable[[NDArray[np.int64], Array], tuple[Array, Array]]


@dataclass(frozen=True, slots=True, eq=False)
class Insensitive:
    """A pair of sublevels whose difference stops moving at `field_gauss`; labels are (2F, 2m).

    `difference_mhz` is E(upper) - E(lower) there, each from the centroid of its own level; `quadratic_hz_per_gauss2`
    is the coefficient of (B - B0)^2.
    """

    lower: Label
    upper: Label
    field_gauss: float
    field_uncertainty_gauss: float
    difference_mhz: float
    quadratic_hz_per_gauss2: float
    spread: Spread


@dataclass(frozen=True, slots=True, eq=False)
class FieldFound:
    """A field that gives a measured splitting, with its standard uncertainty (None at a turning point, or unknown)."""

    field_gauss: float
    uncertainty_gauss: float | None
    slope_mhz_per_gauss: float
    excludes: tuple[str, ...]


def field_grid(constants: Constants, max_field_gauss: float) -> Array:
    """Lay grid points from 0 to the largest field, denser where the hyperfine structure still matters."""
    if not 0 < max_field_gauss <= LARGEST_FIELD_GAUSS:
        raise OutsideValidity("max_field", max_field_gauss, f"above 0 and up to {LARGEST_FIELD_GAUSS:g} G")
    J, I = constants.twice_J / 2, constants.twice_I / 2
    scale = max(abs(constants.A_mhz) * max(I * J, 1), abs(constants.B_mhz), 1e-6 * max_field_gauss) / 1.4
    knee = min(scale / 10, max_field_gauss)
    grid: Array = knee * np.sinh(np.linspace(0, np.arcsinh(max_field_gauss / knee), GRID_POINTS))
    grid[-1] = max_field_gauss
    return grid


def roots(
    numbers: Numbers, grid: Array, values: Array, derivatives: Array, rounding: float = 0.0
) -> tuple[NDArray[np.int64], Array]:
    """Find every root of every column, including two that share one grid interval.

    `values` and `derivatives` have shape (n, c) on the grid; `numbers(column, field)` evaluates both at one field per
    column. A turning point no further from zero than `rounding` is a root. Returns the columns and the fields of the
    roots.
    """
    low, column = _sign_changes(derivatives)
    same_sign = np.sign(values[low, column]) == np.sign(values[low + 1, column])
    low, column = low[same_sign], column[same_sign]
    turning = _polish(lambda c, b: numbers(c, b)[1], column, grid[low], grid[low + 1], derivatives[low, column])
    at_turning = numbers(column, turning)[0] if column.size else np.empty(0)
    touching = np.abs(at_turning) <= rounding
    hidden = ~touching & (np.sign(at_turning) * np.sign(values[low, column]) < 0)
    first, which = _sign_changes(values)
    columns = np.concatenate([which, column[hidden], column[hidden]])
    lows = np.concatenate([grid[first], grid[low[hidden]], turning[hidden]])
    highs = np.concatenate([grid[first + 1], turning[hidden], grid[low[hidden] + 1]])
    at_low = np.concatenate([values[first, which], values[low[hidden], column[hidden]], at_turning[hidden]])
    found = _polish(lambda c, b: numbers(c, b)[0], columns, lows, highs, at_low)
    zero_rows, zero_columns = np.nonzero(values == 0)
    return (
        np.concatenate([columns, column[touching], zero_columns]),
        np.concatenate([found, turning[touching], grid[zero_rows]]),
    )


def _sign_changes(values: Array) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    rows, columns = np.nonzero(np.sign(values[:-1]) * np.sign(values[1:]) < 0)
    return rows, columns


def _polish(
    value: Callable[[NDArray[np.int64], Array], Array],
    column: NDArray[np.int64],
    low: Array,
    high: Array,
    at_low: Array,
) -> Array:
    """Shrink all brackets together by bisection with a secant step (Dowell and Jarratt, BIT 11, 168, 1971)."""
    low, high, f_low = low.copy(), high.copy(), at_low.copy()
    if not low.size:
        return low
    f_high = value(column, high)
    for _ in range(POLISHING_STEPS):
        with np.errstate(divide="ignore", invalid="ignore"):
            middle = high - f_high * (high - low) / (f_high - f_low)
        inside = (middle > low) & (middle < high)
        middle = np.where(inside, middle, (low + high) / 2)
        f = value(column, middle)
        left = np.sign(f) == np.sign(f_low)
        # Illinois step: halving the kept end's value keeps the secant from creeping up on one side.
        f_low, f_high = np.where(left, f, f_low / 2), np.where(left, f_high / 2, f)
        low, high = np.where(left, middle, low), np.where(left, high, middle)
        exact = f == 0
        low, high = np.where(exact, middle, low), np.where(exact, middle, high)
        if np.all((high - low <= 4 * np.finfo(float).eps * np.maximum(high, 1e-300)) | exact):
            break
    return (low + high) / 2


def insensitive(lower: Level, upper: Level, max_field_gauss: float, max_twice_dm: int = 4) -> list[Insensitive]:
    """Find every field-insensitive pair between two levels, or within one, from 0 to a largest field.

    Pairs whose m differ by at most `max_twice_dm`/2; inside one level a pair counts once, the sublevel of lower energy
    as `lower`. A pair of m = 0 sublevels is stationary at zero field and is listed there. Sorted by field.
    """
    below, above = constants_of(lower), constants_of(upper)
    grid = field_grid(below if abs(below.A_mhz) > abs(above.A_mhz) else above, max_field_gauss)
    low, up = sublevels(lower, grid), sublevels(upper, grid)
    pairs = _pairs(low.twice_m, up.twice_m, max_twice_dm, lower == upper)
    if not pairs.size:
        return []
    i, j = pairs.T
    value = up.slope_mhz_per_gauss[:, j] - low.slope_mhz_per_gauss[:, i]
    rate = up.quadratic_hz_per_gauss2[:, j] - low.quadratic_hz_per_gauss2[:, i]
    still_moving = np.abs(value).max(axis=0) > 1e-12
    pairs, value, rate = pairs[still_moving], value[:, still_moving], rate[:, still_moving]
    value[0, np.abs(value[0]) < 1e-13] = 0.0
    labels = [((int(low.twice_F[a]), int(low.twice_m[a])), (int(up.twice_F[b]), int(up.twice_m[b]))) for a, b in pairs]

    def numbers(column: NDArray[np.int64], field: Array) -> tuple[Array, Array]:
        return _slopes(below, above, [labels[c] for c in column], field)

    columns, fields = roots(numbers, grid, value, rate)
    found = [_insensitive(lower, upper, labels[c], float(b)) for c, b in zip(columns, fields, strict=True)]
    return sorted(found, key=lambda point: (point.field_gauss, point.lower, point.upper))


def _pairs(low_m: NDArray[np.int64], up_m: NDArray[np.int64], max_twice_dm: int, same: bool) -> NDArray[np.int64]:
    i, j = np.meshgrid(np.arange(low_m.size), np.arange(up_m.size), indexing="ij")
    wanted = np.abs(up_m[j] - low_m[i]) <= max_twice_dm
    if same:
        wanted &= i < j
    return np.stack([i[wanted], j[wanted]], axis=1)


def _slopes(below: Constants, above: Constants, labels: list[tuple[Label, Label]], field: Array) -> tuple[Array, Array]:
    """Evaluate slope and curvature of each pair at its own field."""
    result = np.zeros((2, field.size))
    for sign, constants, end in ((-1.0, below, 0), (1.0, above, 1)):
        ms = np.array([pair[end][1] for pair in labels])
        for twice_m in np.unique(ms):
            rows = np.nonzero(ms == twice_m)[0]
            eigen = solve_block(constants, int(twice_m), field[rows])
            ranks = [eigen.twice_F.index(labels[row][end][0]) for row in rows]
            at = (np.arange(rows.size), ranks)
            result[0, rows] += sign * eigen.slope_mhz_per_gauss()[at]
            result[1, rows] += sign * eigen.quadratic_mhz_per_gauss2()[at]
    return result[0], result[1]


@dataclass(frozen=True, slots=True, eq=False)
class Difference:
    """E(upper) - E(lower) of two sublevels at one field, with its slope, quadratic coefficient and uncertainties."""

    difference_mhz: float
    slope_mhz_per_gauss: float
    quadratic_hz_per_gauss2: float
    spread: Spread


def difference(lower: Level, low: Label, upper: Level, up: Label, field_gauss: float) -> Difference:
    """Solve the difference of two sublevels, of one level or two, each counted from its own level's centroid."""
    fields = as_fields(field_gauss)
    below, above = constants_of(lower), constants_of(upper)
    rank_low, rank_up = find_sublevel(below, *low), find_sublevel(above, *up)
    one, two = solve_block(below, low[1], fields), solve_block(above, up[1], fields)
    terms = add_terms(
        terms_of(upper, movement(two, fields, [rank_up])), terms_of(lower, movement(one, fields, [rank_low]), sign=-1.0)
    )
    return Difference(
        float(two.energy_mhz[0, rank_up] - one.energy_mhz[0, rank_low]),
        float(two.slope_mhz_per_gauss()[0, rank_up] - one.slope_mhz_per_gauss()[0, rank_low]),
        float(two.quadratic_mhz_per_gauss2()[0, rank_up] - one.quadratic_mhz_per_gauss2()[0, rank_low]) * 1e6,
        spread(terms),
    )


def _insensitive(lower: Level, upper: Level, labels: tuple[Label, Label], field_gauss: float) -> Insensitive:
    low, up = labels
    at = difference(lower, low, upper, up, field_gauss)
    if lower == upper and at.difference_mhz < 0:
        low, up = up, low
        at = difference(lower, low, upper, up, field_gauss)
    quadratic = at.quadratic_hz_per_gauss2
    # The root moves by ds/(2q) when the slope moves by ds.
    moved = float(at.spread.uncertainty[SLOPE, 0, 0]) / (2e-6 * abs(quadratic)) if quadratic and field_gauss else 0.0
    return Insensitive(low, up, field_gauss, moved, at.difference_mhz, quadratic, at.spread)


def fields_from_splitting(
    lower: Level,
    low: Label,
    upper: Level,
    up: Label,
    splitting_mhz: float,
    max_field_gauss: float,
    splitting_uncertainty_mhz: float = 0.0,
) -> list[FieldFound]:
    """Find every field from 0 to a largest one at which two sublevels differ by a measured splitting.

    Within one level the splitting is taken without sign; between two levels it is E(upper) - E(lower), each from its
    own level's centroid (the offset from the line's centroid). The uncertainty joins that of the measurement and that
    of the constants; at a turning point it is None, since the splitting tells nothing there to first order.
    """
    below, above = constants_of(lower), constants_of(upper)
    find_sublevel(below, *low), find_sublevel(above, *up)
    if lower == upper:
        at_zero = zero_field_mhz(above, up[0]) - zero_field_mhz(below, low[0])
        sign = np.sign(at_zero) or np.sign(_slopes(below, above, [(low, up)], np.zeros(1))[0][0]) or 1.0
        splitting_mhz = float(sign) * abs(splitting_mhz)
    grid = field_grid(below if abs(below.A_mhz) > abs(above.A_mhz) else above, max_field_gauss)

    def numbers(column: NDArray[np.int64], field: Array) -> tuple[Array, Array]:
        energy = _energies(above, up, field) - _energies(below, low, field)
        return energy - splitting_mhz, _slopes(below, above, [(low, up)] * field.size, field)[0]

    values, derivatives = numbers(np.zeros(grid.size, dtype=np.int64), grid)
    rounding = 8 * np.finfo(float).eps * (abs(splitting_mhz) + float(np.abs(values).max()))
    values[0] *= abs(values[0]) > rounding
    _, fields = roots(numbers, grid, values[:, None], derivatives[:, None], rounding)
    return [
        _field_found(difference(lower, low, upper, up, float(b)), float(b), splitting_uncertainty_mhz)
        for b in sorted(fields)
    ]


def _energies(constants: Constants, label: Label, field: Array) -> Array:
    eigen = solve_block(constants, label[1], field)
    energy: Array = eigen.energy_mhz[:, eigen.twice_F.index(label[0])]
    return energy


def _field_found(at: Difference, field_gauss: float, splitting_uncertainty_mhz: float) -> FieldFound:
    slope = at.slope_mhz_per_gauss
    spread_mhz = float(np.hypot(splitting_uncertainty_mhz, at.spread.uncertainty[ENERGY, 0, 0]))
    # Where the curvature over one uncertainty outweighs the slope, the first-order formula says nothing.
    known = not np.isnan(spread_mhz)
    first_order = known and abs(slope) > 1e-12 and abs(at.quadratic_hz_per_gauss2) * 1e-6 * spread_mhz < slope**2
    return FieldFound(field_gauss, spread_mhz / abs(slope) if first_order else None, slope, at.spread.excludes)
