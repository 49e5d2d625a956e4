"""What happens on the way: time integrals of the populations, from one linear solve each.

`settling` integrates the departure from the steady state: photons that pumping costs, and the time it takes.
`residence` integrates the state of atoms until they leave: photons before an atom is lost. No time is stepped.
"""

import numpy as np

from levels.bloch import Array, Bloch, Complex
from levels.elimination import Reduced, equations, source, with_optical
from levels.rates import Rates, closed_rates, solve_populations
from levels.steady import (
    closed,
    conserved_optical,
    matrix_of,
    null_spaces,
    overlaps,
    solve_dense,
    solve_with_trace,
    some_solution,
)


def settling(bloch: Bloch, initial: Array, final: Complex) -> Array:
    """Integrate populations minus the steady ones over time, in us per sublevel; leaks are closed."""
    reduced = equations(closed(bloch))
    change = final - np.diag(initial)
    goal = source(reduced, change)
    values = solve_with_trace(reduced.rows, reduced.columns, reduced.values, reduced.table, goal)
    if values is None:
        values = _without_conserved(reduced, goal, change)
    return _populations(reduced, values)


def _populations(reduced: Reduced, values: Array) -> Array:
    return np.asarray(np.diag(with_optical(reduced, values)).real, dtype=np.float64)


def _without_conserved(reduced: Reduced, goal: Array, change: Complex) -> Array:
    """Solve where several steady states exist: the integral has no share in any conserved quantity."""
    matrix = matrix_of(reduced.rows, reduced.columns, reduced.values, reduced.size)
    right, left = null_spaces(matrix)
    some = some_solution(matrix, goal)
    direct = -reduced.response * change[np.ix_(reduced.upper, reduced.lower)]
    extra = [2 * np.sum(O.conj() * direct).real for O in conserved_optical(reduced, left)]
    held = overlaps(reduced, left, some[:, None])[:, 0] + np.array(extra)
    values: Array = some - right @ np.linalg.solve(overlaps(reduced, left, right), held)
    return values


def residence(bloch: Bloch, initial: Array) -> Array | None:
    """Integrate the populations over time until all atoms are lost, in us; None when some atoms never leave."""
    reduced = equations(bloch)
    goal = source(reduced, -np.diag(initial + 0j))
    values = solve_dense(reduced.rows, reduced.columns, reduced.values, goal)
    if values is None:
        return None
    return _populations(reduced, values)


def settling_of_rates(rates: Rates, initial: Array, final: Array) -> Array:
    """The same as `settling` for rate equations."""
    matrix = closed_rates(rates).matrix
    found = solve_populations(matrix, final - initial)
    if found is not None:
        return found
    right, left = null_spaces(matrix)
    some = some_solution(matrix, final - initial)
    return some - right @ np.linalg.solve(left.T @ right, left.T @ some)


def residence_of_rates(rates: Rates, initial: Array) -> Array | None:
    """The same as `residence` for rate equations."""
    rows, columns = np.nonzero(rates.matrix)
    return solve_dense(rows, columns, rates.matrix[rows, columns], -initial)
