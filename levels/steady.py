"""Steady state of optical Bloch equations.

The blocks that `elimination` leaves are solved, or the whole generator where the light joins no two sets of sublevels
(a triangle of lines). One population's equation is replaced by the trace. If that leaves the matrix singular, there are
several steady states (dark or unlit manifolds that never exchange atoms); then the long-time limit of the given initial
populations is returned, from the left and right null spaces: x = R (L^T R)^-1 L^T x0.
"""

from dataclasses import dataclass, replace

import numpy as np
from scipy.linalg import lapack
from scipy.sparse import csc_matrix
from scipy.sparse.linalg import splu

from levels.bloch import Array, Bloch, Complex, Indices, Jump, to_complex, to_real
from levels.elimination import Reduced, equations, optical_part, with_optical
from levels.errors import OutsideValidity

DENSE_UNKNOWNS = 1500  # up to here LAPACK beats sparse LU, whose factors fill up
SINGULAR = 1e-15  # reciprocal condition below which the equations are taken to have several solutions


@dataclass(frozen=True, slots=True, eq=False)
class Steady:
    """A steady state: density matrix in the rotating frame, whether it is the only one, and atoms lost per us."""

    rho: Complex
    unique: bool
    lost_per_us: float
    unknowns: int

    @property
    def populations(self) -> Array:
        """The diagonal."""
        diagonal: Array = np.diag(self.rho).real.astype(np.float64)
        return diagonal


def closed(bloch: Bloch) -> Bloch:
    """Return the equations with leaks closed: what would be lost goes the way of the other decays of its sublevel.

    A sublevel that has no other decay keeps its atoms.
    """
    if not bloch.lost.any():
        return bloch
    emitted = np.zeros(bloch.size)
    for jump in bloch.jumps:
        np.add.at(emitted, jump.start, jump.amplitude**2)
    kept = emitted > 1e-9 * bloch.lost
    scale = np.sqrt(np.where(kept, 1.0 + bloch.lost / np.where(kept, emitted, 1.0), 1.0))
    jumps = tuple(Jump(j.end, j.start, j.amplitude * scale[j.start]) for j in bloch.jumps)
    decay = bloch.decay - np.where(kept, 0.0, bloch.lost)
    coherence = bloch.coherence_decay.copy()
    np.fill_diagonal(coherence, decay)
    return replace(bloch, jumps=jumps, decay=decay, coherence_decay=coherence)


def steady_state(bloch: Bloch, initial: Array) -> Steady:
    """Solve the steady state; `initial` populations decide where there is more than one.

    Leaks are closed (`closed`): the state is that of the atoms still there, and `lost_per_us` the rate of losing them.
    """
    reduced = equations(closed(bloch))
    values = solve_with_trace(reduced.rows, reduced.columns, reduced.values, reduced.table)
    unique = values is not None
    if values is None:
        right, left = null_spaces(matrix_of(reduced.rows, reduced.columns, reduced.values, reduced.size))
        overlap = overlaps(reduced, left, right)
        values = right @ np.linalg.solve(overlap, left.T @ to_real(np.diag(initial + 0j), reduced.table))
    rho = with_optical(reduced, values)
    return Steady(rho, unique, float(np.diag(rho).real @ bloch.lost), reduced.size)


def matrix_of(rows: Indices, columns: Indices, values: Array, size: int) -> Array:
    """Add up triplets as a dense matrix in Fortran order, as LAPACK wants it."""
    flat = np.bincount(rows + size * columns, weights=values, minlength=size * size)
    matrix: Array = np.asarray(flat, dtype=np.float64).reshape(size, size, order="F")
    return matrix


def solve_with_trace(
    rows: Indices, columns: Indices, values: Array, table: Indices, goal: Array | None = None
) -> Array | None:
    """Solve M x = 0 with trace 1, or M x = goal with trace 0; None where that has no single solution."""
    n = int(table.max()) + 1
    scale = float(np.abs(values).max())
    right = np.zeros(n) if goal is None else goal.copy()
    right[0] = scale if goal is None else 0.0
    keep = rows != 0
    traced = np.diag(table)[np.diag(table) >= 0]
    rows = np.concatenate([rows[keep], np.zeros(traced.size, dtype=np.int64)])
    columns = np.concatenate([columns[keep], traced])
    values = np.concatenate([values[keep], np.full(traced.size, scale)])
    if n > DENSE_UNKNOWNS:
        return _solve_sparse(csc_matrix((values, (rows, columns)), shape=(n, n)), right)
    matrix = matrix_of(rows, columns, values, n)
    norm = float(np.abs(matrix).sum(axis=0).max())
    factors, _pivots, solution, info = lapack.dgesv(matrix, right, overwrite_a=True)
    if info != 0 or lapack.dgecon(factors, norm)[0] < SINGULAR:
        return None
    result: Array = solution
    return result


def _solve_sparse(matrix: csc_matrix, right: Array) -> Array | None:
    options = {"SymmetricMode": True}
    try:
        factors = splu(matrix, permc_spec="MMD_AT_PLUS_A", diag_pivot_thresh=0.01, options=options)
    except RuntimeError:  # exactly singular
        return None
    pivots = np.abs(factors.U.diagonal())
    if pivots.min() < SINGULAR * pivots.max():
        return None
    result: Array = factors.solve(right)
    return result


def null_spaces(matrix: Array) -> tuple[Array, Array]:
    """Return orthonormal bases of the right and left null spaces, as columns."""
    if matrix.shape[0] > DENSE_UNKNOWNS:
        raise OutsideValidity("beams", f"{matrix.shape[0]} unknowns", "fewer levels: there are several steady states")
    left, sizes, right = np.linalg.svd(matrix)
    null = sizes < 1e2 * SINGULAR * sizes[0]
    if not null.any():
        null[-1] = True
    return right[null].T, left[:, null]


def conserved_optical(reduced: Reduced, left: Array) -> list[Complex]:
    """Return the optical part of the conserved quantity behind each left null vector.

    A conserved O has O_BA = i K* o (V O_AA - O_BB V), which is the stationary formula with -K*.
    """
    diagonal = np.diag(reduced.table)
    weight = np.full(left.shape[0], 0.5)  # Tr(O rho) counts Re and Im of each coherence twice
    weight[diagonal[diagonal >= 0]] = 1.0
    mirrored = replace(reduced, response=-reduced.response.conj())
    return [optical_part(mirrored, to_complex(column * weight, reduced.table)) for column in left.T]


def overlaps(reduced: Reduced, left: Array, right: Array) -> Array:
    """Return the overlaps of conserved quantities with block vectors and the optical coherences they entail."""
    overlap: Array = left.T @ right
    stationary = [optical_part(reduced, to_complex(column, reduced.table)) for column in right.T]
    for row, O in enumerate(conserved_optical(reduced, left)):
        for column, c in enumerate(stationary):
            overlap[row, column] += 2 * np.sum(O.conj() * c).real
    return overlap
