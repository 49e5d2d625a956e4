"""Every sublevel of a whole term in one table, with the mean orbital and spin projections that tell the regime.

In weak fields the states are those of J and F; where the Zeeman energy outweighs the fine structure the mean L_z and
S_z become the integers and half-integers m_L and m_S of the Paschen-Back regime. L_z and S_z are those of LS coupling.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from levels.crossings import State, states_of
from levels.sensitivity import Spread
from levels.strongfield import solve_term_block, spin_operator, term_constants, term_ms
from levels.strongfield_spread import Contributions, contributions, joined, spread_of
from levels.sublevels import HZ_PER_MHZ, as_fields, zero_field_mhz
from levels.terms import Term

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True, eq=False)
class WholeTerm:
    """Every sublevel of a term at one field, shape (s,), by level, F and m; energies from the asked level's centroid.

    `spread` has shape (4, 1, s).
    """

    states: tuple[State, ...]
    energy_mhz: Array
    shift_mhz: Array
    slope_mhz_per_gauss: Array
    quadratic_hz_per_gauss2: Array
    mean_L_z: Array
    mean_S_z: Array
    spread: Spread


def whole_term(term: Term, field_gauss: float) -> WholeTerm:
    """Solve every sublevel of every level of a term at one field."""
    constants, fields = term_constants(term), as_fields(field_gauss)
    states = states_of(constants)
    place = {state: k for k, state in enumerate(states)}
    numbers = np.zeros((5, len(states)))
    for twice_m in term_ms(constants):
        eigen = solve_term_block(constants, twice_m, fields)
        at = [place[State(position, F, twice_m)] for position, F in eigen.block.labels]
        spin = spin_operator(constants, eigen.block)
        total = np.diag(np.concatenate([part.J_z for part in eigen.block.parts]))
        numbers[:, at] = (
            eigen.energy_mhz[0],
            eigen.slope_mhz_per_gauss()[0],
            eigen.quadratic_mhz_per_gauss2()[0] * HZ_PER_MHZ,
            eigen.mean(total - spin)[0],
            eigen.mean(spin)[0],
        )
    still = [
        constants.gaps_mhz[one.position] + zero_field_mhz(constants.levels[one.position], one.twice_F) for one in states
    ]
    return WholeTerm(
        tuple(states),
        numbers[0],
        numbers[0] - np.array(still),
        numbers[1],
        numbers[2],
        numbers[3],
        numbers[4],
        _spread(term, states, fields),
    )


def _spread(term: Term, states: list[State], fields: Array) -> Spread:
    """Put the contributions of each level's sublevels side by side."""
    total: Contributions = {}
    for position in range(len(term.levels)):
        own = [k for k, state in enumerate(states) if state.position == position]
        labels = [(states[k].twice_F, states[k].twice_m) for k in own]
        part = contributions(term, fields, labels, 1.0, position)
        wide: Contributions = {}
        for key, (parameter, numbers) in part.items():
            spread_out = np.zeros((4, fields.size, len(states)))
            spread_out[:, :, own] = numbers
            wide[key] = parameter, spread_out
        total = joined(total, wide)
    return spread_of(total)
