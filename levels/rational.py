"""A sum of simple poles, and every root of it in a range.

f(x) = constant + sum_i weight_i / (pole_i - x), weights of either sign. Roots are isolated by halving cells until a
bound on the second derivative proves that a cell holds none, or that f is monotone in it. So none is missed, however
close two of them lie, down to cells of `FINEST` (there a touching root is told by a value within rounding). Where the
function cancels so well that this takes more than `MOST_CELLS`, only changes of sign between cells are found, and
`Roots.proved` is False. Stretches within a clearance of a pole are left out of the range.
"""

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import ArrayLike, NDArray

Array = NDArray[np.float64]
FINEST = 1e-12  # of the largest abscissa
ROUNDING = 64 * np.finfo(float).eps
MOST_HALVINGS = 60
MOST_CELLS = 50_000
CLUSTERS = (0.0, 1e-10, 1e-8)  # of the largest abscissa: closer poles are bounded together, so that they may cancel
SAME_POLE = 1e-14  # relative: closer ones are one pole
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
    proved: bool = True


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
    order = np.argsort(function.pole)
    rising = function.pole[order]
    starts = np.diff(rising, prepend=-np.inf) > SAME_POLE * np.abs(rising)
    group = np.cumsum(starts) - 1
    weight, size, clearance = (np.zeros(int(starts.sum())) for _ in range(3))
    np.add.at(weight, group, function.weight[order])
    np.add.at(size, group, np.abs(function.weight[order]))
    np.maximum.at(clearance, group, function.clearance[order])
    kept = np.abs(weight) > CANCELLED * size
    return Rational(rising[starts][kept], weight[kept], clearance[kept], function.constant)


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
    finest = FINEST * max(abs(low), abs(high))
    function = replace(function, clearance=np.maximum(function.clearance, finest))
    cells = np.array(stretches(function, low, high)).reshape(-1, 2)
    function = merged(function)
    if not function.pole.size and function.constant == 0.0:
        return Roots((), vanishes=True)
    clusters = [_clusters(function, width * max(abs(low), abs(high))) for width in CLUSTERS]
    found: list[float] = []
    vanished = 0.0
    for _ in range(MOST_HALVINGS):
        if not cells.size or len(cells) > MOST_CELLS:
            break
        middle, half = cells.mean(axis=1), (cells[:, 1] - cells[:, 0]) / 2
        value, slope, bend, noise = _about(function, clusters, cells, middle)
        reach = np.abs(slope) * half + bend * half**2 / 2
        flat = np.abs(value) + reach < noise
        vanished += float(2 * half[flat].sum())
        none = flat | (np.abs(value) > reach)
        monotone = ~none & (np.abs(slope) > bend * half)
        found += [root for cell in cells[monotone] for root in _crossing(function, cell)]
        undecided = ~none & ~monotone
        small = undecided & (half <= finest)
        found += [root for cell in _changing(function, cells[small]) for root in _crossing(function, cell)]
        found += [float(at) for at in middle[small & (np.abs(value) <= noise)]]
        halved = cells[undecided & ~small]
        centre = halved.mean(axis=1)
        cells = np.concatenate([np.stack([halved[:, 0], centre], 1), np.stack([centre, halved[:, 1]], 1)])
    found += [root for cell in _changing(function, cells) for root in _crossing(function, cell)]
    return Roots(tuple(_distinct(sorted(found), 4 * finest)), vanished > 0.5 * (high - low), not cells.size)


@dataclass(frozen=True, slots=True, eq=False)
class _Clusters:
    """Poles that lie close together: lowest and highest of each group, sum of weights, sum |weight||pole - middle|."""

    lowest: Array
    highest: Array
    weight: Array
    moment: Array


def _clusters(function: Rational, width: float) -> _Clusters:
    """Group the (rising) poles of a merged function."""
    starts = np.nonzero(np.diff(function.pole, prepend=-np.inf) > width)[0]
    if not starts.size:
        return _Clusters(*(np.zeros(0) for _ in range(4)))
    ends = np.append(starts[1:], function.pole.size) - 1
    lowest, highest = function.pole[starts], function.pole[ends]
    group = np.repeat(np.arange(starts.size), ends - starts + 1)
    away = np.abs(function.pole - ((lowest + highest) / 2)[group])
    return _Clusters(
        lowest,
        highest,
        np.add.reduceat(function.weight, starts),
        np.add.reduceat(np.abs(function.weight) * away, starts),
    )


def _changing(function: Rational, cells: Array) -> Array:
    """Keep the cells at whose ends the function has different signs."""
    if not cells.size:
        return cells
    ends = np.sign(function.value(cells.ravel())).reshape(-1, 2)
    kept: Array = cells[ends[:, 0] * ends[:, 1] <= 0]
    return kept


def _bend(clusters: _Clusters, cells: Array) -> Array:
    """Bound |f''| within cells: 2|sum of weights|/d^3 + 6 moment/d^4 of each cluster at distance d; inf inside one."""
    distance = np.maximum(clusters.lowest - cells[:, 1:], cells[:, :1] - clusters.highest)
    near = np.maximum(distance, 1e-60)
    bounds: Array = (2 * np.abs(clusters.weight) / near**3 + 6 * clusters.moment / near**4).sum(axis=1)
    return bounds


def _about(
    function: Rational, clusters: Sequence[_Clusters], cells: Array, middle: Array
) -> tuple[Array, Array, Array, Array]:
    """Evaluate value and slope in the middle of cells, a bound on |f''| within them, and the value's rounding."""
    gap = function.pole - middle[:, None]
    part = function.weight / gap
    bend = np.min([_bend(group, cells) for group in clusters], axis=0)
    noise = ROUNDING * (np.abs(part).sum(axis=1) + abs(function.constant))
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
    return [_polished(function, low, high, at_low < 0)]


def _polished(function: Rational, low: float, high: float, rising: bool) -> float:
    """Close in on the root of a monotone cell by Newton's method, by halving where that leaves the cell."""
    x = (low + high) / 2
    for _ in range(2 * MOST_HALVINGS):
        value, slope = float(function.value(x)[0]), float(function.slope(x)[0])
        if value == 0.0:
            return x
        low, high = (x, high) if (value < 0) == rising else (low, x)
        step = x - value / slope if slope else x
        following = step if low < step < high else (low + high) / 2
        if abs(following - x) <= 2 * np.spacing(abs(x)) or following in (low, high):
            return following
        x = following
    return x


def _distinct(rising: list[float], apart: float) -> list[float]:
    kept: list[float] = []
    for root in rising:
        if not kept or root - kept[-1] > apart:
            kept.append(root)
    return kept
