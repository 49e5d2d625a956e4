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
is uncertain, that number has no uncertainty (NaN). Measured g_J of S, P and D doublets depart from the LS formula by
about that share (133Cs 6P3/2 1.5e-5, 138Ba+ 5D5/2 8e-5); of other levels by up to `COUPLED_SHARE` (174Yb 3P1 0.6 %,
199Hg 3P1 1 %), for coupling there is only nearly pure.
The second-order mixing of `multiplet` is treated alike, at `MIXING_SHARE`.
"""

from collections.abc import Hashable, Sequence
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
COUPLED_SHARE = 1e-2
DOUBLETS = ("2S", "2P", "2D")
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
    if given.mixes:
        square, field = given.square @ (chosen * chosen), field_gauss[:, None]
        everything[:, MIXING] = field**2 * square, 2 * field * square, square * HZ_PER_MHZ, field**2 * square
    return Movement(everything)


def _applied(eigen: Eigen, vectors: Array, field_gauss: Array) -> tuple[Array, Array]:
    """Apply dH/dp for the five constants (5, n, d, k), and d2H/dBdp for the two g factors (2, n, d, k), to vectors."""
    W = eigen.given.linear[:, None, :, None] * vectors
    P = np.empty((len(NAMES), *vectors.shape))
    np.matmul(eigen.given.steady[:, None], vectors, out=P[:3])
    np.multiply(field_gauss[:, None, None], W, out=P[3:])
    return P, W


def _perturb(
    numbers: Array, eigen: Eigen, applied: tuple[Array, Array], field_gauss: Array, ranks: Sequence[int] | slice
) -> None:
    """Add the sums over other states of the module's head to slope and quadratic coefficient, in place.

    All arrays are (n, l, k) with k the chosen rank and l every state of the block.
    """
    states, chosen = eigen.states, eigen.states[:, :, ranks]
    turn, moving = states.swapaxes(-1, -2), eigen.moving[:, :, None]
    R = eigen.inverse_gaps_to(ranks)
    Z = turn @ (moving * chosen)
    ZR = Z * R
    mixed = states @ ZR
    P_lk, W_lk = turn @ applied[0], turn @ applied[1]
    numbers[SLOPE] += 2 * (ZR * P_lk).sum(axis=-2)
    Z_kk = (chosen * chosen * moving).sum(axis=-2)[:, None]
    weight = turn @ (moving * mixed) - Z_kk * ZR
    if eigen.given.mixes:
        weight += turn @ (eigen.given.square[:, None] * chosen)
    quadratic = (2 * R * weight * P_lk).sum(axis=-2)
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


@dataclass(frozen=True, slots=True, eq=False)
class Terms:
    """Contributions of constants to the numbers of some sublevels: derivatives of shape (t, 4, n, k), a row each.

    A key says which rows of two sublevels are the same constant; the mixing has no constant.
    """

    keys: tuple[Hashable, ...]
    constants: tuple[Quantity | None, ...]
    names: tuple[str, ...]
    numbers: Array


def terms_of(level: Level, moved: Movement, sign: float = 1.0) -> Terms:
    """Name each constant's contribution.

    Two levels that rest on the same published g_I share its key, so that their contributions add before squaring.
    """
    constants = (level.A, level.B, level.C, level.g_J, level.g_I, None)
    own, pure = level.name, level.coupling == "LS" and level.term in DOUBLETS
    keys = (("A", own), ("B", own), ("C", own), ("g_J", own, pure), ("g_I", level.g_I), ("mixing", own))
    names = (
        f"A({own})",
        f"B({own})",
        f"C({own})",
        f"g_J({own})",
        f"g_I({level.atom})",
        f"fine-structure mixing({own})",
    )
    return Terms(keys, constants, names, sign * moved.numbers.swapaxes(0, 1))


def add_terms(first: Terms, second: Terms) -> Terms:
    """Add the contributions of two sublevels; those with the same key are the same constant."""
    places = [first.keys.index(key) if key in first.keys else -1 for key in second.keys]
    apart = [row for row, place in enumerate(places) if place < 0]
    total = np.concatenate([first.numbers, second.numbers[apart]])
    for row, place in enumerate(places):
        if place >= 0:
            total[place] += second.numbers[row]
    return Terms(
        (*first.keys, *(second.keys[row] for row in apart)),
        (*first.constants, *(second.constants[row] for row in apart)),
        (*first.names, *(second.names[row] for row in apart)),
        total,
    )


@dataclass(frozen=True, slots=True, eq=False)
class Spread:
    """Standard uncertainties (4, n, k) of energy, slope, quadratic coefficient and shift, and what they leave out.

    `stated` is the part that stated uncertainties make; `uncertainty` is the same, or NaN where what is left out could
    weigh more. `excludes` names the constants without a stated uncertainty that move any of the numbers.
    """

    uncertainty: Array
    stated: Array
    excludes: tuple[str, ...]


@dataclass(frozen=True, slots=True, eq=False)
class Weights:
    """How open each constant of some terms is: squares of stated uncertainties (t,), and the rest to be allowed for.

    `unstated` has the rows without a stated uncertainty, `shares` the change to allow for in each, `mixing` whether
    it is the second-order mixing.
    """

    variances: Array
    unstated: NDArray[np.int64]
    shares: Array
    mixing: list[bool]


def weights_of(terms: Terms) -> Weights:
    """Read the stated uncertainties of some terms' constants, and the changes to allow for in the others."""
    sigmas = np.array([0.0 if constant is None else constant.uncertainty or 0.0 for constant in terms.constants])
    shares = np.array([_share(constant, key) for constant, key in zip(terms.constants, terms.keys, strict=True)])
    unstated = shares.nonzero()[0]
    return Weights(sigmas**2, unstated, shares[unstated, None], [terms.constants[row] is None for row in unstated])


def spread(terms: Terms, weights: Weights | None = None) -> Spread:
    """Combine stated contributions in quadrature; name the rest, and say where it could outweigh them.

    A constant that a level does not have moves nothing here: `sublevels.cautions` speaks of it. `weights` are those of
    the terms, for a caller that has them already.
    """
    weights = weights or weights_of(terms)
    shape = terms.numbers.shape[1:]
    rows = terms.numbers.reshape(weights.variances.size, -1)
    stated = np.sqrt(weights.variances @ (rows * rows))
    if not weights.mixing:
        return Spread(stated.reshape(shape), stated.reshape(shape), ())
    doubts = np.abs(rows.take(weights.unstated, axis=0)) * weights.shares
    beyond = doubts > stated
    uncertainty = np.where(np.logical_or.reduce(beyond), np.nan, stated)
    outweighs, moves = beyond.tolist(), doubts.tolist()
    excludes = tuple(
        terms.names[row]
        for row, mixing, one, other in zip(weights.unstated.tolist(), weights.mixing, outweighs, moves, strict=True)
        if any(one if mixing else other)
    )
    return Spread(uncertainty.reshape(shape), stated.reshape(shape), excludes)


def _share(constant: Quantity | None, key: Hashable) -> float:
    """The change to allow for in a constant without a stated uncertainty; 0 where one is stated or nothing is known."""
    if constant is None:
        return MIXING_SHARE if isinstance(key, tuple) and key[0] == "mixing" else 0.0
    if constant.uncertainty is not None:
        return 0.0
    formula = isinstance(key, tuple) and key[0] == "g_J" and constant.evidence == "computed" and not key[2]
    return (COUPLED_SHARE if formula else UNSTATED_SHARE) * abs(constant.value)
