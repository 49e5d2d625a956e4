"""How the sublevels of a whole term move with each constant of its Hamiltonian, and the uncertainty that makes.

The perturbation sums are those of `sensitivity`, for any number of constants: those of every level of the term and the
intervals between them. Two things have no stated uncertainty and are treated alike: the LS coupling of the Zeeman
elements between J (at `MIXING_SHARE` of them), and the hyperfine interaction between J, which the model leaves out. Its
operator is a rank-1 tensor in J, hence proportional to I.S there; its size is taken as that of the two A together.
"""

from collections.abc import Hashable, Sequence
from dataclasses import dataclass
from functools import lru_cache
from itertools import pairwise

import numpy as np
from numpy.typing import ArrayLike, NDArray

from levels.angular import multipole_elements
from levels.blocks import hyperfine_weights
from levels.constants import MU_B_MHZ_PER_GAUSS
from levels.notation import format_half
from levels.quantity import Quantity
from levels.records import Level
from levels.sensitivity import (
    ENERGY,
    MIXING_SHARE,
    NAMES,
    QUADRATIC,
    SHIFT,
    SLOPE,
    UNSTATED_SHARE,
    Spread,
)
from levels.strongfield import SPIN_SIGN, TermBlock, TermEigen, solve_term_block, term_block, term_constants
from levels.sublevels import HZ_PER_MHZ, as_fields, labels_of
from levels.terms import Term

Array = NDArray[np.float64]
NEGLIGIBLE = 1e-3  # of the rest of the uncertainty: below it a constant without a stated one is not named


@dataclass(frozen=True, slots=True, eq=False)
class Parameter:
    """One constant of the Hamiltonian: dH/dp = still + B moving, and dE/dp of each rank at zero field.

    `share` is the change to allow for where no uncertainty is stated.
    """

    key: Hashable
    constant: Quantity | None
    share: float
    name: str
    still: Array
    moving: Array
    at_zero: Array


Contributions = dict[Hashable, tuple[Parameter, Array]]


@lru_cache(maxsize=512)
def parameters(term: Term, twice_m: int) -> tuple[Parameter, ...]:
    """List every constant that moves one m of a term."""
    constants = term_constants(term)
    given = term_block(constants, twice_m)
    nothing = np.zeros_like(given.still)
    found = []
    for at, part, start in zip(given.which, given.parts, given.starts, strict=True):
        level, here = term.levels[at], slice(start, start + part.size)
        operators = (part.dipole, part.quadrupole, part.octupole, np.diag(part.J_z), np.diag(part.I_z))
        for name, operator in zip(NAMES, operators, strict=True):
            constant = getattr(level, name)
            if constant is None or not operator.any():
                continue
            matrix = nothing.copy()
            matrix[here, here] = operator * (MU_B_MHZ_PER_GAUSS if name.startswith("g") else 1.0)
            still, moving = (nothing, matrix) if name.startswith("g") else (matrix, nothing)
            found.append(_of_level(level, constant, name, still, moving, _weights(given, at, level, name)))
        if at != constants.own:
            found.append(_of_gap(term, given, at, here))
    if given.mixing.any():
        key, name = ("mixing", term.level.name), f"fine-structure mixing({term.level.name})"
        found.append(Parameter(key, None, MIXING_SHARE, name, nothing, given.mixing, np.zeros(given.size)))
        found += _between_levels(term, given)
    return tuple(found)


def _of_level(level: Level, constant: Quantity, name: str, still: Array, moving: Array, at_zero: Array) -> Parameter:
    key: Hashable = (name, constant) if name == "g_I" else (name, level.name)
    owner = level.atom if name == "g_I" else level.name
    return Parameter(key, constant, _allowed(constant), f"{name}({owner})", still, moving, at_zero)


def _allowed(constant: Quantity) -> float:
    return UNSTATED_SHARE * abs(constant.value)


def _weights(given: TermBlock, at: int, level: Level, name: str) -> Array:
    """Return dE/dA, dE/dB or dE/dC of each rank at zero field, and zero for the g factors."""
    weights = np.zeros(given.size)
    if name in NAMES[:3]:
        for rank, (owner, F) in enumerate(given.labels):
            if owner == at:
                weights[rank] = hyperfine_weights(level.twice_J, level.twice_I, F)[NAMES.index(name)]
    return weights


def _of_gap(term: Term, given: TermBlock, at: int, here: slice) -> Parameter:
    matrix = np.zeros_like(given.still)
    matrix[here, here] = np.eye(here.stop - here.start)
    at_zero = np.array([float(owner == at) for owner, _ in given.labels])
    low, high = term.level.name, term.levels[at].name
    name = f"interval({low}, {high})"
    gap = term.gaps[at]
    return Parameter(("interval", low, high), gap, _allowed(gap), name, matrix, 0 * matrix, at_zero)


def _between_levels(term: Term, given: TermBlock) -> list[Parameter]:
    """List the hyperfine interactions between neighbouring J, each with its likely size."""
    found = []
    placed = list(zip(given.which, given.parts, given.starts, strict=True))
    for (at, low, row), (other, high, column) in pairwise(placed):
        one, two = term.levels[at], term.levels[other]
        size = sum(abs(level.A.value) for level in (one, two) if level.A is not None)
        if high.twice_J - low.twice_J != 2 or not size or not low.twice_I:
            continue
        matrix = np.zeros_like(given.still)
        block = _rank_one(low.twice_J, low.twice_I, low.twice_mJ, high.twice_mJ, given.twice_m)
        matrix[row : row + low.size, column : column + high.size] = block
        matrix += matrix.T
        pair = f"J = {format_half(low.twice_J)} and {format_half(high.twice_J)}"
        name = f"hyperfine interaction between {pair}({term.level.name})"
        key = ("between", one.name, two.name)
        found.append(Parameter(key, None, size, name, matrix, 0 * matrix, np.zeros(given.size)))
    return found


def _rank_one(twice_J: int, twice_I: int, low_mJ: Sequence[int], high_mJ: Sequence[int], twice_m: int) -> Array:
    """Build the scalar product of a rank-1 tensor between J and J+1, of unit size, with I, in one m (rows J)."""
    electronic = multipole_elements(twice_J, twice_J + 2, 1)
    I = twice_I / 2
    matrix = np.zeros((len(low_mJ), len(high_mJ)))
    for row, mJ in enumerate(low_mJ):
        for column, mJ_up in enumerate(high_mJ):
            q = (mJ_up - mJ) // 2
            mI = (twice_m - mJ_up) / 2  # the nucleus goes from m_I + q to m_I
            if q == 0:
                nuclear = mI
            elif abs(q) == 1:
                nuclear = q * float(np.sqrt(max(I * (I + 1) - mI * (mI + q), 0.0) / 2))
            else:
                continue
            matrix[row, column] = SPIN_SIGN * (-1) ** q * electronic.get((mJ, mJ_up), 0.0) * nuclear
    return matrix


def moved(eigen: TermEigen, parameter: Parameter, field_gauss: Array, ranks: Sequence[int]) -> Array:
    """Differentiate energy, slope, quadratic coefficient and shift of the chosen ranks, shape (4, n, k)."""
    chosen = eigen.states[:, :, ranks]
    turn, Z = eigen.states.swapaxes(-1, -2), eigen.zeeman_in_eigenbasis()
    R = -eigen.inverse_gaps()[:, :, ranks]
    ZR = Z[:, :, ranks] * R
    P = parameter.still + field_gauss[:, None, None] * parameter.moving
    P_lk, W_lk = turn @ (P @ chosen), turn @ (parameter.moving @ chosen)
    numbers = np.empty((4, field_gauss.size, len(ranks)))
    numbers[ENERGY] = np.einsum("nik,nik->nk", chosen, P @ chosen)
    numbers[SHIFT] = numbers[ENERGY] - parameter.at_zero[list(ranks)]
    numbers[SLOPE] = np.einsum("nik,nik->nk", chosen, parameter.moving @ chosen) + 2 * (ZR * P_lk).sum(axis=-2)
    Z_kk = Z.diagonal(axis1=1, axis2=2)[:, None, list(ranks)]
    quadratic = (2 * R * (Z @ ZR - Z_kk * ZR) * P_lk).sum(axis=-2)
    mixed = eigen.states @ ZR
    quadratic += (mixed * (P @ mixed)).sum(axis=-2) - numbers[ENERGY] * (ZR * ZR).sum(axis=-2)
    quadratic += 2 * (ZR * W_lk).sum(axis=-2)
    numbers[QUADRATIC] = quadratic * HZ_PER_MHZ
    return numbers


def contributions(
    term: Term, fields: Array, labels: Sequence[tuple[int, int]], sign: float = 1.0, position: int | None = None
) -> Contributions:
    """Differentiate the listed sublevels (2F, 2m) of one level of the term by every constant, shape (4, n, k) each."""
    constants = term_constants(term)
    position = constants.own if position is None else position
    total: Contributions = {}
    for twice_m in sorted({m for _, m in labels}):
        eigen = solve_term_block(constants, twice_m, fields)
        at = [k for k, (_, m) in enumerate(labels) if m == twice_m]
        ranks = [eigen.block.labels.index((position, labels[k][0])) for k in at]
        for parameter in parameters(term, twice_m):
            known = total.get(parameter.key)
            numbers = np.zeros((4, fields.size, len(labels))) if known is None else known[1]
            numbers[:, :, at] += sign * moved(eigen, parameter, fields, ranks)
            total[parameter.key] = parameter, numbers
    return total


def joined(first: Contributions, second: Contributions) -> Contributions:
    """Add the contributions of two sublevels; those with the same key are the same constant."""
    total = dict(first)
    for key, (parameter, numbers) in second.items():
        total[key] = parameter, numbers + total[key][1] if key in total else numbers
    return total


def spread_of(total: Contributions) -> Spread:
    """Combine stated uncertainties in quadrature; where something without one could outweigh them there is none (NaN).

    Constants without a stated uncertainty are named where they matter at all.
    """
    shape = next(iter(total.values()))[1].shape
    stated, doubts = np.zeros(shape), {}
    for parameter, numbers in total.values():
        if parameter.constant is not None and parameter.constant.uncertainty is not None:
            stated = np.hypot(stated, numbers * parameter.constant.uncertainty)
        else:
            doubts[parameter.name] = np.abs(numbers) * parameter.share
    largest = np.max([np.zeros(shape), *doubts.values()], axis=0)
    matter = NEGLIGIBLE * (stated + largest)
    excludes = tuple(name for name, doubt in doubts.items() if np.any(doubt > matter))
    return Spread(np.where(largest > stated, np.nan, stated), stated, excludes)


def term_spread(term: Term, field_gauss: ArrayLike) -> Spread:
    """Compute the standard uncertainties of the table of sublevels in its term, shape (4, n, s)."""
    fields, labels = as_fields(field_gauss), labels_of(term_constants(term).levels[term.own])
    return spread_of(contributions(term, fields, labels))
