"""How the numbers of one sublevel move with each constant of its Hamiltonian, and the uncertainty that makes.

For H = H0 + b Z + p (P + b W), with Z = dH/dB, P = dH/dp at the field and W = d2H/dBdp, standard non-degenerate
perturbation theory in the eigenbasis gives (R_kl = 1/(E_k - E_l), zero for k = l)

    dE/dp   = P_kk
    ds/dp   = W_kk + 2 sum_l Z_kl P_lk R_kl                                   s: slope
    dq/dp   = 2 sum_l Z_kl W_lk R_kl + 2 sum_lj P_kl Z_lj Z_jk R_kl R_kj
              + sum_lj Z_kl P_lj Z_jk R_kl R_kj - P_kk sum_l Z_kl^2 R_kl^2
              - 2 Z_kk sum_l Z_kl P_lk R_kl^2 + 2 sum_l D_kl P_lk R_kl        q: quadratic coefficient, half of d2E/dB2

(D = half of d2H/dB2, the fine-structure term.)

Landau, Lifshitz, Quantum Mechanics (1977), section 38. The shift from zero field moves as E does, less the zero-field
hyperfine weights. Constants are taken as independent unless they are the same published value (g_I of one isotope),
which enters once.

Some constants have no stated uncertainty (a Lande factor by formula, a value printed without one). Nothing is guessed
for them: they are named, and where a change by `UNSTATED_SHARE` of its size would move a number by more than the rest
is uncertain, that number has no uncertainty (NaN). Measured g_J depart from the coupling formulas by about that share. The
second-order mixing of `multiplet` is treated alike, at `MIXING_SHARE`.
"""

from collections.abc import Hashable, Mapping, Sequence
from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from levels.blocks import Block, hyperfine_weights
from levels.quantity import Quantity
from levels.records import Level
from levels.sublevels import HZ_PER_MHZ, Eigen

Array = NDArray[np.float64]
NAMES = ("A", "B", "C", "g_J", "g_I")
MIXING = len(NAMES)  # the row after the constants: the second-order mixing, per relative change
ENERGY, SLOPE, QUADRATIC, SHIFT = range(4)
UNSTATED_SHARE = 1e-4
MIXING_SHARE = 1e-2
CANCELLED = 1e-12  # of a contribution: what is left of two that are equal and opposite, beyond rounding


@dataclass(frozen=True, slots=True, eq=False)
class Movement:
    """Derivatives of energy, slope, quadratic coefficient and shift to each of NAMES and to MIXING, shape (4, 6, n, k).

    In MHz, MHz/G, Hz/G2 and MHz, per MHz of A, B, C, per unit of g_J, g_I and per relative change of the mixing.
    """

    numbers: Array

    def minus(self, other: "Movement") -> "Movement":
        """Return the movement of a difference of two sublevels of one level."""
        return Movement(self.numbers - other.numbers)


def movement(eigen: Eigen, field_gauss: Array, ranks: Sequence[int] | slice = slice(None)) -> Movement:
    """Differentiate the chosen ranks of one solved block by A, B, C (in MHz), g_J and g_I."""
    given, chosen = eigen.given, eigen.states[:, :, ranks]
    P_v, W_v = _applied(eigen, chosen, field_gauss)
    everything = np.zeros((4, MIXING + 1, field_gauss.size, chosen.shape[-1]))
    numbers = everything[:, :MIXING]
    numbers[ENERGY] = numbers[SHIFT] = (chosen * P_v).sum(axis=-2)
    numbers[SHIFT, :3] -= _zero_field_weights(given.block, given.twice_F)[:, None, ranks]
    numbers[SLOPE, 3:] = (chosen * W_v).sum(axis=-2)
    if given.zeeman.size > 1:
        _perturb(numbers, eigen, (P_v, W_v), field_gauss, ranks)
    if given.square.any():
        square, field = given.square @ (chosen * chosen), field_gauss[:, None]
        everything[:, MIXING] = field**2 * square, 2 * field * square, square * HZ_PER_MHZ, field**2 * square
    return Movement(everything)


def _applied(eigen: Eigen, vectors: Array, field_gauss: Array) -> tuple[Array, Array]:
    """Apply dH/dp for the five constants (5, n, d, k), and d2H/dBdp for the two g factors (2, n, d, k), to vectors."""
    W = eigen.given.linear[:, None, :, None] * vectors
    P = np.empty((len(NAMES), *vectors.shape))
    P[:3] = eigen.given.steady[:, None] @ vectors
    P[3:] = field_gauss[:, None, None] * W
    return P, W


def _perturb(
    numbers: Array, eigen: Eigen, applied: tuple[Array, Array], field_gauss: Array, ranks: Sequence[int] | slice
) -> None:
    """Add the sums over other states of the module's head to slope and quadratic coefficient, in place."""
    turn, Z = eigen.states.swapaxes(-1, -2), eigen.zeeman_in_eigenbasis()
    R = -eigen.inverse_gaps()[:, :, ranks]  # (n, l, k) with k the chosen rank: 1/(E_k - E_l)
    ZR = Z[:, :, ranks] * R
    P_lk, W_lk = turn @ applied[0], turn @ applied[1]
    numbers[SLOPE] += 2 * (ZR * P_lk).sum(axis=-2)
    mixed = eigen.states @ ZR
    Z_kk = Z.diagonal(axis1=1, axis2=2)[:, None, ranks]
    weight = 2 * R * (Z @ ZR - Z_kk * ZR)
    square = turn @ (eigen.given.square[:, None] * eigen.states[:, :, ranks])
    quadratic = ((weight + 2 * R * square) * P_lk).sum(axis=-2)
    quadratic += (mixed * _applied(eigen, mixed, field_gauss)[0]).sum(axis=-2)
    quadratic -= numbers[ENERGY] * (ZR * ZR).sum(axis=-2)
    quadratic[3:] += 2 * (ZR * W_lk).sum(axis=-2)
    numbers[QUADRATIC] = quadratic * HZ_PER_MHZ


@lru_cache(maxsize=4096)
def _zero_field_weights(part: Block, labels: tuple[int, ...]) -> Array:
    """Return dE/dA, dE/dB, dE/dC at zero field of each F, shape (3, k)."""
    weights = np.array([hyperfine_weights(part.twice_J, part.twice_I, F) for F in labels]).T
    weights.setflags(write=False)
    return weights


Term = tuple[Quantity | None, str, Array]
Terms = dict[Hashable, Term]


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
    if np.any(moved.numbers[:, MIXING]):
        name = f"fine-structure mixing({level.name})"
        terms["mixing", level.name] = (None, name, sign * moved.numbers[:, MIXING])
    return terms


def add_terms(first: Terms, second: Terms) -> Terms:
    """Add the contributions of two sublevels; those with the same key are the same constant.

    A constant whose contributions cancel drops out, so that nobody is told that its uncertainty is missing.
    """
    total = dict(first)
    for key, (constant, name, numbers) in second.items():
        known = total.pop(key, None)
        together = numbers if known is None else known[2] + numbers
        if np.any(np.abs(together) > CANCELLED * np.abs(numbers)):
            total[key] = (constant, name, together)
    return total


@dataclass(frozen=True, slots=True, eq=False)
class Spread:
    """Standard uncertainties (4, n, k) of energy, slope, quadratic coefficient and shift, and what they leave out.

    `stated` is the part that stated uncertainties make; `uncertainty` is the same, or NaN where what is left out could
    weigh more. `excludes` names the constants without a stated uncertainty that move any of the numbers.
    """

    uncertainty: Array
    stated: Array
    excludes: tuple[str, ...]


def spread(terms: Mapping[Hashable, Term]) -> Spread:
    """Combine stated contributions in quadrature; name the rest, and say where it could outweigh them."""
    shape = next(iter(terms.values()))[2].shape if terms else (4, 1, 1)
    variance, doubt = np.zeros(shape), np.zeros(shape)
    for constant, _, numbers in terms.values():
        if constant is not None and constant.uncertainty is not None:
            variance += (numbers * constant.uncertainty) ** 2
        else:
            doubt = np.maximum(doubt, np.abs(numbers) * _share(constant))
    stated = np.sqrt(variance)
    lost = doubt > stated
    excludes = tuple(
        name
        for constant, name, numbers in terms.values()
        if (constant is None and np.any(np.abs(numbers) * MIXING_SHARE > stated))
        or (constant is not None and constant.uncertainty is None)
    )
    return Spread(np.where(lost, np.nan, stated), stated, excludes)


def _share(constant: Quantity | None) -> float:
    return MIXING_SHARE if constant is None else UNSTATED_SHARE * abs(constant.value)
