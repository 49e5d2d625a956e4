"""The polarisability of every sublevel of a level in one light, its uncertainty, and how far it is excited.

The same sums as `response`, for all sublevels at once from the elements that the operator is made of.
"""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from levels.constants import HARTREE_MHZ
from levels.lightshift import Coupled, Light, Manifold, scale_mhz2
from levels.partners import Doubt, Partners, Weighing, doubt_of, line_terms, remainder_terms
from levels.polarisability import vector_and_tensor_bounds, vector_and_tensor_caps

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True, eq=False)
class Diagonal:
    """Polarisability (s,) of each sublevel in a0^3, its doubt, and the share of the atom that the light excites."""

    polarisability_a03: Array
    doubt: Doubt
    excited: Array


def diagonal(partners: Partners, here: Manifold, coupled: Sequence[Coupled], light: Light) -> Diagonal:
    """Sum the polarisability of every sublevel, in the order of the manifold's labels."""
    nu, size = light.frequency_mhz, len(here.labels)
    shares, slopes, excited = {}, {}, np.zeros(size)
    for part in coupled:
        near, far = part.gap_mhz - nu, part.gap_mhz + nu
        V, W = (
            np.abs(np.tensordot(np.array(drive), part.elements, 1)) ** 2 for drive in (light.drive, light.counter_drive)
        )
        turned = 1.0 if part.line.lower.name == here.level.name else -1.0
        shares[part.line.name] = HARTREE_MHZ * (V / near + W / far).sum(axis=0)
        slopes[part.line.name] = -turned * HARTREE_MHZ * (V / near**2 + W / far**2).sum(axis=0)
        excited += scale_mhz2(light.intensity_mw_per_cm2) * (V / near**2 + W / far**2).sum(axis=0)
    frequency = np.full(size, nu)
    terms = line_terms(partners, shares, slopes, anchor=1.0)
    terms |= remainder_terms(partners, frequency, _weighing(partners, here, light, frequency))
    total = partners.remainder.value + sum(shares.values(), np.zeros(size))
    return Diagonal(total, doubt_of(terms, size), excited)


def _weighing(partners: Partners, here: Manifold, light: Light, frequency: Array) -> Weighing:
    orientation, alignment = mixtures(here)
    turned, tilted = vector_and_tensor_bounds(partners.level.twice_J)
    turn = np.abs(light.circularity * orientation)
    slant = np.abs((3 * light.fractions[1] - 1) / 2 * alignment)
    caps = vector_and_tensor_caps(partners, frequency)
    bounds = None if caps is None else (caps[0] * turn, caps[1] * slant)
    return Weighing(1.0, turned * turn, tilted * slant, 0.0, bounds)


def mixtures(here: Manifold) -> tuple[Array, Array]:
    """Return <J_z>/2J and <3 J_z^2 - J(J+1)>/J(2J-1) of every sublevel; zero where J has neither."""
    J = here.level.twice_J / 2
    orientation, alignment = np.zeros(len(here.labels)), np.zeros(len(here.labels))
    for k, (twice_F, twice_m) in enumerate(here.labels):
        eigen = here.blocks[twice_m]
        share = eigen.states[0][:, eigen.twice_F.index(twice_F)] ** 2
        if J > 0:
            orientation[k] = share @ eigen.block.J_z / (2 * J)
        if J > 0.5:
            alignment[k] = share @ (3 * eigen.block.J_z**2 - J * (J + 1)) / (J * (2 * J - 1))
    return orientation, alignment
