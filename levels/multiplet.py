"""How far a field mixes the fine-structure levels of one term, which the single-level model leaves out.

In LS coupling the Zeeman operator (muB/h) B (L_z + g_S S_z) joins J and J + 1 of one term through

    <J M|S_z|J+1 M>^2 = [(J+1)^2 - M^2] [(J+1)^2 - (L-S)^2] [(L+S+1)^2 - (J+1)^2] / [4 (J+1)^2 (2J+1)(2J+3)]

times (g_S - 1). Condon and Shortley, The Theory of Atomic Spectra (1935), section 16.10.
"""

from collections.abc import Iterable
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from levels.constants import G_S, MHZ_PER_WAVENUMBER, MU_B_MHZ_PER_GAUSS
from levels.notation import term_quantum_numbers
from levels.records import Level

NOTABLE_MIXING = 0.01


@dataclass(frozen=True, slots=True)
class Mixing:
    """The largest admixture amplitude of the neighbours and the size of the shift that it makes, at one field."""

    amplitude: float
    shift_mhz: float
    neighbours: tuple[str, ...]


def neighbours(level: Level, others: Iterable[Level]) -> list[Level]:
    """Pick the levels of the same configuration and LS term whose J differs by 1."""
    if level.coupling != "LS" or not level.term:
        return []
    return [
        other
        for other in others
        if other.coupling == "LS"
        and (other.configuration, other.term) == (level.configuration, level.term)
        and other.parity == level.parity
        and abs(other.twice_J - level.twice_J) == 2
    ]


def largest_coupling(twice_L: int, twice_S: int, twice_J_low: int) -> float:
    """Compute the largest |<J M|S_z|J+1 M>| over M, for J = `twice_J_low`/2."""
    L, S, J = twice_L / 2, twice_S / 2, twice_J_low / 2
    M = 0.0 if twice_J_low % 2 == 0 else 0.5
    top = ((J + 1) ** 2 - M**2) * ((J + 1) ** 2 - (L - S) ** 2) * ((L + S + 1) ** 2 - (J + 1) ** 2)
    return float(np.sqrt(max(top, 0.0) / (4 * (J + 1) ** 2 * (2 * J + 1) * (2 * J + 3))))


def mixing(level: Level, others: Iterable[Level], field_gauss: ArrayLike) -> Mixing | None:
    """Estimate what the single-level model neglects at the largest of the fields.

    None where the level has no neighbour of known energy in `others` (a lone level, or one not coupled in LS).
    """
    field = float(np.max(np.abs(field_gauss)))
    amplitude = shift = 0.0
    names = []
    for other in neighbours(level, others):
        if level.energy is None or other.energy is None:
            continue
        numbers = term_quantum_numbers(level.term)
        gap_mhz = abs(other.energy.value - level.energy.value) * MHZ_PER_WAVENUMBER
        lower_J = min(level.twice_J, other.twice_J)
        coupling = largest_coupling(numbers["L"], numbers["S"], lower_J)
        zeeman_mhz = (G_S - 1) * MU_B_MHZ_PER_GAUSS * field * coupling
        amplitude = max(amplitude, zeeman_mhz / gap_mhz)
        shift += zeeman_mhz**2 / gap_mhz
        names.append(other.name)
    return Mixing(amplitude, shift, tuple(names)) if names else None
