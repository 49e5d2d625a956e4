"""A sum of simple poles, and every root of it in a range.

f(x) = constant + sum_i weight_i / (pole_i - x), weights of either sign. Roots are isolated by halving cells until a
bound on the second derivative proves that a cell holds none, or that f is monotone in it. So none is missed, however
close two of them lie, down to cells of `FINEST` (there a touching root is told by a value within rounding). Stretches
within a clearance of a pole are left out of the range.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.optimize import brentq

Array = NDArray[np.float64]
FINEST = 1e-12  # of the largest abscissa
ROUNDING = 64 * np.finfo(float).eps
MOST_HALVINGS = 60
CANCELLED = 1e-13  # of the weights that met at one pole


@dataclass(frozen=True, slots=True, eq=False)
class Rational:
    """A constant and simple poles; `clearance` is how far around each pole the function means nothing."""

    pole: Array
    weight: Array
    clearance: Array
    constant: float = 0.0

    def value(self, x: ArrayLike) -> Array:
        """Evaluate at n points."""
        at = np.atleast_1d(np.asarray(x, dtype=np.float64))
        total: Array = self.constant + (self.weight / (self.pole - at[:, None])).sum(axis=1)
        return total

    def slope(self, x: ArrayLike) -> Array:
        """Evaluate the derivative at n points."""
        at = np.atleast_1d(np.asarray(x, dtype=np.float64))
        total: Array = (self.weight / (self.pole - at[:, None]) ** 2).sum(axis=1)
        return total


@dataclass(frozen=True, slots=True, eq=False)
class Roots:
    """The roots in a range, rising; `vanishes` when the function is zero everywhere, as far as rounding tells."""

    roots: tuple[float, ...]
    vanishes: bool = False


def minus(first: Rational, second: Rational) -> Rational:
    """Return the difference of two sums of poles."""
    return Rational(
        np.concatenate([first.pole, second.pole]),
        np.concatenate([first.weight, -second.weight]),
        np.concatenate([first.clearance, second.clearance]),
        first.constant - second.constant,
    )


def merged(function: Rational) -> Rational:
    """Join equal poles; those whose weights cancel drop out."""
    pole, inverse = np.unique(function.pole, return_inverse=True)
    weight, size = np.zeros(pole.size), np.zeros(pole.size)
    clearance = np.zeros(pole.size)
    np.add.at(weight, inverse, function.weight)
    np.add.at(size, inverse, np.abs(function.weight))
    np.maximum.at(clearance, inverse, function.clearance)
    kept = np.abs(weight) > CANCELLED * size
    return Rational(pole[kept], weight[kept], clearance[kept], function.constant)


def stretches(function: Rational, low: float, high: float) -> list[tuple[float, float]]:
    """List the parts of a range outside every pole's clearance."""
    order = np.argsort(function.pole - function.clearance)
    parts, start = [], low
    for pole, clear in zip(function.pole[order], function.clearance[order], strict=True):
        if pole + clear <= start:
            continue
        if pole - clear >= high:
            break
        if pole - clear > start:
            parts.append((start, float(pole - clear)))
        start = max(start, float(pole + clear))
    if start < high:
        parts.append((start, high))
    return parts


def every_root(function: Rational, low: float, high: float) -> Roots:
    """Find every root from `low` to `high` outside the clearances."""
    whole, function = function, merged(function)
    if not function.pole.size and function.constant == 0.0:
        return Roots((), vanishes=True)
    cells = np.array(stretches(whole, low, high)).reshape(-1, 2)
    finest = FINEST * max(abs(low), abs(high))
    found: list[float] = []
    vanished = 0.0
    for _ in range(MOST_HALVINGS):
        if not cells.size:
            break
        middle, half = cells.mean(axis=1), (cells[:, 1] - cells[:, 0]) / 2
        value, slope, bend, noise = _about(function, cells, middle)
        reach = np.abs(slope) * half + bend * half**2 / 2
        flat = (np.abs(value) + reach < noise) & (half > finest)
        vanished += float(2 * half[flat].sum())
        none = np.abs(value) > reach
        monotone = ~none & (np.abs(slope) > bend * half)
        found += [root for cell in cells[monotone & ~flat] for root in _crossing(function, cell)]
        open_ = ~none & ~monotone & ~flat
        small = open_ & (half <= finest)
        found += [float(at) for at in middle[small & (np.abs(value) <= noise)]]
        halved = cells[open_ & ~small]
        centre = halved.mean(axis=1)
        cells = np.concatenate([np.stack([halved[:, 0], centre], 1), np.stack([centre, halved[:, 1]], 1)])
    return Roots(tuple(_distinct(sorted(found), 4 * finest)), vanished > 0.5 * (high - low))


def _about(function: Rational, cells: Array, middle: Array) -> tuple[Array, Array, Array, Array]:
    """Evaluate value and slope in the middle of cells, a bound on |f''| within them, and the value's rounding."""
    gap = function.pole - middle[:, None]
    part = function.weight / gap
    nearest = np.maximum(function.pole - cells[:, 1:], cells[:, :1] - function.pole)
    bend = 2 * (np.abs(function.weight) / np.maximum(nearest, 1e-300) ** 3).sum(axis=1)
    sizes = np.abs(part) * (1 + np.abs(middle[:, None] / gap))
    noise = ROUNDING * (sizes.sum(axis=1) + abs(function.constant))
    return function.constant + part.sum(axis=1), (part / gap).sum(axis=1), bend, noise


def _crossing(function: Rational, cell: Array) -> list[float]:
    low, high = float(cell[0]), float(cell[1])
    at_low, at_high = (float(number) for number in function.value(cell))
    if at_low == 0.0:
        return [low]
    if at_high == 0.0:
        return [high]
    if (at_low < 0) == (at_high < 0):
        return []
    return [float(brentq(lambda x: float(function.value(x)[0]), low, high, xtol=1e-9, rtol=1e-15))]


def _distinct(rising: list[float], apart: float) -> list[float]:
    kept: list[float] = []
    for root in rising:
        if not kept or root - kept[-1] > apart:
            kept.append(root)
    return kept
