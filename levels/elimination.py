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

from levels.bloch import (
    Array,
    Bloch,
    Complex,
    Indices,
    Triplets,
    generator,
    index_table,
    jump_triplets,
    reachable,
    real_triplets,
    to_complex,
    to_real,
)
from levels.errors import OutsideValidity

LARGEST_UNKNOWNS = 6000


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
    """Tell which sublevels belong to set B, or return None when the light joins no two sets.

    Whole groups (levels) are coloured in turn: each the other colour than those that light joins it to.
    """
    rows, columns = np.nonzero(bloch.coupling)
    linked = np.zeros((int(bloch.group.max()) + 1,) * 2, dtype=np.bool_)
    linked[bloch.group[rows], bloch.group[columns]] = True
    colour = np.full(linked.shape[0], -1)
    for first in range(colour.size):
        if colour[first] >= 0:
            continue
        colour[first], waiting = 0, [first]
        while waiting:
            now = waiting.pop()
            for other in np.flatnonzero(linked[now]).tolist():
                if colour[other] == colour[now]:
                    return None
                if colour[other] < 0:
                    colour[other] = 1 - colour[now]
                    waiting.append(other)
    upper: NDArray[np.bool_] = colour[bloch.group] == 1
    return upper


def equations(bloch: Bloch) -> Reduced:
    """Eliminate the optical coherences, where the light joins two sets; else keep everything in set A."""
    pattern = reachable(bloch)
    upper = two_sets(bloch)
    if upper is None:
        return _whole(bloch, pattern)
    B, A = np.flatnonzero(upper), np.flatnonzero(~upper)
    same = pattern & (upper[:, None] == upper[None, :])
    table = index_table(same)
    _check_size(table)
    V = bloch.coupling[np.ix_(B, A)]
    energy = bloch.energy[B][:, None] - bloch.energy[A][None, :]
    slowness = bloch.coherence_decay[np.ix_(B, A)] + 1j * energy
    K = np.divide(1.0, slowness, out=np.zeros_like(slowness), where=slowness != 0)
    parts = (_own(bloch, same), *jump_triplets(bloch), *_exchange(V, K, A, B), *_loss(V, K, A, B, pattern))
    rows, columns, values = real_triplets(parts, table)
    return Reduced(table, rows, columns, values, A, B, V, K)


def _whole(bloch: Bloch, pattern: NDArray[np.bool_]) -> Reduced:
    table = index_table(pattern)
    _check_size(table)
    matrix = generator(bloch, table).tocoo()
    nothing = np.zeros((0, bloch.size), dtype=np.complex128)
    rows, columns = matrix.row.astype(np.int64), matrix.col.astype(np.int64)
    A, B = np.arange(bloch.size), np.zeros(0, dtype=np.int64)
    return Reduced(table, rows, columns, matrix.data, A, B, nothing, nothing)


def _check_size(table: Indices) -> None:
    unknowns = int(table.max()) + 1
    if unknowns > LARGEST_UNKNOWNS:
        allowed = f"at most {LARGEST_UNKNOWNS} populations and coherences; rate equations or fewer levels would do"
        raise OutsideValidity("beams", f"{unknowns} unknowns", allowed)


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
    """Give what light takes from b and a: -(K o b V) V^+ and -V^+ (K o V a), with their hermitian conjugates.

    The second is the first with V^+ and K^+ in the place of V and K.
    """
    yield _one_sided(V, K, B, pattern)
    yield _one_sided(V.conj().T, K.conj().T, A, pattern)


def _one_sided(V: Complex, K: Complex, at: Indices, pattern: NDArray[np.bool_]) -> Triplets:
    """List rho[i, m] -= sum_l K[i, l] V[p, l] V*[m, l] rho[i, p] + h.c. by rows on or above the diagonal."""
    inside = pattern[np.ix_(at, at)]
    i, m, p = np.nonzero(inside[:, :, None] & inside[:, None, :])
    if 4 * i.size < inside.size * at.size:
        found = -np.einsum("tl,tl,tl->t", K[i], V[p], V[m].conj())
    else:
        whole = K @ (V.T[:, :, None] * V.T.conj()[:, None, :]).reshape(V.shape[1], -1)  # i, then (p, m)
        found = -whole.reshape(at.size, at.size, at.size)[i, p, m]
    driven = found != 0
    i, m, p, found = i[driven], m[driven], p[driven], found[driven]
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


def source(reduced: Reduced, rho: Complex) -> Array:
    """Return the right side for the blocks when the whole equations are M y = rho: optical sources act through K.

    c gains -K o rho_c, which the blocks feel as i V^+ (K o rho_c) + h.c. and -i (K o rho_c) V^+ + h.c.
    """
    A, B = reduced.lower, reduced.upper
    through = 1j * reduced.response * rho[np.ix_(B, A)]
    into_a, into_b = reduced.link.conj().T @ through, through @ reduced.link.conj().T
    blocks = rho.copy()
    blocks[np.ix_(A, A)] -= into_a + into_a.conj().T
    blocks[np.ix_(B, B)] += into_b + into_b.conj().T
    return to_real(blocks, reduced.table)
