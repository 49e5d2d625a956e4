"""A plain second construction of the Hamiltonian: spin matrices and Kronecker products in the full dimension.

It shares no formula with `levels.blocks`: the quadrupole and octupole are contracted from spherical tensors that are
lowered from j_+^k and scaled to the stretched state. Sizes are kept apart in m by adding a multiple of F_z, which
commutes with everything, so that the order of a plain `eigh` is by m and then by energy.
"""

from dataclasses import dataclass
from functools import lru_cache
from typing import Any

import mpmath
import numpy as np
from numpy.typing import NDArray

from levels.constants import G_S, MU_B_MHZ_PER_GAUSS
from levels.records import Level

Array = NDArray[np.float64]


def wig3jj(j1: int, j2: int, j3: int, m1: int, m2: int, m3: int) -> float:
    """The 3j symbol of doubled arguments, from the Clebsch-Gordan coefficients of an independent library."""
    couples = (j1 + j2 + j3) % 2 == 0 and abs(j1 - j2) <= j3 <= j1 + j2
    if not couples or m1 + m2 + m3 or any(abs(m) > j for j, m in ((j1, m1), (j2, m2), (j3, m3))):
        return 0.0
    coefficient = _clebsch(j1 / 2, j2 / 2, j3 / 2, m1 / 2, m2 / 2, -m3 / 2)
    return float((-1) ** ((j1 - j2 - m3) // 2) / np.sqrt(j3 + 1) * coefficient)


@lru_cache(maxsize=65536)
def _clebsch(*places: float) -> float:
    from tests.levels.quantum_library import qutip

    return float(qutip.clebsch(*places))


@lru_cache(maxsize=4096)
def _signed_3j(j1: int, j2: int, j3: int, turned: tuple[int, int, int]) -> Array:
    """(j1 j2 j3; s1 m1, s2 m2, s3 m3) for every m1, m2, m3 from the lowest, with the signs s."""
    ms = [range(-j, j + 1, 2) for j in (j1, j2, j3)]
    table = np.zeros([j + 1 for j in (j1, j2, j3)])
    for a, m1 in enumerate(ms[0]):
        for b, m2 in enumerate(ms[1]):
            m3 = -(turned[0] * m1 + turned[1] * m2) * turned[2]
            if abs(m3) <= j3 and (j3 - m3) % 2 == 0:
                table[a, b, (j3 + m3) // 2] = wig3jj(j1, j2, j3, turned[0] * m1, turned[1] * m2, turned[2] * m3)
    return table


def wig6jj(a: int, b: int, c: int, d: int, e: int, f: int) -> float:
    """The 6j symbol of doubled arguments as its defining sum over four 3j symbols. Edmonds (6.2.3)."""
    triads = ((a, b, c), (a, e, f), (d, b, f), (d, e, c))
    if any(sum(t) % 2 or not abs(t[0] - t[1]) <= t[2] <= t[0] + t[1] for t in triads):
        return 0.0
    phases = [(-1.0) ** np.arange(j, -1, -1) for j in (a, b, c, d, e, f)]  # (-1)^(j - m), m from the lowest
    four = [_signed_3j(*t, s) for t, s in zip(triads, ((-1, -1, -1), (1, -1, 1), (1, 1, -1), (-1, 1, 1)), strict=True)]
    return float(np.einsum("abc,aef,dbf,dec,a,b,c,d,e,f->", *four, *phases, optimize=True))


@lru_cache(maxsize=256)
def spin(twice_j: int) -> tuple[Array, Array, Array]:
    """j_z, j_+ and j_- with the highest m first."""
    m = np.arange(twice_j, -twice_j - 1, -2) / 2
    j = twice_j / 2
    raising = np.diag(np.sqrt(j * (j + 1) - m[1:] * (m[1:] + 1)), 1)
    return np.diag(m), raising, raising.T.copy()


def tensors(twice_j: int, rank: int) -> dict[int, Array]:
    """The components q = k..-k of the irreducible tensor of one spin that starts from j_+^k."""
    _, raising, lowering = spin(twice_j)
    current = np.linalg.matrix_power(raising, rank)
    components = {rank: current, -rank: (-1) ** rank * current.T}
    for q in range(rank, 0, -1):
        current = (lowering @ current - current @ lowering) / np.sqrt(rank * (rank + 1) - q * (q - 1))
        components[q - 1] = current
        components[1 - q] = (-1) ** (q - 1) * current.T
    return components


@lru_cache(maxsize=256)
def interaction(twice_J: int, twice_I: int, rank: int, stretched: float) -> Array:
    """The scalar product of the rank-k tensors of J and I, scaled to `stretched` in the stretched state."""
    size = (twice_J + 1) * (twice_I + 1)
    if twice_J < rank or twice_I < rank:
        return np.zeros((size, size))
    electronic, nuclear = tensors(twice_J, rank), tensors(twice_I, rank)
    product = sum((-1) ** q * np.kron(electronic[q], nuclear[-q]) for q in range(-rank, rank + 1))
    result: Array = product * (stretched / product[0, 0])
    return result


@dataclass(frozen=True)
class Operators:
    """The full-dimension operators of a level, product states with the highest m_J and then m_I first."""

    dipole: Array
    quadrupole: Array
    octupole: Array
    J_z: Array
    I_z: Array


@lru_cache(maxsize=256)
def operators(twice_J: int, twice_I: int) -> Operators:
    J, I = twice_J / 2, twice_I / 2
    return Operators(
        interaction(twice_J, twice_I, 1, I * J),
        interaction(twice_J, twice_I, 2, 0.25),
        interaction(twice_J, twice_I, 3, 1.0),
        np.kron(spin(twice_J)[0], np.eye(twice_I + 1)),
        np.kron(np.eye(twice_J + 1), spin(twice_I)[0]),
    )


def number(level: Level, name: str) -> float:
    constant = getattr(level, name)
    return 0.0 if constant is None else float(constant.value)


def still(level: Level) -> Array:
    """The Hamiltonian at zero field in MHz."""
    ops = operators(level.twice_J, level.twice_I)
    parts = zip("ABC", (ops.dipole, ops.quadrupole, ops.octupole), strict=True)
    return sum((number(level, name) * part for name, part in parts), np.zeros_like(ops.dipole))


def zeeman(level: Level) -> Array:
    """dH/dB in MHz/G."""
    ops = operators(level.twice_J, level.twice_I)
    return MU_B_MHZ_PER_GAUSS * (number(level, "g_J") * ops.J_z + number(level, "g_I") * ops.I_z)


@lru_cache(maxsize=256)
def term_states(twice_L: int, twice_S: int) -> tuple[Array, dict[tuple[int, int], Array]]:
    """S_z in the product space of L and S, and the coupled states |J M> there by (2J, 2M), by diagonalisation."""
    ones = np.eye(twice_L + 1), np.eye(twice_S + 1)
    orbital = [np.kron(part, ones[1]) for part in spin(twice_L)]
    spins = [np.kron(ones[0], part) for part in spin(twice_S)]
    scalar = orbital[0] @ spins[0] + (orbital[1] @ spins[2] + orbital[2] @ spins[1]) / 2
    L, S = twice_L / 2, twice_S / 2
    values, vectors = np.linalg.eigh(2 * scalar + 1e-3 * (orbital[0] + spins[0]))
    states = {}
    for twice_J in range(abs(twice_L - twice_S), twice_L + twice_S + 1, 2):
        for twice_M in range(-twice_J, twice_J + 1, 2):
            J = twice_J / 2
            expected = J * (J + 1) - L * (L + 1) - S * (S + 1) + 1e-3 * twice_M / 2
            states[twice_J, twice_M] = vectors[:, int(np.argmin(np.abs(values - expected)))]
    return spins[0], states


def square(level: Level) -> Array:
    """The diagonal of half of d2H/dB2 in MHz/G2: second-order Zeeman mixing with the neighbours of an LS term."""
    per_mJ = dict.fromkeys(range(-level.twice_J, level.twice_J + 1, 2), 0.0)
    if level.neighbours:
        letter = "SPDFGHIKLMNOQ".index(level.term.lstrip("0123456789")[0])
        S_z, states = term_states(2 * letter, int(level.term.rstrip("SPDFGHIKLMNOQ")) - 1)
        for twice_other, gap_mhz in level.neighbours:
            for M in per_mJ:
                if abs(M) <= twice_other:
                    element = states[twice_other, M] @ S_z @ states[level.twice_J, M]
                    per_mJ[M] -= ((G_S - 1) * MU_B_MHZ_PER_GAUSS * element) ** 2 / gap_mhz
    ops = operators(level.twice_J, level.twice_I)
    return np.array([per_mJ[int(mJ)] for mJ in np.rint(2 * np.diag(ops.J_z))])


def moving(level: Level, field_gauss: float) -> Array:
    """dH/dB in MHz/G at a field."""
    return zeeman(level) + 2 * field_gauss * np.diag(square(level))


def largest_term(level: Level, field_gauss: float) -> float:
    """The size in MHz of the largest term of the Hamiltonian, which rounding errors scale with."""
    ops = operators(level.twice_J, level.twice_I)
    parts = zip("ABC", (ops.dipole, ops.quadrupole, ops.octupole), strict=True)
    terms = [abs(number(level, name)) * np.abs(part).max() for name, part in parts]
    terms += [abs(field_gauss) * np.abs(zeeman(level)).max(), field_gauss**2 * np.abs(square(level)).max(), 1e-9]
    return float(max(terms))


@dataclass(frozen=True)
class Solved:
    """Every sublevel at one field, by m and then by energy; `gap_mhz` is the smallest one inside an m."""

    twice_m: NDArray[np.int64]
    energy_mhz: Array
    slope_mhz_per_gauss: Array
    states: Array
    gap_mhz: float


def solve(level: Level, field_gauss: float) -> Solved:
    """Diagonalise a level at one field in one piece."""
    ops = operators(level.twice_J, level.twice_I)
    hamiltonian = still(level) + field_gauss * zeeman(level) + field_gauss**2 * np.diag(square(level))
    total = np.diag(ops.J_z + ops.I_z)
    apart = 4 * max(float(np.abs(np.linalg.eigvalsh(hamiltonian)).max()), 1e-9)
    energy, states = np.linalg.eigh(hamiltonian + apart * np.diag(total))
    m = np.einsum("ik,i,ik->k", states, total, states)
    slope = np.einsum("ik,ij,jk->k", states, moving(level, field_gauss), states)
    twice_m = np.rint(2 * m).astype(np.int64)
    energy = energy - apart * twice_m / 2
    steps = np.diff(energy)[np.diff(twice_m) == 0]
    return Solved(twice_m, energy, slope, states, float(steps.min()) if steps.size else np.inf)


def zero_field_labels(level: Level) -> NDArray[np.int64]:
    """2F of every sublevel in the order of `solve`, from the expectation of F^2 at zero field."""
    ops = operators(level.twice_J, level.twice_I)
    J, I = level.twice_J / 2, level.twice_I / 2
    states = solve(level, 0.0).states
    square = J * (J + 1) + I * (I + 1) + 2 * np.einsum("ik,ij,jk->k", states, ops.dipole, states)
    return np.rint(np.sqrt(4 * square + 1) - 1).astype(np.int64)


def multipole(twice_J: int, twice_J_up: int, twice_I: int, rank: int, q: int) -> Array:
    """The q component of the multipole operator from lower to upper level, (upper, lower), each upper's decays 1."""
    electronic = np.zeros((twice_J_up + 1, twice_J + 1))
    for row, m_up in enumerate(range(twice_J_up, -twice_J_up - 1, -2)):
        for column, m in enumerate(range(twice_J, -twice_J - 1, -2)):
            if m_up - m == 2 * q:
                symbol = wig3jj(twice_J_up, 2 * rank, twice_J, -m_up, 2 * q, m)
                electronic[row, column] = (-1) ** ((twice_J_up - m_up) // 2) * np.sqrt(twice_J_up + 1) * symbol
    return np.kron(electronic, np.eye(twice_I + 1))


class Precise:
    """One m of a level cut out of the full matrices, in mpmath; `moved` adds to constants by name.

    The numbers in the full matrices are exact to double rounding, which moves every answer by some 1e-16.
    """

    def __init__(self, level: Level, twice_m: int, moved: dict[str, Any] | None = None) -> None:
        ops = operators(level.twice_J, level.twice_I)
        rows = np.nonzero(np.rint(2 * np.diag(ops.J_z + ops.I_z)) == twice_m)[0]
        moved = moved or {}
        constants = [mpmath.mpf(number(level, key)) + moved.get(key, 0) for key in ("A", "B", "C", "g_J", "g_I")]
        parts = [mpmath.matrix(part[np.ix_(rows, rows)].tolist()) for part in vars(ops).values()]
        parts = [(part + part.T) / 2 for part in parts]
        self.still = constants[0] * parts[0] + constants[1] * parts[1] + constants[2] * parts[2]
        self.tilt = mpmath.mpf(MU_B_MHZ_PER_GAUSS) * (constants[3] * parts[3] + constants[4] * parts[4])
        self.square = mpmath.diag(square(level)[rows].tolist())

    def hamiltonian(self, field: Any) -> Any:
        return self.still + field * self.tilt + field**2 * self.square


def differences(level: Level, twice_m: int, field_gauss: float, step_gauss: float) -> tuple[list[float], list[float]]:
    """First and half the second derivative of the energies of one m by rank, by central differences at 40 digits."""
    with mpmath.workdps(40):
        cut, field, step = Precise(level, twice_m), mpmath.mpf(field_gauss), mpmath.mpf(step_gauss)
        low, at, high = (
            sorted(mpmath.eigsy(cut.hamiltonian(field + k * step), eigvals_only=True)) for k in (-1, 0, 1)
        )
        slope = [float((c - a) / (2 * step)) for a, c in zip(low, high, strict=True)]
        half = [float((a - 2 * b + c) / (2 * step**2)) for a, b, c in zip(low, at, high, strict=True)]
        return slope, half


def precise(
    level: Level, twice_m: int, field_gauss: float, moved: dict[str, Any] | None = None
) -> list[tuple[Any, Any, Any]]:
    """Energy, slope and quadratic coefficient (MHz, MHz/G, MHz/G2) of one m by rank, to 40 digits."""
    with mpmath.workdps(40):
        cut, field = Precise(level, twice_m, moved), mpmath.mpf(field_gauss)
        energy, states = mpmath.eigsy(cut.hamiltonian(field))
        Z = states.T * (cut.tilt + 2 * field * cut.square) * states
        D = states.T * cut.square * states
        order = sorted(range(len(energy)), key=lambda k: energy[k])
        return [
            (
                energy[k],
                Z[k, k],
                D[k, k] + mpmath.fsum(Z[k, j] ** 2 / (energy[k] - energy[j]) for j in order if j != k),
            )
            for k in order
        ]
