"""Rate equations: populations under any set of beams, with decays and leaks but without coherences.

    dp/dt = M p,  absorption and stimulated emission Omega^2 gamma/(gamma^2 + 4 Delta^2) of every beam and component,

where gamma has both natural widths and the laser's. Rates are per us. Exact in the steady state for two levels and for
light that makes no coherences between sublevels; wrong where dark superpositions form (`darkstates`), where beams of
one frequency interfere, and where a two-photon resonance matters.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from levels.driven import Drive
from levels.markov import long_time
from levels.steady import solve_with_trace

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True, eq=False)
class Rates:
    """`matrix` (s, s) takes populations to their change; its columns sum to minus `lost`."""

    matrix: Array
    emission: Array  # (end, start): spontaneous only
    lost: Array

    @property
    def size(self) -> int:
        """How many sublevels there are."""
        return int(self.lost.size)


def rates_of(drive: Drive) -> Rates:
    """Write the rate equations of a scheme."""
    structure = drive.structure
    emission = np.zeros((structure.size, structure.size))
    for line in structure.lines:
        rate = structure.decays[structure.index_of(line.upper)].rate_of(line) * 1e-6
        emission[structure.slice_of(line.lower), structure.slice_of(line.upper)] += (
            rate * structure.amplitudes[line.name].T ** 2
        )
    moves = emission.copy()
    for item in drive.couplings:
        pump = item.pump_per_us
        moves[item.upper, item.lower] += pump
        moves[item.lower, item.upper] += pump.T
    lost = structure.lost_per_s * 1e-6
    return Rates(moves - np.diag(moves.sum(axis=0) + lost), emission, lost)


def closed_rates(rates: Rates) -> Rates:
    """Return the equations with leaks closed, like `steady.closed`: lost atoms go the way of the other decays."""
    if not rates.lost.any():
        return rates
    emitted = rates.emission.sum(axis=0)
    kept = emitted > 1e-9 * rates.lost
    extra = rates.emission * np.where(kept, rates.lost / np.where(kept, emitted, 1.0), 0.0)
    matrix = rates.matrix + np.diag(rates.lost) + extra - np.diag(extra.sum(axis=0))
    return Rates(matrix, rates.emission + extra, np.zeros(rates.size))


def solve_populations(matrix: Array, goal: Array | None = None) -> Array | None:
    """Solve M p = 0 with sum 1, or M p = goal with sum 0; None where there are several solutions."""
    size = matrix.shape[0]
    table = np.where(np.eye(size, dtype=np.bool_), np.arange(size)[:, None], -1)
    rows, columns = np.nonzero(matrix)
    return solve_with_trace(rows, columns, matrix[rows, columns], table, goal)


def steady_populations(rates: Rates, initial: Array) -> tuple[Array, bool]:
    """Solve the steady populations of the closed equations, and tell whether they are the only ones.

    Where there are several, the long-time limit of the initial populations is returned.
    """
    return long_time(closed_rates(rates).matrix, initial)
