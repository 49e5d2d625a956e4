"""Scalar, vector and tensor polarisability of a level, or of one of its hyperfine levels F, summed over its lines.

With omega the light's angular frequency and omega_k that of a line, signed (negative where the other level lies below),
the sum over lines, counter-rotating term included, is

    a_K = (-1)^(K+J+1) sqrt(2K+1) sum_k (-1)^J' {1 K 1; J J' J} |<J'||d||J>|^2 R_K
    R_K = 1/(omega_k - omega) + (-1)^K / (omega_k + omega)
    scalar = a_0 / sqrt(3(2J+1)),  vector = -sqrt(2J/((J+1)(2J+1))) a_1,
    tensor = -sqrt(2J(2J-1)/(3(J+1)(2J+1)(2J+3))) a_2

Le Kien, Schneeweiss, Rauschenbeutel, Eur. Phys. J. D 67, 92 (2013). For a hyperfine level J becomes F, the sum runs
over the F' of each line at their own frequencies, and |<F'||d||F>|^2 = (2F+1)(2F'+1) {J F I; F' J' 1}^2 |<J'||d||J>|^2.
All in atomic units (a0^3). The shift of a sublevel in light of amplitude E is then -(E^2/4)[scalar + C vector m/2F +
D tensor (3m^2 - F(F+1))/F(2F-1)] with C the degree of circularity along the field and D = (3|eps_z|^2 - 1)/2. Numbers
are NaN where the light is so close to a line that the formula stops: within its hyperfine structure (for a whole level)
or `NEAREST_WIDTHS` natural widths.
"""

from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import ArrayLike, NDArray

from levels.angular import six_j
from levels.blocks import hyperfine_shift
from levels.constants import HARTREE_MHZ, MHZ_NM
from levels.errors import NotPublished, OutsideValidity, UnknownName
from levels.notation import format_half, term_quantum_numbers
from levels.partners import (
    SCALAR,
    Doubt,
    Partners,
    Weighing,
    dipole_of,
    doubt_of,
    line_terms,
    other_end,
    remainder_terms,
    signed_frequency_mhz,
    static_scalar,
)
from levels.records import Level, Line

Array = NDArray[np.float64]
RANKS = (0, 1, 2)
NEAREST_WIDTHS = 5.0  # there the shift is wrong by (width/2 detuning)^2 = 1 %
NEAREST_MHZ = 0.001
SHORTEST_NM, LONGEST_NM = 50.0, 1e6


@dataclass(frozen=True, slots=True, eq=False)
class Polarisability:
    """Polarisability of one level (or of one F, doubled in `twice_F`) at n wavelengths: (3, n) in a0^3.

    Rows are scalar, vector, tensor. `shares` (lines, 3, n) is what each line of `partners` adds, `doubts` holds the
    uncertainties of the three rows. `close` marks wavelengths at which the formula stops (numbers NaN).
    """

    partners: Partners
    twice_F: int | None
    wavelength_nm: Array
    numbers: Array
    shares: Array
    doubts: tuple[Doubt, Doubt, Doubt]
    close: NDArray[np.bool_]


@lru_cache(maxsize=4096)
def rank_weights(twice_J: int, twice_J_other: int) -> tuple[float, float, float]:
    """Compute the factors that take |d|^2 R_K to the scalar, vector and tensor polarisability."""
    J = twice_J / 2
    ends = (
        1 / np.sqrt(3 * (2 * J + 1)),
        -np.sqrt(2 * J / ((J + 1) * (2 * J + 1))),
        -np.sqrt(max(2 * J * (2 * J - 1), 0) / (3 * (J + 1) * (2 * J + 1) * (2 * J + 3))),
    )
    weights = []
    for K, end in zip(RANKS, ends, strict=True):
        sign = (-1) ** ((2 * K + twice_J + 2 + twice_J_other) // 2)
        symbol = float(six_j(2, 2 * K, 2, twice_J, twice_J_other, twice_J))
        weights.append(float(sign * np.sqrt(2 * K + 1) * symbol * end))
    return weights[0], weights[1], weights[2]


@lru_cache(maxsize=4096)
def hyperfine_share(twice_J: int, twice_J_other: int, twice_I: int, twice_F: int, twice_F_other: int) -> float:
    """Compute |<F'||d||F>|^2 / |<J'||d||J>|^2."""
    symbol = float(six_j(twice_J, twice_F, twice_I, twice_F_other, twice_J_other, 2))
    return (twice_F + 1) * (twice_F_other + 1) * symbol**2


def as_wavelengths(wavelength_nm: ArrayLike) -> Array:
    """Check vacuum wavelengths in nm and return them as shape (n,); infinity stands for a static field."""
    wavelengths = np.atleast_1d(np.asarray(wavelength_nm, dtype=np.float64))
    fine = (wavelengths >= SHORTEST_NM) & (wavelengths <= LONGEST_NM) | np.isposinf(wavelengths)
    if not np.all(fine):
        worst = float(wavelengths[np.argmin(fine)])
        raise OutsideValidity("wavelength", worst, f"a vacuum wavelength from {SHORTEST_NM:g} to {LONGEST_NM:g} nm")
    return wavelengths


def hyperfine_levels(level: Level) -> dict[int, float]:
    """List the zero-field energy in MHz of each F (doubled) of a level; zero where A is not published."""
    A, B, C = (0.0 if part is None else part.value for part in (level.A, level.B, level.C))
    J, I = level.twice_J, level.twice_I
    return {F: hyperfine_shift(J, I, F, A, B, C) for F in range(abs(J - I), J + I + 1, 2)}


def clearance_mhz(line: Line) -> float:
    """Return how far from a component of a line light must be for the formula to hold."""
    width = line.upper.width
    return max(NEAREST_MHZ, 0.0 if width is None else NEAREST_WIDTHS * width.value)


@dataclass(frozen=True, slots=True)
class Pole:
    """One component F' of a line: signed frequency, weights by rank times |d|^2, clearance around it."""

    frequency_mhz: float
    weights: tuple[float, float, float]
    clearance_mhz: float


def poles_of(level: Level, line: Line, twice_F: int | None) -> list[Pole]:
    """List the components that a line has for a whole level (one) or for one F (up to three)."""
    other, centre, square = other_end(level, line), signed_frequency_mhz(level, line), dipole_of(line) ** 2
    if twice_F is None:
        spans = [max(shifts) - min(shifts) for end in (level, other) if (shifts := hyperfine_levels(end).values())]
        weights = [square * weight for weight in rank_weights(level.twice_J, other.twice_J)]
        return [Pole(centre, (weights[0], weights[1], weights[2]), clearance_mhz(line) + sum(spans))]
    below = hyperfine_levels(level)[twice_F]
    poles = []
    for F, above in hyperfine_levels(other).items():
        if abs(F - twice_F) <= 2 <= F + twice_F:
            share = square * hyperfine_share(level.twice_J, other.twice_J, level.twice_I, twice_F, F)
            one, two, three = (share * weight for weight in rank_weights(twice_F, F))
            poles.append(Pole(centre + above - below, (one, two, three), clearance_mhz(line)))
    return poles


def _share(poles: list[Pole], light_mhz: Array) -> tuple[Array, NDArray[np.bool_]]:
    """Add the components of one line: (2, 3, n), what they add in a0^3 and its slope per MHz of their frequency.

    The second result marks where light is too close to a component.
    """
    total, close = np.zeros((2, 3, light_mhz.size)), np.zeros(light_mhz.size, dtype=np.bool_)
    for pole in poles:
        near, far = pole.frequency_mhz - light_mhz, pole.frequency_mhz + light_mhz
        close |= np.minimum(np.abs(near), np.abs(far)) < pole.clearance_mhz
        with np.errstate(divide="ignore", invalid="ignore"):
            for K, weight in zip(RANKS, pole.weights, strict=True):
                total[0, K] += weight * HARTREE_MHZ * (1 / near + (-1) ** K / far)
                total[1, K] -= weight * HARTREE_MHZ * (1 / near**2 + (-1) ** K / far**2)
    return total, close


def polarisability(partners: Partners, wavelength_nm: ArrayLike, twice_F: int | None = None) -> Polarisability:
    """Sum the polarisability of a level, or of its hyperfine level F, at n vacuum wavelengths (nm)."""
    level = partners.level
    if twice_F is not None and twice_F not in hyperfine_levels(level):
        allowed = ", ".join(map(format_half, hyperfine_levels(level)))
        raise UnknownName("hyperfine level", f"F = {format_half(twice_F)}", hint=f"F of {level.name} is {allowed}")
    if twice_F is not None and level.A is None and level.twice_J and level.twice_I:
        raise NotPublished("A", f"{level.atom} {level.name}", "ask for the whole level instead of one F")
    wavelengths = as_wavelengths(wavelength_nm)
    light = MHZ_NM / wavelengths
    parts, close = np.zeros((len(partners.lines), 2, 3, light.size)), np.zeros(light.size, dtype=np.bool_)
    for row, line in enumerate(partners.lines):
        parts[row], near = _share(poles_of(level, line, twice_F), light)
        close |= near
    shares = parts[:, 0].copy()
    numbers = shares.sum(axis=0)
    numbers[0] += partners.remainder.value
    parts[..., close] = 0.0
    doubts = [_doubt(partners, parts[:, :, K], light, K) for K in RANKS]
    numbers[:, close], shares[:, :, close] = np.nan, np.nan
    return Polarisability(partners, twice_F, wavelengths, numbers, shares, (doubts[0], doubts[1], doubts[2]), close)


def _doubt(partners: Partners, parts: Array, light: Array, K: int) -> Doubt:
    shares, slopes = ({line.name: parts[row, kind] for row, line in enumerate(partners.lines)} for kind in (0, 1))
    turned, tilted = vector_and_tensor_bounds(partners.level.twice_J)
    caps = vector_and_tensor_caps(partners, light)
    weighing = (SCALAR, Weighing(0.0, turned=turned, caps=caps), Weighing(0.0, tilted=tilted, caps=caps))[K]
    terms = line_terms(partners, shares, slopes, anchor=1.0 if K == 0 else 0.0)
    return doubt_of(terms | remainder_terms(partners, light, weighing), light.size)


@lru_cache(maxsize=256)
def vector_and_tensor_bounds(twice_J: int) -> tuple[float, float]:
    """Compute how large the vector (times omega_k/omega) and tensor part of one line can be beside its scalar part."""
    others = [J for J in (twice_J - 2, twice_J, twice_J + 2) if J >= 0 and (J or twice_J)]
    weights = [rank_weights(twice_J, J) for J in others]
    return max(abs(w[1] / w[0]) for w in weights), max(abs(w[2] / w[0]) for w in weights)


def vector_and_tensor_caps(partners: Partners, light_mhz: Array) -> tuple[Array, Array] | None:
    """Bound the vector and tensor parts of the remainder of an S level by those of its lines, over their static scalar.

    Both come from fine structure alone there, which falls towards higher levels, as their distance grows.
    """
    level = partners.level
    if level.coupling != "LS" or not level.term or term_quantum_numbers(level.term)["L"] or not partners.lines:
        return None
    parts = sum(_share(poles_of(level, line, None), light_mhz)[0][0] for line in partners.lines)
    static = sum(abs(static_scalar(level, line)) for line in partners.lines)
    numbers = np.abs(np.asarray(parts)) / static
    return numbers[1], numbers[2]
