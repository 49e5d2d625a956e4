"""A sublevel's energy, or a component's offset, as a formula of the field: closed forms where they exist, else fits.

Inside one m a single state is a polynomial of second degree and two states are the roots of a quadratic equation
(J = 1/2 with any I, I = 1/2 with any J, the outermost m of every level; Breit and Rabi, Phys. Rev. 38, 2082 (1931)).
For larger blocks the energy over the asked range is fitted: by a polynomial, or by a rational function where that needs
fewer coefficients. Every formula is compared with the diagonalisation on a dense grid; the largest difference found is
its stated error.

A formula is a sum of parts, each with a sign. Fits use x = (2B - low - high)/(high - low).
"""

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from levels.errors import OutsideValidity
from levels.strongfield import TermConstants, solve_term_block, term_block
from levels.sublevels import LARGEST_FIELD_GAUSS, Constants, prepared, solve_block

Array = NDArray[np.float64]
Label = tuple[int, int]
MOST_COEFFICIENTS = 16
CHECKED_POINTS = 4001


@dataclass(frozen=True, slots=True)
class Closed:
    """offset + a1 B + a2 B^2 + sign sqrt((p0 + p1 B + p2 B^2)^2 + (c0 + c1 B)^2), in MHz; sign is 0 for one state."""

    mean: tuple[float, float, float]
    half: tuple[float, float, float]
    coupling: tuple[float, float]
    sign: int

    def at(self, field: Array) -> Array:
        """Evaluate at n fields."""
        mean, half = np.polyval(self.mean[::-1], field), np.polyval(self.half[::-1], field)
        return np.asarray(mean + self.sign * np.hypot(half, np.polyval(self.coupling[::-1], field)))


@dataclass(frozen=True, slots=True)
class Fit:
    """A ratio of two polynomials of x over a field range; `bottom` is (1,) for a polynomial. Rising powers of x."""

    top: tuple[float, ...]
    bottom: tuple[float, ...]
    low_gauss: float
    high_gauss: float

    def at(self, field: Array) -> Array:
        """Evaluate at n fields."""
        x = (2 * field - self.low_gauss - self.high_gauss) / (self.high_gauss - self.low_gauss)
        return np.asarray(np.polyval(self.top[::-1], x) / np.polyval(self.bottom[::-1], x))


@dataclass(frozen=True, slots=True)
class Part:
    """One level's contribution to a formula, added with its sign."""

    sign: int
    form: Closed | Fit


@dataclass(frozen=True, slots=True, eq=False)
class Formula:
    """Parts that add up to the energy of a sublevel or the offset of a component, with the largest error found."""

    parts: tuple[Part, ...]
    low_gauss: float
    high_gauss: float
    largest_error_mhz: float
    checked_points: int

    @property
    def kind(self) -> str:
        """Whether it is a closed form, a polynomial, a rational function or a mixture."""
        kinds = sorted({_kind(part.form) for part in self.parts})
        return " and ".join(kinds)

    def at(self, field: Array) -> Array:
        """Evaluate at n fields."""
        return sum((part.sign * part.form.at(field) for part in self.parts), np.zeros_like(field))


def _kind(form: Closed | Fit) -> str:
    if isinstance(form, Closed):
        return "closed form"
    return "polynomial" if len(form.bottom) == 1 else "rational function"


@dataclass(frozen=True, slots=True)
class Source:
    """What a part is made from: the constants of a level or of a term, the sublevel and the sign it enters with."""

    sign: int
    constants: Constants | TermConstants
    label: Label

    def energies(self, field: Array) -> Array:
        """Diagonalise at n fields."""
        F, m = self.label
        if isinstance(self.constants, Constants):
            eigen = solve_block(self.constants, m, field)
            return np.asarray(eigen.energy_mhz[:, eigen.twice_F.index(F)])
        whole = solve_term_block(self.constants, m, field)
        return np.asarray(whole.energy_mhz[:, whole.block.labels.index((self.constants.own, F))])

    def pieces(self) -> tuple[Array, Array, Array, int]:
        """Return H at zero field, dH/dB there, half of d2H/dB2 (as matrices) and the rank of the sublevel."""
        F, m = self.label
        if isinstance(self.constants, Constants):
            given = prepared(self.constants, m)
            rank = given.twice_F.index(F)
            return given.still, np.diag(given.zeeman), np.diag(given.square), rank
        block = term_block(self.constants, m)
        rank = block.labels.index((self.constants.own, F))
        return block.still, block.zeeman, np.zeros_like(block.still), rank


def closed_form(source: Source) -> Closed | None:
    """Return the closed form of a sublevel whose m has one or two states, else None."""
    still, linear, square, rank = source.pieces()
    if still.shape[0] > 2:
        return None
    diagonals = [np.diag(matrix) for matrix in (still, linear, square)]
    if still.shape[0] == 1:
        a, b, c = (float(part[0]) for part in diagonals)
        return Closed((a, b, c), (0.0, 0.0, 0.0), (0.0, 0.0), 0)
    mean = tuple(float(part.sum() / 2) for part in diagonals)
    half = tuple(float((part[0] - part[1]) / 2) for part in diagonals)
    coupling = (float(still[0, 1]), float(linear[0, 1]))
    return Closed((mean[0], mean[1], mean[2]), (half[0], half[1], half[2]), coupling, 1 if rank else -1)


def formula(sources: tuple[Source, ...], low_gauss: float, high_gauss: float, tolerance_mhz: float) -> Formula:
    """Find the formula of a sum of sublevel energies over a field range, as good as `tolerance_mhz` where it can be.

    Closed forms hold at any field; fits only in the range. The error that is stated is the one that was found.
    """
    if not -LARGEST_FIELD_GAUSS <= low_gauss < high_gauss <= LARGEST_FIELD_GAUSS:
        allowed = f"min_field below max_field, within {LARGEST_FIELD_GAUSS:g} G"
        raise OutsideValidity("max_field", f"{low_gauss:g} to {high_gauss:g} G", allowed)
    if not tolerance_mhz > 0:
        raise OutsideValidity("tolerance", tolerance_mhz, "above zero")
    share = tolerance_mhz / len(sources)
    parts = tuple(
        Part(one.sign, closed_form(one) or fit(one.energies, low_gauss, high_gauss, share)) for one in sources
    )
    found = Formula(parts, low_gauss, high_gauss, 0.0, CHECKED_POINTS)
    grid = np.linspace(low_gauss, high_gauss, CHECKED_POINTS)
    exact = sum((one.sign * one.energies(grid) for one in sources), np.zeros_like(grid))
    return replace(found, largest_error_mhz=float(np.abs(found.at(grid) - exact).max()))


def fit(energies: Callable[[Array], Array], low_gauss: float, high_gauss: float, tolerance_mhz: float) -> Fit:
    """Fit one energy by the shortest polynomial or rational function that is within the tolerance, else by the best."""
    angles = np.pi * (np.arange(257) + 0.5) / 257
    x = np.cos(angles)
    values = energies((low_gauss + high_gauss) / 2 + (high_gauss - low_gauss) / 2 * x)
    best, smallest = None, np.inf
    for count in range(2, MOST_COEFFICIENTS + 1):
        for top, bottom in (_polynomial(x, values, count), _rational(x, values, count)):
            if top is None or bottom is None:
                continue
            error = float(np.abs(np.polyval(top[::-1], x) / np.polyval(bottom[::-1], x) - values).max())
            if error < smallest:
                smallest, best = error, Fit(tuple(top.tolist()), tuple(bottom.tolist()), low_gauss, high_gauss)
            if smallest <= 0.8 * tolerance_mhz and best is not None:
                return best
    assert best is not None
    return best


def _polynomial(x: Array, values: Array, count: int) -> tuple[Array, Array]:
    series = np.polynomial.chebyshev.chebfit(x, values, count - 1)
    return np.asarray(np.polynomial.chebyshev.cheb2poly(series)), np.ones(1)


def _rational(x: Array, values: Array, count: int) -> tuple[Array | None, Array | None]:
    """Fit p/q with about half of the coefficients each by iterated linear least squares; None where q nearly vanishes.

    Sanathanan and Koerner, IEEE Trans. Autom. Control 8, 56 (1963).
    """
    below = (count - 1) // 2
    above = count - 1 - below
    if below < 1:
        return None, None
    scale = float(np.abs(values).max()) or 1.0
    up = np.polynomial.chebyshev.chebvander(x, above)
    down = np.polynomial.chebyshev.chebvander(x, below)[:, 1:]
    weight = np.ones_like(x)
    for _ in range(6):
        matrix = np.hstack([up, -(values / scale)[:, None] * down]) * weight[:, None]
        found = np.linalg.lstsq(matrix, values / scale * weight, rcond=None)[0]
        bottom = 1 + down @ found[above + 1 :]
        if bottom.min() < 0.05:
            return None, None
        weight = 1 / bottom
    top = np.polynomial.chebyshev.cheb2poly(found[: above + 1] * scale)
    return top, np.polynomial.chebyshev.cheb2poly(np.concatenate([[1.0], found[above + 1 :]]))
