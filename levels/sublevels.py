"""Sublevels of one level in a magnetic field: energies, slopes, quadratic coefficients and states.

Each m-block of `blocks` is diagonalised by itself: sizes 1 and 2 in closed form, the rest by LAPACK. Inside a block
adiabatic levels never cross, so the k-th energy carries the k-th zero-field F and nothing is tracked along the field.
Slopes are exact (Hellmann-Feynman) and quadratic coefficients come from second-order perturbation theory.

Field in gauss, signed along z; energies in MHz from the level's hyperfine centroid; `slope` is dE/dB at the field;
`quadratic` is half the second derivative. The moment along z is -dE/dB.
"""

from collections.abc import Sequence
from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import ArrayLike, NDArray

from levels.blocks import Block, block, block_ms, hyperfine_shift
from levels.constants import MU_B_MHZ_PER_GAUSS
from levels.errors import NotPublished, OutsideValidity, UnknownName
from levels.fieldgrid import on_grid
from levels.multiplet import second_order
from levels.notation import format_half, format_sublevel
from levels.records import Level

Array = NDArray[np.float64]
HZ_PER_MHZ = 1e6
LARGEST_FIELD_GAUSS = 1e6


@dataclass(frozen=True, slots=True)
class Constants:
    """The bare numbers of one level that its Hamiltonian needs (A, B, C in MHz, g factors in Bohr magnetons)."""

    twice_J: int
    twice_I: int
    A_mhz: float = 0.0
    B_mhz: float = 0.0
    C_mhz: float = 0.0
    g_J: float = 0.0
    g_I: float = 0.0
    square_mhz_per_gauss2: tuple[float, ...] = ()  # second-order fine-structure shift of each m_J, see `multiplet`


@dataclass(frozen=True, slots=True, eq=False)
class Eigen:
    """One block solved at n fields: energies (n, d) and states as columns (n, d, d), ranked by energy.

    `moving` is the diagonal of dH/dB at each field, shape (n, d).
    """

    given: "Prepared"
    moving: Array
    energy_mhz: Array
    states: Array

    @property
    def block(self) -> Block:
        """The block that was solved."""
        return self.given.block

    @property
    def twice_F(self) -> tuple[int, ...]:
        """The zero-field label 2F of each rank."""
        return self.given.twice_F

    def slope_mhz_per_gauss(self) -> Array:
        """Return dE/dB, shape (n, d)."""
        slope: Array = (self.moving[:, None, :] @ (self.states * self.states))[:, 0, :]
        return slope

    def inverse_gaps_to(self, ranks: Sequence[int] | slice) -> Array:
        """Return 1/(E_k - E_l) for every l and the chosen k, zero for l = k, shape (n, l, k)."""
        gaps: Array = self.energy_mhz[:, None, ranks] - self.energy_mhz[:, :, None]
        gaps[gaps == 0.0] = np.inf
        inverse: Array = np.reciprocal(gaps)
        return inverse

    def quadratic_mhz_per_gauss2(self, ranks: Sequence[int] | slice = slice(None)) -> Array:
        """Return half of d2E/dB2 of the chosen ranks by second-order perturbation theory, shape (n, k)."""
        chosen = self.states[:, :, ranks]
        result: Array = self.given.square @ (chosen * chosen) if self.given.mixes else np.zeros(chosen.shape[::2])
        if self.energy_mhz.shape[1] > 1:
            Z = self.states.swapaxes(-1, -2) @ (self.moving[:, :, None] * chosen)
            result += (Z * Z * self.inverse_gaps_to(ranks)).sum(axis=-2)
        return result


@dataclass(frozen=True, slots=True, eq=False)
class Sublevels:
    """Every sublevel of a level at n fields; labels have shape (s,), numbers (n, s), ordered by F and then m.

    `twice_mJ` and `twice_mI` are the high-field labels: those the sublevel reaches as the field grows along its sign.
    """

    level: Level
    field_gauss: Array
    twice_F: NDArray[np.int64]
    twice_m: NDArray[np.int64]
    twice_mJ: NDArray[np.int64]
    twice_mI: NDArray[np.int64]
    zero_field_mhz: Array
    energy_mhz: Array
    slope_mhz_per_gauss: Array
    quadratic_hz_per_gauss2: Array

    @property
    def shift_mhz(self) -> Array:
        """Energy above the same sublevel's at zero field, shape (n, s)."""
        return self.energy_mhz - self.zero_field_mhz

    @property
    def moment_mu_b(self) -> Array:
        """Magnetic moment along z in Bohr magnetons, -dE/dB, shape (n, s)."""
        moment: Array = -self.slope_mhz_per_gauss / MU_B_MHZ_PER_GAUSS
        return moment


def constants_of(level: Level) -> Constants:
    """Read the bare numbers of a level; a constant that matters and is not published raises NotPublished.

    A is needed for J and I both above zero, g_J for J above zero, g_I for I above zero. An absent B is taken as zero
    and `cautions` says so; an absent C is zero by the trade's convention.
    """
    needs = (
        ("A", level.A, level.twice_J > 0 and level.twice_I > 0),
        ("g_J", level.g_J, level.twice_J > 0),
        ("g_I", level.g_I, level.twice_I > 0),
    )
    for name, constant, needed in needs:
        if needed and constant is None:
            hint = "a lab overlay can supply it"
            raise NotPublished(name, f"{level.atom} {level.name}", hint)
    A, B, C, g_J, g_I = (0.0 if q is None else q.value for q in (level.A, level.B, level.C, level.g_J, level.g_I))
    square = second_order(level.twice_J, level.term, level.neighbours)
    return Constants(level.twice_J, level.twice_I, A, B, C, g_J, g_I, square)


def cautions(level: Level) -> tuple[str, ...]:
    """Say what the constants of a level leave out of its sublevels."""
    if level.B is None and level.twice_J >= 2 and level.twice_I >= 2:
        return (f"B of {level.atom} {level.name} is not in the catalogue and taken as zero",)
    return ()


def as_fields(field_gauss: ArrayLike) -> Array:
    """Check a field or an array of fields and return it as shape (n,)."""
    if isinstance(field_gauss, float) and abs(field_gauss) <= LARGEST_FIELD_GAUSS:
        return np.array([field_gauss])
    fields = np.atleast_1d(np.asarray(field_gauss, dtype=np.float64))
    if not np.all(np.abs(fields) <= LARGEST_FIELD_GAUSS):
        worst = float(fields[np.argmax(~(np.abs(fields) <= LARGEST_FIELD_GAUSS))])
        raise OutsideValidity("field", worst, f"from -{LARGEST_FIELD_GAUSS:g} to {LARGEST_FIELD_GAUSS:g} G")
    return fields


@lru_cache(maxsize=4096)
def ranked_F(constants: Constants, twice_m: int) -> tuple[int, ...]:
    """Order the F of one m-block by their zero-field energies: the label of each rank, at any field."""
    labels = block(constants.twice_J, constants.twice_I, twice_m).twice_F
    if len(labels) == 1:
        return labels
    energies = {F: zero_field_mhz(constants, F) for F in labels}
    ranked = sorted(labels, key=energies.__getitem__)
    gaps = np.diff([energies[F] for F in ranked])
    if not np.min(gaps) > 0:
        raise OutsideValidity("A", constants.A_mhz, "hyperfine levels coincide at zero field, so F labels nothing")
    return tuple(ranked)


def zero_field_mhz(constants: Constants, twice_F: int) -> float:
    """Compute the zero-field energy of one F from the level's centroid, in MHz."""
    return hyperfine_shift(
        constants.twice_J, constants.twice_I, twice_F, constants.A_mhz, constants.B_mhz, constants.C_mhz
    )


def _closed_form_of_two(diagonal: Array, coupling: float) -> tuple[Array, Array]:
    """Solve [[a, c], [c, b]] at n fields: energies (n, 2) rising, states as columns (n, 2, 2)."""
    mean, half = (diagonal[:, 0] + diagonal[:, 1]) / 2, (diagonal[:, 0] - diagonal[:, 1]) / 2
    radius = np.hypot(half, coupling)
    angle = np.arctan2(coupling, half) / 2
    cos, sin = np.cos(angle), np.sin(angle)
    energy, states = np.empty((mean.size, 2)), np.empty((mean.size, 2, 2))
    energy[:, 0], energy[:, 1] = mean - radius, mean + radius
    states[:, 0, 0], states[:, 0, 1], states[:, 1, 0], states[:, 1, 1] = -sin, cos, cos, sin
    return energy, states


@dataclass(frozen=True, slots=True, eq=False)
class Prepared:
    """What one block of given constants needs at every field, made once: all arrays read-only.

    `still` is H at zero field (d, d), `zeeman` the diagonal of dH/dB there (d,), `square` that of half of d2H/dB2 and
    `mixes` whether it is not zero; `steady` holds dH/dA, dH/dB_hfs, dH/dC (3, d, d), `linear` the diagonals of
    d2H/dBdg_J and d2H/dBdg_I (2, d); `rest_mhz` is the zero-field energy of each rank.
    """

    block: Block
    twice_F: tuple[int, ...]
    still: Array
    zeeman: Array
    square: Array
    steady: Array
    linear: Array
    mixes: bool
    rest_mhz: tuple[float, ...]


@lru_cache(maxsize=4096)
def prepared(constants: Constants, twice_m: int) -> Prepared:
    """Make the field-independent parts of one m-block."""
    part = block(constants.twice_J, constants.twice_I, twice_m)
    steady = np.stack([part.dipole, part.quadrupole, part.octupole])
    linear = MU_B_MHZ_PER_GAUSS * np.stack([part.J_z, part.I_z])
    still = np.tensordot((constants.A_mhz, constants.B_mhz, constants.C_mhz), steady, 1)
    zeeman = constants.g_J * linear[0] + constants.g_I * linear[1]
    per_mJ = dict(
        zip(range(-constants.twice_J, constants.twice_J + 1, 2), constants.square_mhz_per_gauss2, strict=False)
    )
    square = np.array([per_mJ.get(mJ, 0.0) for mJ in part.twice_mJ])
    for array in (steady, linear, still, zeeman, square):
        array.setflags(write=False)
    ranked = ranked_F(constants, twice_m)
    rest = tuple(zero_field_mhz(constants, F) for F in ranked)
    return Prepared(part, ranked, still, zeeman, square, steady, linear, bool(square.any()), rest)


def solve_block(constants: Constants, twice_m: int, fields: Array) -> Eigen:
    """Diagonalise one m-block at n fields."""
    given = prepared(constants, twice_m)
    size, column = given.zeeman.size, fields[:, None]
    half_moved = column * given.square
    moving = given.zeeman + 2 * half_moved
    diagonal = given.still.diagonal() + column * (given.zeeman + half_moved)
    if size == 1:
        return Eigen(given, moving, diagonal, np.ones((fields.size, 1, 1)))
    if size == 2:
        return Eigen(given, moving, *_closed_form_of_two(diagonal, float(given.still[0, 1])))
    matrix = np.empty((fields.size, size, size))
    matrix[:] = given.still
    matrix.reshape(fields.size, -1)[:, :: size + 1] = diagonal
    return Eigen(given, moving, *np.linalg.eigh(matrix))


def high_field_labels(constants: Constants, twice_m: int) -> tuple[tuple[int, int], ...]:
    """Return (2 m_J, 2 m_I) of each rank of an m-block in a strong positive field.

    There E/B -> (g_J - g_I) m_J + g_I m, so rank follows m_J, rising for g_J > g_I.
    """
    part = block(constants.twice_J, constants.twice_I, twice_m)
    pairs = list(zip(part.twice_mJ, part.twice_mI, strict=True))
    return tuple(pairs if constants.g_J >= constants.g_I else reversed(pairs))


def find_sublevel(constants: Constants, twice_F: int, twice_m: int) -> int:
    """Return the rank of (F, m) inside its block, or raise UnknownName with the labels that exist."""
    allowed = range(abs(constants.twice_J - constants.twice_I), constants.twice_J + constants.twice_I + 1, 2)
    given = format_sublevel(twice_F, twice_m)
    if twice_F not in allowed:
        raise UnknownName("sublevel", given, hint=f"F is one of {', '.join(map(format_half, allowed))}")
    if abs(twice_m) > twice_F or (twice_F - twice_m) % 2:
        hint = (
            f"m of F = {format_half(twice_F)} runs from {format_half(-twice_F)} to {format_half(twice_F)} in steps of 1"
        )
        raise UnknownName("sublevel", given, hint=hint)
    return ranked_F(constants, twice_m).index(twice_F)


def labels_of(constants: Constants) -> list[tuple[int, int]]:
    """List (2F, 2m) of every sublevel by F and then m: the order of every table."""
    lowest, highest = abs(constants.twice_J - constants.twice_I), constants.twice_J + constants.twice_I
    return [(F, m) for F in range(lowest, highest + 1, 2) for m in range(-F, F + 1, 2)]


def _tolerance(constants: Constants, fields: Array, columns: int, quadratic: bool) -> Array:
    """Return the rounding error that energies, slopes and quadratic coefficients of a long grid may carry."""
    J, I = constants.twice_J / 2, constants.twice_I / 2
    zeeman = MU_B_MHZ_PER_GAUSS * (abs(constants.g_J) * J + abs(constants.g_I) * I)
    energy = abs(constants.A_mhz) * I * J + abs(constants.B_mhz) + abs(constants.C_mhz)
    energy += zeeman * float(np.abs(fields).max())
    sizes = (energy, zeeman, zeeman**2 / max(energy, 1e-9) * HZ_PER_MHZ)
    share = (1e-13, 1e-12, 1e-9)
    kept = 3 if quadratic else 2
    return np.repeat([size * part for size, part in zip(sizes[:kept], share[:kept], strict=True)], columns)


def sublevels(level: Level, field_gauss: ArrayLike, *, quadratic: bool = True) -> Sublevels:
    """Solve every sublevel of a level at one or many fields.

    `field_gauss` is a number or an array of n fields; long grids are evaluated through `fieldgrid`, to rounding error.
    Without `quadratic` the quadratic coefficients are left out (shape (n, 0)), which saves time on a long grid. High-
    field labels are those of a positive field unless every field is negative. The mixing with the level's fine-
    structure neighbours is kept to second order (`multiplet`). Neglected: mixing by the hyperfine interaction beyond
    what the published constants absorb, and the diamagnetic shift.
    """
    constants, fields = constants_of(level), as_fields(field_gauss)
    labels = labels_of(constants)
    order = {label: k for k, label in enumerate(labels)}
    marks = np.empty((4, len(labels)), dtype=np.int64)
    places = {}
    for twice_m in block_ms(constants.twice_J, constants.twice_I):
        ranked = ranked_F(constants, twice_m)
        places[twice_m] = at = [order[F, twice_m] for F in ranked]
        strong = high_field_labels(constants, twice_m)
        if np.all(fields < 0):
            strong = strong[::-1]
        marks[:, at] = [ranked, [twice_m] * len(at), [p[0] for p in strong], [p[1] for p in strong]]

    def columns(some: Array) -> Array:
        numbers = np.empty((some.size, 3 if quadratic else 2, len(labels)))
        for twice_m, at in places.items():
            eigen = solve_block(constants, twice_m, some)
            numbers[:, 0, at] = eigen.energy_mhz
            numbers[:, 1, at] = eigen.slope_mhz_per_gauss()
            if quadratic:
                numbers[:, 2, at] = eigen.quadratic_mhz_per_gauss2() * HZ_PER_MHZ
        return numbers.reshape(some.size, -1)

    flat = on_grid(columns, fields, _tolerance(constants, fields, len(labels), quadratic))
    numbers = flat.reshape(fields.size, -1, len(labels))
    still = np.array([zero_field_mhz(constants, int(F)) for F in marks[0]])
    second = numbers[:, 2] if quadratic else np.empty((fields.size, 0))
    F, m, mJ, mI = marks
    energy, slope = numbers[:, 0], numbers[:, 1]
    return Sublevels(level, fields, F, m, mJ, mI, still, energy, slope, second)
