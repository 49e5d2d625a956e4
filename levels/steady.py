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
SINGULAR = 1e-16  # reciprocal condition below which the equations are taken to have several solutions
REFINED = 1e-9
SMALL_PIVOT = 1e-5  # of rows whose elements add up to 1
REFINEMENTS = 3
SLOWEST = 3e-10  # per us: manifolds that exchange atoms more slowly than once in an hour are taken as separate
LARGEST_DEGENERATE = 3000


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
        unique = right.shape[1] == 1
        overlap = overlaps(reduced, left, right)
        values = right @ np.linalg.solve(overlap, left.T @ to_real(np.diag(initial + 0j), reduced.table))
        diagonal = np.diag(reduced.table)
        values = values / float(values[diagonal[diagonal >= 0]].sum())  # rounding, where exchange is slow but not nil
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
    return solve_dense(rows, columns, values, right)


def solve_dense(rows: Indices, columns: Indices, values: Array, right: Array) -> Array | None:
    """Solve M x = right by LAPACK, M given by triplets; None where it is singular to working precision.

    Rows are scaled to equal size first, so that fast precessions do not hide slow rates. Small pivots call for the
    condition number, and an ill-conditioned solution is refined with residuals in extended precision.
    """
    n = right.size
    sizes = np.bincount(rows, weights=np.abs(values), minlength=n)
    scale = 1.0 / np.where(sizes > 0, sizes, 1.0)
    values, right = values * scale[rows], right * scale
    factors, pivots, solution, info = lapack.dgesv(matrix_of(rows, columns, values, n), right, overwrite_a=True)
    if info != 0:
        return None
    result: Array = solution
    if np.abs(np.diag(factors)).min() < SMALL_PIVOT:
        condition = lapack.dgecon(factors, 1.0, norm="I")[0]
        if condition < SINGULAR:
            return None
        if condition < REFINED:
            return _refined(matrix_of(rows, columns, values, n), right, factors, pivots, result)
    return result


def _refined(matrix: Array, right: Array, factors: Array, pivots: Indices, solution: Array) -> Array:
    extended, exact = matrix.astype(np.longdouble), solution.astype(np.longdouble)
    for _ in range(REFINEMENTS):
        residual = np.asarray(right - extended @ exact, dtype=np.float64)
        exact = exact + lapack.dgetrs(factors, pivots, residual)[0]
    return exact.astype(np.float64)


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
    """Return bases of the right and left null spaces of a generator, as columns.

    By inverse iteration with a shift of rounding size: a few solutions with one factorisation. Rates below `SLOWEST`
    count as none.
    """
    size = matrix.shape[0]
    if size > LARGEST_DEGENERATE:
        raise OutsideValidity("beams", f"{size} unknowns", "fewer levels: there are several steady states")
    factors, pivots, _info = lapack.dgetrf(_shifted(matrix))
    width = min(8, size)
    while True:
        right = _near_null(matrix, factors, pivots, width, 0)
        if right.shape[1] < width or width == size:
            break
        width = min(2 * width, size)
    left = _near_null(matrix, factors, pivots, min(right.shape[1] + 2, size), 1)
    count = min(right.shape[1], left.shape[1])
    return right[:, :count], left[:, :count]


def _shifted(matrix: Array) -> Array:
    norm = float(np.abs(matrix).sum(axis=0).max())
    result: Array = matrix - 4e-16 * norm * np.eye(matrix.shape[0])
    return result


def some_solution(matrix: Array, goal: Array) -> Array:
    """Return one solution of M x = goal for a singular M and a goal in its range; its null part is arbitrary."""
    solution: Array = lapack.dgesv(_shifted(matrix), goal)[2]
    return solution


def _near_null(matrix: Array, factors: Array, pivots: Indices, width: int, transposed: int) -> Array:
    """Return the null vectors of M (or its transpose) inside the space that inverse iteration finds, smallest first."""
    size = matrix.shape[0]
    space = np.random.default_rng(size).normal(size=(size, width))
    for _ in range(3):
        space = np.linalg.qr(lapack.dgetrs(factors, pivots, space, trans=transposed)[0])[0]
    image = (matrix.T if transposed else matrix) @ space
    _, sizes, turn = np.linalg.svd(image)
    order = np.argsort(sizes)
    limit = max(SLOWEST, 1e-15 * float(np.abs(matrix).sum(axis=0).max()) * np.sqrt(size))
    chosen: Array = space @ turn[order[sizes[order] < limit] if np.any(sizes < limit) else order[:1]].T
    return chosen


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
