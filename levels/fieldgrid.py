"""Evaluates smooth columns on a long field grid from a few exact points.

Energies, slopes, quadratic coefficients and strengths of adiabatic sublevels are analytic functions of the field, since
levels of one m-block never meet. On a long grid they are therefore computed exactly at Chebyshev points of as many
intervals as it takes, and read off the interpolating polynomials in between. An interval is accepted only when its
last coefficients have sunk to rounding error for every column, and is halved otherwise; where halving does not pay, the
columns are computed directly. Trefethen, Approximation Theory and Approximation Practice (2013), chapters 3, 8 and 16.
"""

from collections.abc import Callable
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]
Columns = Callable[[Array], Array]

POINTS = 32
TAIL = 3
WORTH_IT = 3 * POINTS  # grid points in an interval below which the direct way is as quick


@lru_cache(maxsize=1)
def chebyshev() -> tuple[Array, Array]:
    """Return the Chebyshev points with both ends and the matrix from values there to coefficients.

    With both ends among the points no avoided crossing, however narrow, hides between the last point and the end.
    """
    angles = np.pi * np.arange(POINTS) / (POINTS - 1)
    matrix = 2.0 / (POINTS - 1) * np.cos(np.outer(np.arange(POINTS), angles))
    matrix[[0, -1]] /= 2
    matrix[:, [0, -1]] /= 2
    return np.cos(angles), matrix


def on_grid(columns: Columns, fields: Array, tolerance: Array) -> Array:
    """Evaluate `columns` at every field, shape (n, c), to a `tolerance` relative to each column group's size.

    `columns` maps fields (n,) to values (n, c) and must be analytic in the field; `tolerance` has shape (c,) and is
    absolute, in the units of its column.
    """
    if fields.size < 2 * WORTH_IT:
        return columns(fields)
    order = np.argsort(fields, kind="stable")
    rising = fields[order]
    values = np.empty((fields.size, tolerance.size))
    pending = [(0, fields.size, float(rising[0]), float(rising[-1]))]
    while pending:
        pending = _round(columns, rising, tolerance, values, pending)
    result = np.empty_like(values)
    result[order] = values
    return result


def _round(
    columns: Columns, fields: Array, tolerance: Array, values: Array, pending: list[tuple[int, int, float, float]]
) -> list[tuple[int, int, float, float]]:
    """Fill what one round can fill; return the halves of the intervals that were not smooth enough."""
    direct = [piece for piece in pending if piece[1] - piece[0] < WORTH_IT or not piece[3] > piece[2]]
    fitted = [piece for piece in pending if piece not in direct]
    if direct:
        rows = np.concatenate([np.arange(first, last) for first, last, _, _ in direct])
        values[rows] = columns(fields[rows])
    if not fitted:
        return []
    points, to_coefficients = chebyshev()
    nodes = np.concatenate([(low + high) / 2 + (high - low) / 2 * points for _, _, low, high in fitted])
    at_nodes = columns(nodes).reshape(len(fitted), POINTS, -1)
    halves = []
    for piece, samples in zip(fitted, at_nodes, strict=True):
        coefficients = to_coefficients @ samples
        if np.all(np.abs(coefficients[-TAIL:]) <= tolerance):
            first, last, low, high = piece
            position = (2 * fields[first:last] - low - high) / (high - low)
            values[first:last] = np.polynomial.chebyshev.chebvander(position, POINTS - 1) @ coefficients
        else:
            halves += _halved(fields, piece)
    return halves


def _halved(fields: Array, piece: tuple[int, int, float, float]) -> list[tuple[int, int, float, float]]:
    first, last, low, high = piece
    middle = (low + high) / 2
    cut = first + int(np.searchsorted(fields[first:last], middle))
    return [part for part in ((first, cut, low, middle), (cut, last, middle, high)) if part[1] > part[0]]
