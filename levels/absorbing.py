"""Absorbing Markov chains by state reduction without subtractions, many chains at once.

State 0 is where every walk starts. The states are eliminated from the last to the first; no two numbers are ever
subtracted, so that a chain which loses one walk in 1e12 still gives all its digits. Grassmann, Taksar, Heyman, Oper.
Res. 33, 1107 (1985). A state from which the start cannot be reached again counts as lost: `trapped` finds them.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]
NEVER = 1e-30  # stands for a loss that does not exist, so that endless walks stay finite numbers
ENDLESS = 1e25  # more visits than this are called endless


@dataclass(frozen=True, slots=True, eq=False)
class Reduced:
    """Chains with states n-1 .. 1 eliminated: `moves` (k, n, n), the exit sums of each state (k, n)."""

    moves: Array
    exits: Array


def trapped(moves: Array) -> NDArray[np.bool_]:
    """Find the states, shape (k, n), from which no path leads back to state 0."""
    links = (moves > 0).astype(np.float64)
    home = np.zeros(moves.shape[:2])
    home[:, 0] = 1.0
    while True:
        wider = np.minimum(home + (links @ home[..., None])[..., 0], 1.0)
        wider = np.where(wider > 0, 1.0, 0.0)
        if np.array_equal(wider, home):
            lost: NDArray[np.bool_] = home == 0
            return lost
        home = wider


def closed_off(moves: Array, loss: Array) -> tuple[Array, Array]:
    """Turn trapped states into losses: what leads to them leaves the chain."""
    lost = trapped(moves)
    kept = np.where(lost[:, None, :] | lost[:, :, None], 0.0, moves)
    gone = loss + (moves * lost[:, None, :]).sum(axis=-1)
    return kept, np.where(lost, 1.0, gone)


def reduce(moves: Array, loss: Array) -> Reduced:
    """Eliminate all states but the start; `moves` (k, n, n) and `loss` (k, n) are probabilities or rates.

    Moves from a state to itself are ignored: they only repeat a visit.
    """
    A, out = moves.copy(), loss.copy()
    n = A.shape[-1]
    exits = np.empty(out.shape)
    for s in range(n - 1, 0, -1):
        total = A[:, s, :s].sum(axis=-1) + out[:, s]
        exits[:, s] = total
        share = A[:, :s, s] / total[:, None]
        A[:, :s, :s] += share[:, :, None] * A[:, s, None, :s]
        out[:, :s] += share * out[:, s, None]
    exits[:, 0] = np.maximum(out[:, 0], NEVER)
    return Reduced(A, exits)


def visits(chain: Reduced) -> Array:
    """Compute the expected visits to each state (with rates: the time spent there) before loss, shape (k, n)."""
    n = chain.exits.shape[-1]
    found = np.empty(chain.exits.shape)
    found[:, 0] = 1.0 / chain.exits[:, 0]
    for s in range(1, n):
        found[:, s] = (found[:, :s] * chain.moves[:, :s, s]).sum(axis=-1) / chain.exits[:, s]
    return found


def values(chain: Reduced, reward: Array) -> Array:
    """Compute the expected sum of rewards per visit (with rates: per unit of time) from each state on, shape (k, n)."""
    n = chain.exits.shape[-1]
    ahead = np.broadcast_to(reward, chain.exits.shape).copy()
    for s in range(n - 1, 0, -1):
        ahead[:, :s] += chain.moves[:, :s, s] / chain.exits[:, s, None] * ahead[:, s, None]
    found = np.empty(chain.exits.shape)
    found[:, 0] = ahead[:, 0] / chain.exits[:, 0]
    for s in range(1, n):
        onward = (chain.moves[:, s, :s] * found[:, :s]).sum(axis=-1)
        found[:, s] = (ahead[:, s] + onward) / chain.exits[:, s]
    return found
