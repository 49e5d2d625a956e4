"""Linear equations dx/dt = M x followed in time: exact propagation, no step-size error.

One or a few distinct steps are taken with the matrix exponential, many different ones (a logarithmic grid) with the
eigenvectors of M, whose accuracy is checked on the start; where it fails the exponential does every step.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.linalg import expm
from scipy.sparse import csc_matrix

from levels.bloch import Bloch, generator, index_table, reachable, to_real
from levels.errors import OutsideValidity
from levels.rates import Rates

Array = NDArray[np.float64]
LARGEST_UNKNOWNS = 1200
LARGEST_TIMES = 2000
FEW_STEPS = 3
EIGEN_TOLERANCE = 1e-9


@dataclass(frozen=True, slots=True, eq=False)
class Evolution:
    """Populations (t, s) at the times, and the share of atoms that has left the list of levels (t,)."""

    times_us: Array
    populations: Array
    lost: Array


def as_times(times_us: ArrayLike) -> Array:
    """Check times: finite, not negative, rising."""
    times = np.atleast_1d(np.asarray(times_us, dtype=np.float64))
    good = times.ndim == 1 and 1 <= times.size <= LARGEST_TIMES and bool(np.all(np.isfinite(times)))
    if not good or times[0] < 0 or np.any(np.diff(times) <= 0):
        raise OutsideValidity("times", f"{times.size} values", f"1 to {LARGEST_TIMES} rising times in us, from 0 on")
    return times


def evolve_bloch(bloch: Bloch, initial: Array, times_us: ArrayLike) -> Evolution:
    """Follow the optical Bloch equations from initial populations."""
    times = as_times(times_us)
    table = index_table(reachable(bloch, initial > 0))
    unknowns = int(table.max()) + 1
    if unknowns > LARGEST_UNKNOWNS:
        allowed = f"at most {LARGEST_UNKNOWNS} populations and coherences in time; rate equations would do"
        raise OutsideValidity("beams", f"{unknowns} unknowns", allowed)
    states = propagate(generator(bloch, table), to_real(np.diag(initial + 0j), table), times)
    diagonal = np.diag(table)
    populations = np.where(diagonal >= 0, states[:, np.maximum(diagonal, 0)], 0.0)
    return Evolution(times, populations, initial.sum() - populations.sum(axis=1))


def evolve_rates(rates: Rates, initial: Array, times_us: ArrayLike) -> Evolution:
    """Follow rate equations from initial populations."""
    times = as_times(times_us)
    populations = propagate(csc_matrix(rates.matrix), initial, times)
    return Evolution(times, populations, initial.sum() - populations.sum(axis=1))


def propagate(matrix: csc_matrix, start: Array, times: Array) -> Array:
    """Return exp(M t) x at rising times, shape (t, n)."""
    dense = matrix.toarray()
    steps = np.diff(times, prepend=0.0)
    distinct = _distinct(steps)
    if len(distinct) > FEW_STEPS:
        found = _by_eigenvectors(dense, start, times)
        if found is not None:
            return found
    moves = {step: expm(dense * step) for step in distinct}
    states = np.empty((times.size, start.size))
    now = start
    for row, step in enumerate(steps):
        now = moves[min(distinct, key=lambda known: abs(known - step))] @ now if step > 0 else now
        states[row] = now
    return states


def _distinct(steps: Array) -> list[float]:
    """List the different steps, those that rounding alone separates as one."""
    found: list[float] = []
    for step in steps[steps > 0]:
        if not any(abs(step - known) <= 1e-9 * known for known in found):
            found.append(float(step))
    return found


def _by_eigenvectors(matrix: Array, start: Array, times: Array) -> Array | None:
    values, vectors = np.linalg.eig(matrix)
    try:
        shares = np.linalg.solve(vectors, start.astype(np.complex128))
    except np.linalg.LinAlgError:
        return None
    scale = float(np.abs(matrix).max()) * float(np.abs(start).max())
    first = np.abs((vectors @ (values * shares)).real - matrix @ start).max()
    if np.abs(shares).max() > 1e6 * np.abs(start).max() or first > EIGEN_TOLERANCE * scale:
        return None  # nearly defective
    factors = np.exp(np.minimum(values.real, 0.0)[None, :] * times[:, None] + 1j * values.imag * times[:, None])
    states: Array = (factors * shares @ vectors.T).real
    return states


def slowest_us(matrix: Array, start: Array, observed: NDArray[np.int64]) -> float | None:
    """Return the longest time constant with which the observed unknowns approach the steady state from the start.

    Modes that hold less than a thousandth of the observed change are passed over. None where nothing changes.
    """
    values, vectors = np.linalg.eig(matrix)
    try:
        shares = np.linalg.solve(vectors, start.astype(np.complex128))
    except np.linalg.LinAlgError:
        return None
    weight = np.abs(shares) * np.abs(vectors[observed]).max(axis=0)
    moving = values.real < -1e-12 * np.abs(values).max()
    notable = moving & (weight > 1e-3 * weight[moving].max(initial=0.0))
    return float(-1.0 / values.real[notable].max()) if notable.any() else None
