"""The fine-structure levels of one LS term in one Hamiltonian, from zero field to beyond the Paschen-Back regime.

    H/h = sum_J [E_J + A_J I.J + B_J Q + C_J O] + (muB/h) B [sum_J (g_J J_z + g_I I_z) + (g_S - 1) S_z of J, J+1]

Inside one J this is the Hamiltonian of `blocks` with the level's own published constants; different J are joined by the
Zeeman operator alone, in LS coupling and to all orders. Its elements are those of `multiplet`, with the signs of the
coupling order L, S (Edmonds 7.1.8). Left out: the hyperfine interaction between different J, which is of the size of A
where the field mixes them fully, other terms and the diamagnetic shift.

m = m_J + m_I is conserved, so each m is a block; inside it the k-th energy carries the k-th zero-field (J, F) at every
field. Where two levels of one m almost meet this label follows the energy, not the character of the state.
Energies count from the hyperfine centroid of the level that was asked for.
"""

from dataclasses import dataclass, replace
from functools import lru_cache
from itertools import pairwise

import numpy as np
from numpy.typing import ArrayLike, NDArray

from levels.angular import lande_shares
from levels.blocks import Block, block, block_ms
from levels.constants import G_S, MU_B_MHZ_PER_GAUSS
from levels.errors import OutsideValidity
from levels.fieldgrid import on_grid
from levels.multiplet import spin_element_squared
from levels.notation import term_quantum_numbers
from levels.sublevels import (
    HZ_PER_MHZ,
    Constants,
    Sublevels,
    as_fields,
    constants_of,
    high_field_labels,
    labels_of,
    zero_field_mhz,
)
from levels.terms import Term

Array = NDArray[np.float64]
SPIN_SIGN = -1  # of <(LS)J M|S_z|(LS)J+1 M> in the coupling order L, S, for every L, S, J and M


@dataclass(frozen=True, slots=True)
class TermConstants:
    """The bare numbers of a term: those of each level, by J, and its centroid above that of the level asked for."""

    twice_L: int
    twice_S: int
    twice_I: int
    own: int  # which of the levels was asked for
    levels: tuple[Constants, ...]
    gaps_mhz: tuple[float, ...]


@dataclass(frozen=True, slots=True, eq=False)
class TermBlock:
    """One m of a term: a block of each J that has it, H at zero field, dH/dB and the label of each rank.

    `starts` says where each J begins; `labels` are (position of the level, 2F); all arrays are read-only. `mixing` is
    the part of dH/dB between different J.
    """

    twice_m: int
    parts: tuple[Block, ...]
    which: tuple[int, ...]
    starts: tuple[int, ...]
    still: Array
    zeeman: Array
    mixing: Array
    labels: tuple[tuple[int, int], ...]

    @property
    def size(self) -> int:
        """How many sublevels have this m."""
        return int(self.still.shape[0])

    def ranks_of(self, position: int) -> list[int]:
        """The ranks that belong to one of the levels."""
        return [rank for rank, (at, _) in enumerate(self.labels) if at == position]


@dataclass(frozen=True, slots=True, eq=False)
class TermEigen:
    """One m of a term solved at n fields: energies (n, d) and states as columns (n, d, d), ranked by energy."""

    block: TermBlock
    energy_mhz: Array
    states: Array

    def zeeman_in_eigenbasis(self) -> Array:
        """Return dH/dB between the eigenstates, shape (n, d, d)."""
        return self.states.swapaxes(-1, -2) @ self.block.zeeman @ self.states

    def inverse_gaps(self) -> Array:
        """Return 1/(E_k - E_l) off the diagonal and zero on it, shape (n, d, d)."""
        gaps: Array = self.energy_mhz[:, :, None] - self.energy_mhz[:, None, :]
        gaps[:, range(self.block.size), range(self.block.size)] = np.inf
        return np.asarray(np.reciprocal(gaps))

    def slope_mhz_per_gauss(self) -> Array:
        """Return dE/dB, shape (n, d)."""
        return np.asarray(np.einsum("nik,ij,njk->nk", self.states, self.block.zeeman, self.states))

    def quadratic_mhz_per_gauss2(self) -> Array:
        """Return half of d2E/dB2 by second-order perturbation theory, shape (n, d)."""
        return np.asarray((self.zeeman_in_eigenbasis() ** 2 * self.inverse_gaps()).sum(axis=-1))

    def mean(self, operator: Array) -> Array:
        """Return the expectation of a block operator (d, d) in every state, shape (n, d)."""
        return np.asarray(np.einsum("nik,ij,njk->nk", self.states, operator, self.states))


def term_constants(term: Term) -> TermConstants:
    """Read the bare numbers of a term; NotPublished names a constant that is missing of any of its levels."""
    numbers = term_quantum_numbers(term.level.term) if len(term.levels) > 1 else {"L": 0, "S": term.level.twice_J}
    levels = tuple(constants_of(level) for level in term.levels)
    if len(levels) > 1:  # the mixing is explicit here, so its second-order stand-in goes
        levels = tuple(replace(one, square_mhz_per_gauss2=()) for one in levels)
    gaps = tuple(gap.value for gap in term.gaps)
    return TermConstants(numbers["L"], numbers["S"], term.level.twice_I, term.own, levels, gaps)


def _mixing(constants: TermConstants, parts: list[Block], starts: list[int], size: int) -> Array:
    """Build dH/dB between different J: neighbours in J with the same m_J and m_I."""
    matrix = np.zeros((size, size))
    scale = (G_S - 1) * MU_B_MHZ_PER_GAUSS
    L, S = constants.twice_L, constants.twice_S
    placed = list(zip(parts, starts, strict=False))
    for (low, at_low), (high, at_high) in pairwise(placed):
        if high.twice_J - low.twice_J != 2:
            continue
        for row, twice_M in enumerate(low.twice_mJ):
            column = high.twice_mJ.index(twice_M)
            element = SPIN_SIGN * scale * float(np.sqrt(spin_element_squared(L, S, low.twice_J, twice_M)))
            matrix[at_low + row, at_high + column] = matrix[at_high + column, at_low + row] = element
    return matrix


@lru_cache(maxsize=1024)
def term_block(constants: TermConstants, twice_m: int) -> TermBlock:
    """Make one m of a term: everything that no field changes."""
    which = [at for at, one in enumerate(constants.levels) if abs(twice_m) <= one.twice_J + one.twice_I]
    parts = [block(constants.levels[at].twice_J, constants.twice_I, twice_m) for at in which]
    ends = np.cumsum([0, *(part.size for part in parts)]).tolist()
    still, zeeman = np.zeros((ends[-1], ends[-1])), np.zeros((ends[-1], ends[-1]))
    for at, part, start in zip(which, parts, ends, strict=False):
        own, here = constants.levels[at], slice(start, start + part.size)
        hyperfine = own.A_mhz * part.dipole + own.B_mhz * part.quadrupole + own.C_mhz * part.octupole
        still[here, here] = hyperfine + constants.gaps_mhz[at] * np.eye(part.size)
        zeeman[here, here] = np.diag(MU_B_MHZ_PER_GAUSS * (own.g_J * part.J_z + own.g_I * part.I_z))
    mixing = _mixing(constants, parts, ends, ends[-1])
    zeeman += mixing
    for array in (still, zeeman, mixing):
        array.setflags(write=False)
    labels = _ranked(constants, which, parts)
    return TermBlock(twice_m, tuple(parts), tuple(which), tuple(ends[:-1]), still, zeeman, mixing, labels)


def _ranked(constants: TermConstants, which: list[int], parts: list[Block]) -> tuple[tuple[int, int], ...]:
    """Order (level, 2F) of one m by zero-field energy."""
    energies = {
        (at, F): constants.gaps_mhz[at] + zero_field_mhz(constants.levels[at], F)
        for at, part in zip(which, parts, strict=True)
        for F in part.twice_F
    }
    ranked = sorted(energies, key=energies.__getitem__)
    if len(ranked) > 1 and not np.min(np.diff([energies[label] for label in ranked])) > 0:
        raise OutsideValidity("level", "", "levels of the term coincide at zero field, so J and F label nothing")
    return tuple(ranked)


def solve_term_block(constants: TermConstants, twice_m: int, fields: Array) -> TermEigen:
    """Diagonalise one m of a term at n fields."""
    given = term_block(constants, twice_m)
    return TermEigen(given, *np.linalg.eigh(given.still + fields[:, None, None] * given.zeeman))


def spin_operator(constants: TermConstants, given: TermBlock) -> Array:
    """Build S_z of one m of a term in LS coupling; L_z is J_z less S_z."""
    operator: Array = given.mixing / ((G_S - 1) * MU_B_MHZ_PER_GAUSS)
    for part, start in zip(given.parts, given.starts, strict=True):
        at = range(start, start + part.size)
        if part.twice_J:
            _, share = lande_shares(part.twice_J, constants.twice_L, constants.twice_S)
            operator[at, at] = float(share) * part.J_z
    return operator


def term_ms(constants: TermConstants) -> range:
    """List every doubled m of the term, from the lowest."""
    return block_ms(max(one.twice_J for one in constants.levels), constants.twice_I)


def _tolerance(constants: TermConstants, fields: Array, columns: int, quadratic: bool) -> Array:
    """Return the rounding error that energies, slopes and quadratic coefficients of a long grid may carry."""
    zeeman = MU_B_MHZ_PER_GAUSS * (constants.twice_L + G_S * constants.twice_S + 1) / 2
    energy = max(map(abs, constants.gaps_mhz)) + zeeman * float(np.abs(fields).max()) + 1.0
    sizes = (1e-13 * energy, 1e-12 * zeeman, 1e-9 * zeeman**2 / energy * HZ_PER_MHZ)
    return np.repeat(sizes[: 3 if quadratic else 2], columns)


def term_sublevels(term: Term, field_gauss: ArrayLike, *, quadratic: bool = True) -> Sublevels:
    """Solve every sublevel of the level asked for, in its whole term, at one or many fields.

    The answer has the shape and the labels of `sublevels.sublevels`. `twice_mJ` and `twice_mI` are the labels of the
    level by itself: those of fields that undo its hyperfine structure and not yet its fine structure.
    """
    constants, fields = term_constants(term), as_fields(field_gauss)
    own = constants.levels[constants.own]
    labels = labels_of(own)
    order = {label: k for k, label in enumerate(labels)}
    marks = np.empty((4, len(labels)), dtype=np.int64)
    places = {}
    for twice_m in block_ms(own.twice_J, own.twice_I):
        given = term_block(constants, twice_m)
        ranks = given.ranks_of(constants.own)
        at = [order[given.labels[rank][1], twice_m] for rank in ranks]
        places[twice_m] = ranks, at
        strong = high_field_labels(own, twice_m)
        if np.all(fields < 0):
            strong = strong[::-1]
        marks[:, at] = [[given.labels[rank][1] for rank in ranks], [twice_m] * len(at), *zip(*strong, strict=True)]

    def columns(some: Array) -> Array:
        numbers = np.empty((some.size, 3 if quadratic else 2, len(labels)))
        for twice_m, (ranks, at) in places.items():
            eigen = solve_term_block(constants, twice_m, some)
            numbers[:, 0, at] = eigen.energy_mhz[:, ranks]
            numbers[:, 1, at] = eigen.slope_mhz_per_gauss()[:, ranks]
            if quadratic:
                numbers[:, 2, at] = eigen.quadratic_mhz_per_gauss2()[:, ranks] * HZ_PER_MHZ
        return numbers.reshape(some.size, -1)

    flat = on_grid(columns, fields, _tolerance(constants, fields, len(labels), quadratic))
    numbers = flat.reshape(fields.size, -1, len(labels))
    still = np.array([zero_field_mhz(own, int(F)) for F in marks[0]])
    second = numbers[:, 2] if quadratic else np.empty((fields.size, 0))
    F, m, mJ, mI = marks
    return Sublevels(term.level, fields, F, m, mJ, mI, still, numbers[:, 0], numbers[:, 1], second)
