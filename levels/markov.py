"""Long-time populations of rate equations without subtraction, so that rates of any ratio keep their accuracy.

States are removed one after another; what flowed through the removed state flows on in proportion to its outgoing rates
(Grassmann, Taksar and Heyman, Operations Research 33, 1107 (1985)). Only additions, products and quotients of positive
numbers occur: a level that decays once in a year beside one that decays in nanoseconds costs no digits.
"""

import numpy as np
from numpy.typing import NDArray
from scipy.sparse import csr_matrix
from scipy.sparse.csgraph import connected_components

Array = NDArray[np.float64]


def long_time(moves: Array, initial: Array) -> tuple[Array, bool]:
    """Return the populations after a long time, and whether the start does not matter.

    `moves[end, start]` are rates, its diagonal is not read. Atoms end in the closed classes that they can reach; within
    each class the populations are its stationary ones.
    """
    rates = np.maximum(moves, 0.0)
    np.fill_diagonal(rates, 0.0)
    _, part = connected_components(csr_matrix(rates.T > 0), directed=True, connection="strong")
    leaving = [bool(np.any(rates[np.ix_(part != k, part == k)] > 0)) for k in range(int(part.max()) + 1)]
    closed = [np.flatnonzero(part == k) for k, leaves in enumerate(leaving) if not leaves]
    arriving = _absorbed(rates, initial, np.isin(part, np.flatnonzero(leaving)))
    result = np.zeros(initial.size)
    for inside in closed:
        result[inside] = arriving[inside].sum() * stationary(rates[np.ix_(inside, inside)])
    return result, len(closed) == 1


def stationary(rates: Array) -> Array:
    """Return the stationary populations, sum 1, of states that all reach each other."""
    left = rates.copy()
    size = left.shape[0]
    flow = np.zeros(size)
    for k in range(size - 1, 0, -1):
        flow[k] = left[:k, k].sum()
        left[:k, :k] += np.outer(left[:k, k] / flow[k], left[k, :k])
    populations = np.zeros(size)
    populations[0] = 1.0
    for k in range(1, size):
        populations[k] = left[k, :k] @ populations[:k] / flow[k]
    total: Array = populations / populations.sum()
    return total


def _absorbed(rates: Array, initial: Array, transient: NDArray[np.bool_]) -> Array:
    """Send the start of all transient states on to the states where it ends."""
    left, populations = rates.copy(), initial.copy()
    alive = np.ones(initial.size, dtype=np.bool_)
    for k in np.flatnonzero(transient):
        alive[k] = False
        ways = np.where(alive, left[:, k], 0.0)
        ways /= ways.sum()
        populations += ways * populations[k]
        populations[k] = 0.0
        left += np.outer(ways, np.where(alive, left[k], 0.0))
        np.fill_diagonal(left, 0.0)
    return populations
