"""The hyperfine and Zeeman operators of one level, block by block in m.

All operators of H/h = A X + B Q + C O + (muB/h) B (g_J J_z + g_I I_z) conserve m = m_J + m_I, so each m is a small
real symmetric matrix of its own. Product states |m_J, m_I> of a block are ordered by rising m_J. The matrices depend on
J and I only and are cached read-only.

    X = I.J
    Q = [3 X^2 + 3/2 X - I(I+1)J(J+1)] / [2I(2I-1) J(2J-1)]
    O = [10 X^3 + 20 X^2 + 2 X (I(I+1) + J(J+1) + 3 - 3 I(I+1)J(J+1)) - 5 I(I+1)J(J+1)] / [I(I-1)(2I-1) J(J-1)(2J-1)]

Arimondo, Inguscio, Violino, Rev. Mod. Phys. 49, 31 (1977): in the stretched state Q = 1/4 and O = 1. Neglected: the
diamagnetic term, the mixing with other levels, hyperfine constants above the octupole.
"""

from collections.abc import Callable
from dataclasses import dataclass
from functools import lru_cache
from typing import Any

import numpy as np
from numpy.typing import NDArray

Matrix = NDArray[np.float64]
Product = Callable[[Any, Any], Any]


@dataclass(frozen=True, slots=True, eq=False)
class Block:
    """One value of m: its product states, its zero-field F labels and its operators, each of shape (d, d) or (d,)."""

    twice_J: int
    twice_I: int
    twice_m: int
    twice_mJ: tuple[int, ...]
    twice_mI: tuple[int, ...]
    twice_F: tuple[int, ...]
    dipole: Matrix
    quadrupole: Matrix
    octupole: Matrix
    J_z: Matrix
    I_z: Matrix

    @property
    def size(self) -> int:
        """How many sublevels have this m."""
        return len(self.twice_mJ)


def block_ms(twice_J: int, twice_I: int) -> range:
    """List every doubled m of a level, from the lowest."""
    return range(-twice_J - twice_I, twice_J + twice_I + 1, 2)


def _ladder(twice_j: int, twice_m: int) -> float:
    """Return <m+1|j_+|m>, zero at the top."""
    j, m = twice_j / 2, twice_m / 2
    return float(np.sqrt(max(j * (j + 1) - m * (m + 1), 0.0)))


def _dipole(twice_J: int, twice_I: int, twice_mJ: tuple[int, ...], twice_mI: tuple[int, ...]) -> Matrix:
    """Build I.J in a block; the neighbour one m_J up has m_I one down."""
    matrix = np.diag([mj * mi / 4 for mj, mi in zip(twice_mJ, twice_mI, strict=True)])
    for k in range(len(twice_mJ) - 1):
        flip = 0.5 * _ladder(twice_J, twice_mJ[k]) * _ladder(twice_I, twice_mI[k] - 2)
        matrix[k, k + 1] = matrix[k + 1, k] = flip
    return matrix


def quadrupole_of(product: Any, J: float, I: float, one: Any = 1.0, times: Product | None = None) -> Any:
    """Evaluate Q of the module's head as a polynomial in X = I.J (a matrix, or the number K/2 of one F)."""
    if J < 1 or I < 1:
        return 0.0 * product
    times = times or (lambda a, b: a * b)
    squares = I * (I + 1) * J * (J + 1)
    return (3 * times(product, product) + 1.5 * product - squares * one) / (2 * I * (2 * I - 1) * J * (2 * J - 1))


def octupole_of(product: Any, J: float, I: float, one: Any = 1.0, times: Product | None = None) -> Any:
    """Evaluate O of the module's head as a polynomial in X = I.J (a matrix, or the number K/2 of one F)."""
    if J < 1.5 or I < 1.5:
        return 0.0 * product
    times = times or (lambda a, b: a * b)
    nuclear, electronic = I * (I + 1), J * (J + 1)
    square = times(product, product)
    linear = 2 * (nuclear + electronic + 3 - 3 * nuclear * electronic)
    top = 10 * times(square, product) + 20 * square + linear * product - 5 * nuclear * electronic * one
    return top / (I * (I - 1) * (2 * I - 1) * J * (J - 1) * (2 * J - 1))


@lru_cache(maxsize=4096)
def block(twice_J: int, twice_I: int, twice_m: int) -> Block:
    """Build the block of one m."""
    lowest = max(-twice_J, twice_m - twice_I)
    highest = min(twice_J, twice_m + twice_I)
    twice_mJ = tuple(range(lowest, highest + 1, 2))
    twice_mI = tuple(twice_m - mj for mj in twice_mJ)
    J, I = twice_J / 2, twice_I / 2
    dipole = _dipole(twice_J, twice_I, twice_mJ, twice_mI)
    one = np.eye(len(twice_mJ))
    operators = (
        dipole,
        np.asarray(quadrupole_of(dipole, J, I, one, np.matmul)),
        np.asarray(octupole_of(dipole, J, I, one, np.matmul)),
        np.array(twice_mJ) / 2,
        np.array(twice_mI) / 2,
    )
    for operator in operators:
        operator.setflags(write=False)
    smallest_F = max(abs(twice_m), abs(twice_J - twice_I))
    return Block(
        twice_J, twice_I, twice_m, twice_mJ, twice_mI, tuple(range(smallest_F, twice_J + twice_I + 1, 2)), *operators
    )


def hyperfine_shift(
    twice_J: int, twice_I: int, twice_F: int, A_mhz: float, B_mhz: float = 0.0, C_mhz: float = 0.0
) -> float:
    """Compute the zero-field energy in MHz of one F above the centroid of its level.

    >>> round(hyperfine_shift(3, 3, 6, 84.7185, 12.4965), 5)  # 87Rb 5p 2P3/2, F = 3
    193.74075
    """
    J, I, F = twice_J / 2, twice_I / 2, twice_F / 2
    product = (F * (F + 1) - J * (J + 1) - I * (I + 1)) / 2
    return float(A_mhz * product + B_mhz * quadrupole_of(product, J, I) + C_mhz * octupole_of(product, J, I))


@lru_cache(maxsize=4096)
def hyperfine_weights(twice_J: int, twice_I: int, twice_F: int) -> tuple[float, float, float]:
    """Return dE/dA, dE/dB and dE/dC of one zero-field F: the weights that make its energy from A, B and C."""
    return (
        hyperfine_shift(twice_J, twice_I, twice_F, 1.0),
        hyperfine_shift(twice_J, twice_I, twice_F, 0.0, 1.0),
        hyperfine_shift(twice_J, twice_I, twice_F, 0.0, 0.0, 1.0),
    )
