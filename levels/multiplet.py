"""How a field mixes the fine-structure levels of one LS term, to second order.

The Zeeman operator (muB/h) B (L_z + g_S S_z) joins J and J + 1 of one term through

    <J M|S_z|J+1 M>^2 = [(J+1)^2 - M^2] [(J+1)^2 - (L-S)^2] [(L+S+1)^2 - (J+1)^2] / [4 (J+1)^2 (2J+1)(2J+3)]

times (g_S - 1); Condon and Shortley, The Theory of Atomic Spectra (1935), section 16.10. Since S_z keeps M and the
nucleus looks on, the second-order shift is a number for each m_J, times B^2: the sublevels' Hamiltonian carries it as a
diagonal term. It rests on LS coupling: about 0.3 % off for the 3P0 of Sr and several percent for Mg and Yb. The next
order is smaller by the mixing amplitude squared.
"""

from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import ArrayLike

from levels.constants import G_S, MU_B_MHZ_PER_GAUSS
from levels.notation import format_half, term_quantum_numbers
from levels.records import Level

NOTABLE_MIXING = 0.01


@dataclass(frozen=True, slots=True)
class Mixing:
    """The largest admixture amplitude of the neighbours and the largest second-order shift, at one field."""

    amplitude: float
    shift_mhz: float
    neighbours: tuple[str, ...]


def spin_element_squared(twice_L: int, twice_S: int, twice_J: int, twice_M: int) -> float:
    """Compute <J M|S_z|J+1 M>^2 of one LS term, for J = `twice_J`/2.

    >>> round(spin_element_squared(2, 1, 1, 1), 6)  # 2P: 2/9
    0.222222
    """
    L, S, J, M = twice_L / 2, twice_S / 2, twice_J / 2, twice_M / 2
    top = ((J + 1) ** 2 - M**2) * ((J + 1) ** 2 - (L - S) ** 2) * ((L + S + 1) ** 2 - (J + 1) ** 2)
    return max(top, 0.0) / (4 * (J + 1) ** 2 * (2 * J + 1) * (2 * J + 3))


@lru_cache(maxsize=4096)
def second_order(twice_J: int, term: str, neighbours: tuple[tuple[int, float], ...]) -> tuple[float, ...]:
    """Compute the second-order shift of each m_J, in MHz/G2 from m_J = -J up; empty without neighbours."""
    if not neighbours:
        return ()
    numbers = term_quantum_numbers(term)
    shifts = []
    for twice_M in range(-twice_J, twice_J + 1, 2):
        total = 0.0
        for twice_other, gap_mhz in neighbours:
            lower = min(twice_J, twice_other)
            square = spin_element_squared(numbers["L"], numbers["S"], lower, twice_M) if abs(twice_M) <= lower else 0.0
            total -= ((G_S - 1) * MU_B_MHZ_PER_GAUSS) ** 2 * square / gap_mhz
        shifts.append(total)
    return tuple(shifts)


def mixing(level: Level, field_gauss: ArrayLike) -> Mixing | None:
    """Estimate the fine-structure mixing of a level at the largest of the fields; None without known neighbours."""
    shifts = second_order(level.twice_J, level.term, level.neighbours)
    if not shifts:
        return None
    field = abs(field_gauss) if isinstance(field_gauss, float) else float(np.max(np.abs(field_gauss)))
    names = tuple(f"J = {format_half(twice_other)}" for twice_other, _ in level.neighbours)
    nearest = min(abs(gap) for _, gap in level.neighbours)
    shift = max(abs(number) for number in shifts) * field**2
    return Mixing(float(np.sqrt(shift / nearest)), shift, names)


def quiet_field_gauss(level: Level) -> float:
    """Return the field up to which `caution` has nothing to say: the amplitude grows with the field."""
    found = mixing(level, 1.0)
    return NOTABLE_MIXING / found.amplitude if found is not None and found.amplitude > 0 else float("inf")


def caution(level: Level, field_gauss: ArrayLike) -> tuple[str, ...]:
    """Warn where the mixing is more than second order can carry."""
    found = mixing(level, field_gauss)
    if found is None or found.amplitude < NOTABLE_MIXING:
        return ()
    return (
        f"the field mixes {level.name} with {' and '.join(found.neighbours)} of its term by an amplitude of "
        f"{found.amplitude:.2g}; second order is kept (LS coupling), higher orders are not",
    )
