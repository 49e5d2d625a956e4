"""How the numbers of one sublevel move with each constant of its Hamiltonian, and the uncertainty that makes.

For H = H0 + b Z + p (P + b W), with Z = dH/dB, P = dH/dp at the field and W = d2H/dBdp, standard non-degenerate
perturbation theory in the eigenbasis gives (R_kl = 1/(E_k - E_l), zero for k = l)

    dE/dp   = P_kk
    ds/dp   = W_kk + 2 sum_l Z_kl P_lk R_kl                                   s: slope
    dq/dp   = 2 sum_l Z_kl W_lk R_kl + 2 sum_lj P_kl Z_lj Z_jk R_kl R_kj
              + sum_lj Z_kl P_lj Z_jk R_kl R_kj - P_kk sum_l Z_kl^2 R_kl^2
              - 2 Z_kk sum_l Z_kl P_lk R_kl^2                                 q: quadratic coefficient, half of d2E/dB2

Landau, Lifshitz, Quantum Mechanics (1977), section 38. The shift from zero field moves as E does, less the zero-field
hyperfine weights. Constants are taken as independent unless they are the same
published value (g_I of one isotope), which enters once.
"""

from collections.abc import Hashable, Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from levels.blocks import Block, hyperfine_weights
from levels.constants import MU_B_MHZ_PER_GAUSS
from levels.quantity import Quantity
from levels.records import Level
from levels.sublevels import HZ_PER_MHZ, Eigen

Array = NDArray[np.float64]
NAMES = ("A", "B", "C", "g_J", "g_I")
ENERGY, SLOPE, QUADRATIC, SHIFT = range(4)


@dataclass(frozen=True, slots=True, eq=False)
class Movement:
    """Derivatives of energy, slope, quadratic coefficient and shift to each of NAMES, shape (4, 5, n, k).

    In MHz, MHz/G, Hz/G2 and MHz, per MHz of A, B, C and per unit of g_J, g_I.
    """

    numbers: Array

    def minus(self, other: "Movement") -> "Movement":
        """Return the movement of a difference of two sublevels of one level."""
        return Movement(self.numbers - other.numbers)


def movement(eigen: Eigen, field_gauss: Array, ranks: Sequence[int] | slice = slice(None)) -> Movement:
    """Differentiate the chosen ranks of one solved block by A, B, C (in MHz), g_J and g_I."""
    part, states, n = eigen.block, eigen.states, field_gauss.size
    steady = np.stack([part.dipole, part.quadrupole, part.octupole])
    linear = MU_B_MHZ_PER_GAUSS * np.stack([part.J_z, part.I_z])
    if part.size == 1:
        numbers = np.zeros((4, 5, n, 1))
        numbers[SLOPE, 3:] = linear[:, :, None]
        numbers[SHIFT, 3:] = linear[:, :, None] * field_gauss[:, None]
        numbers[ENERGY] = numbers[SHIFT]
        numbers[ENERGY, :3] = steady
        return Movement(numbers)
    turn = states.swapaxes(-1, -2)
    P = np.empty((5, n, part.size, part.size))
    W = np.zeros_like(P)
    P[:3] = turn @ (steady[:, None] @ states)
    W[3:] = turn @ (linear[:, None, :, None] * states)
    P[3:] = field_gauss[:, None, None] * W[3:]
    return Movement(_perturbed(eigen, P, W, ranks))


def _perturbed(eigen: Eigen, P: Array, W: Array, ranks: Sequence[int] | slice) -> Array:
    """Evaluate the three sums of the module's head for the chosen ranks, shape (4, 5, n, k)."""
    Z, R = eigen.zeeman_in_eigenbasis(), eigen.inverse_gaps()[:, ranks]
    Z_k, P_k, W_k = Z[:, ranks], P[:, :, ranks], W[:, :, ranks]
    diagonal = np.arange(eigen.block.size)[ranks]
    picked = np.arange(diagonal.size)
    P_kk, W_kk, Z_kk = P_k[:, :, picked, diagonal], W_k[:, :, picked, diagonal], Z_k[:, picked, diagonal]
    ZR = Z_k * R
    ZR2 = ZR * R
    slope = W_kk + 2 * np.sum(ZR * P_k, axis=-1)
    PR, ZP = P_k * R, ZR @ P
    quadratic = (
        2 * np.sum(ZR * W_k, axis=-1)
        + 2 * np.sum((PR @ Z) * ZR, axis=-1)
        + np.sum(ZP * ZR, axis=-1)
        - P_kk * np.sum(ZR * ZR, axis=-1)
        - 2 * Z_kk * np.sum(ZR2 * P_k, axis=-1)
    )
    shift = P_kk.copy()
    labels = [eigen.twice_F[k] for k in diagonal]
    shift[:3] -= _zero_field_weights(eigen.block, labels)[:, None, :]
    return np.stack([P_kk, slope, quadratic * HZ_PER_MHZ, shift])


def _zero_field_weights(part: Block, labels: Sequence[int]) -> Array:
    """Return dE/dA, dE/dB, dE/dC at zero field of each F, shape (3, k)."""
    return np.array([hyperfine_weights(part.twice_J, part.twice_I, F) for F in labels]).T


Terms = dict[Hashable, tuple[Quantity, str, Array]]


def terms_of(level: Level, moved: Movement, sign: float = 1.0) -> Terms:
    """Name each constant's contribution: the constant, its spoken name, and its derivatives (4, n, k).

    Two levels that rest on the same published g_I share its key, so that their contributions add before squaring.
    """
    terms: Terms = {}
    for at, name in enumerate(NAMES):
        constant = getattr(level, name)
        if constant is not None and np.any(moved.numbers[:, at]):
            key: Hashable = (name, constant) if name == "g_I" else (name, level.name)
            owner = level.atom if name == "g_I" else level.name
            terms[key] = (constant, f"{name}({owner})", sign * moved.numbers[:, at])
    return terms


def add_terms(first: Terms, second: Terms) -> Terms:
    """Add the contributions of two sublevels; those with the same key are the same constant."""
    total = dict(first)
    for key, (constant, name, numbers) in second.items():
        known = total.get(key)
        total[key] = (constant, name, numbers if known is None else known[2] + numbers)
    return total


@dataclass(frozen=True, slots=True, eq=False)
class Spread:
    """Standard uncertainties (4, n, k) of energy, slope, quadratic coefficient and shift, and what they leave out."""

    uncertainty: Array
    excludes: tuple[str, ...]


def spread(terms: Mapping[Hashable, tuple[Quantity, str, Array]]) -> Spread:
    """Combine contributions in quadrature; constants without a stated uncertainty are named instead."""
    parts = [numbers * c.uncertainty for c, _, numbers in terms.values() if c.uncertainty is not None]
    excludes = tuple(name for c, name, _ in terms.values() if c.uncertainty is None)
    if parts:
        return Spread(np.sqrt(np.sum(np.square(parts), axis=0)), excludes)
    shape = next(iter(terms.values()))[2].shape if terms else (4, 1, 1)
    return Spread(np.zeros(shape), excludes)
