"""The optical coherences of the Bloch equations eliminated exactly, for steady states.

Light joins two sets of sublevels, A and B (odd and even parity). In the basis of the field's eigenstates each optical
coherence c_ij (i in B, j in A) obeys dc/dt = -c/K - i (V a - b V) with a plain number 1/K_ij = D_ij + i (E_i - E_j), so
in the steady state c = -i K o (V a - b V), elementwise, and the blocks a = rho_AA and b = rho_BB are left with

    0 = ... - V^+ (K o (V a - b V)) + h.c.   and   0 = ... + (K o (V a - b V)) V^+ + h.c.

beside their own precession, decay and repopulation. For the 24 sublevels of a D2 line of spin 3/2 that leaves 320
unknowns of 576, and only those that `bloch.reachable` finds are kept.
"""

from collections.abc import Iterable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.sparse import csc_matrix
from scipy.sparse.csgraph import connected_components

from levels.bloch import (
    Array,
    Bloch,
    Complex,
    Indices,
    Triplets,
    index_table,
    jump_triplets,
    real_triplets,
    to_complex,
)


@dataclass(frozen=True, slots=True, eq=False)
class Reduced:
    """The equations for the blocks A and B alone, as triplets over an index table."""

    table: Indices
    rows: Indices
    columns: Indices
    values: Array
    lower: Indices
    upper: Indices
    link: Complex  # V, shape (upper, lower)
    response: Complex  # K, same shape

    @property
    def size(self) -> int:
        """How many real unknowns there are."""
        return int(self.table.max()) + 1


def two_sets(bloch: Bloch) -> NDArray[np.bool_] | None:
    """Tell which sublevels belong to set B, or return None when the light joins no two sets."""
    N = bloch.size
    links = bloch.coupling != 0
    doubled = csc_matrix(np.block([[np.zeros_like(links), links], [links, np.zeros_like(links)]]))
    _, part = connected_components(doubled, directed=False)
    if np.any(part[:N] == part[N:]):
        return None
    upper: NDArray[np.bool_] = part[:N] > part[N:]
    return upper


def reduce(bloch: Bloch, upper: NDArray[np.bool_], pattern: NDArray[np.bool_]) -> Reduced:
    """Eliminate the optical coherences."""
    B, A = np.flatnonzero(upper), np.flatnonzero(~upper)
    same = upper[:, None] == upper[None, :]
    table = index_table(pattern & same)
    V = bloch.coupling[np.ix_(B, A)]
    energy = bloch.energy[B][:, None] - bloch.energy[A][None, :]
    slowness = bloch.coherence_decay[np.ix_(B, A)] + 1j * energy
    K = np.divide(1.0, slowness, out=np.zeros_like(slowness), where=slowness != 0)
    parts = (_own(bloch, same & pattern), *jump_triplets(bloch), *_exchange(V, K, A, B), *_loss(V, K, A, B, pattern))
    rows, columns, values = real_triplets(parts, table)
    return Reduced(table, rows, columns, values, A, B, V, K)


def _own(bloch: Bloch, inside: NDArray[np.bool_]) -> Triplets:
    j, k = np.nonzero(np.triu(inside))
    return j, k, j, k, -1j * (bloch.energy[j] - bloch.energy[k]) - bloch.coherence_decay[j, k]


def _exchange(V: Complex, K: Complex, A: Indices, B: Indices) -> Iterable[Triplets]:
    """Give what light brings from b to a and from a to b, each with its hermitian conjugate."""
    i, j = np.nonzero(V)
    v = V[i, j]
    p, q = np.nonzero(j[:, None] <= j[None, :])
    yield A[j[p]], A[j[q]], B[i[p]], B[i[q]], v.conj()[p] * v[q] * (K[i[p], j[q]] + K[i[q], j[p]].conj())
    p, q = np.nonzero(i[:, None] <= i[None, :])
    yield B[i[p]], B[i[q]], A[j[p]], A[j[q]], v[p] * v.conj()[q] * (K[i[p], j[q]] + K[i[q], j[p]].conj())


def _loss(V: Complex, K: Complex, A: Indices, B: Indices, pattern: NDArray[np.bool_]) -> Iterable[Triplets]:
    """Give what light takes from a and b: -V^+ (K o V a) and -(K o b V) V^+, with their hermitian conjugates."""
    below = K.T @ (V.conj()[:, :, None] * V[:, None, :]).reshape(
        B.size, -1
    )  # k, then (j, l): row (j, k), column (l, k)
    yield _one_sided(-below.conj(), A, pattern)
    above = K @ (V.T[:, :, None] * V.T.conj()[:, None, :]).reshape(
        A.size, -1
    )  # i, then (p, m): row (i, m), column (i, p)
    yield _one_sided(-above.reshape(B.size, B.size, B.size).swapaxes(1, 2), B, pattern)


def _one_sided(value: Complex, at: Indices, pattern: NDArray[np.bool_]) -> Triplets:
    """List rho[i, m] += value[i, m, p] rho[i, p] + h.c. by rows on or above the diagonal."""
    value = value.reshape(at.size, at.size, at.size)
    inside = pattern[np.ix_(at, at)]
    i, m, p = np.nonzero((value != 0) & inside[:, :, None] & inside[:, None, :])
    found = value[i, m, p]
    found = np.where(i > m, found.conj(), np.where(i == m, 2 * found, found))
    upright = i <= m
    row, column = np.where(upright, i, m), np.where(upright, m, i)
    return at[row], at[column], at[np.where(upright, i, p)], at[np.where(upright, p, i)], found


def optical_part(reduced: Reduced, rho: Complex) -> Complex:
    """Return c = -i K o (V a - b V), the optical coherences (upper, lower) that belong to the blocks."""
    a, b = rho[np.ix_(reduced.lower, reduced.lower)], rho[np.ix_(reduced.upper, reduced.upper)]
    result: Complex = -1j * reduced.response * (reduced.link @ a - b @ reduced.link)
    return result


def with_optical(reduced: Reduced, values: Array) -> Complex:
    """Make the whole density matrix from the unknowns of the two blocks."""
    rho = to_complex(values, reduced.table)
    c = optical_part(reduced, rho)
    rho[np.ix_(reduced.upper, reduced.lower)] = c
    rho[np.ix_(reduced.lower, reduced.upper)] = c.conj().T
    return rho
