"""One component of a line, asked for at one field after the other.

Everything that a component is made of is analytic in the field (see `fieldgrid`). Whoever asks for the same component
again and again is therefore answered from Chebyshev pieces: exact values at the nodes of an interval around the field,
read off the interpolating polynomials in between. A piece is good only when its last coefficients have sunk to rounding
error in every column; where no interval is, each field is solved directly.
"""

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from levels.components import Component, Label, amplitudes, both_constants, component
from levels.fieldgrid import POINTS, TAIL, chebyshev
from levels.records import Line
from levels.sensitivity import Terms, Weights, add_terms, movement, spread, terms_of, weights_of
from levels.sublevels import HZ_PER_MHZ, LARGEST_FIELD_GAUSS, as_fields, find_sublevel, solve_block

Array = NDArray[np.float64]
OWN = 4  # columns of the component itself: offset, slope, quadratic coefficient, strength
ROUNDING = np.array([1e-14, 1e-13, 1e-10, 1e-12])  # of a column's largest value: what solving directly leaves open
FLOORS = np.array([1e-11, 1e-13, 1e-8, 1e-14])  # the same where a column is nothing but rounding error
OF_TERMS = 1e-10  # of what the contributions of all constants make together
MOST_PIECES = 24
NARROWEST_GAUSS = 2.0**-6
DEGREES = np.arange(POINTS, dtype=np.float64)


@dataclass(frozen=True, slots=True, eq=False)
class Piece:
    """The columns of a component between two fields, as Chebyshev coefficients of shape (POINTS, c)."""

    low: float
    high: float
    coefficients: Array

    def at(self, field_gauss: float) -> Array:
        """Read the columns at one field, shape (c,)."""
        position = (2 * field_gauss - self.low - self.high) / (self.high - self.low)
        values: Array = np.cos(DEGREES * math.acos(min(max(position, -1.0), 1.0))) @ self.coefficients
        return values


UNTRIED = Piece(0.0, 0.0, np.zeros((0, 0)))


class ComponentLookup:
    """A component of a line with the pieces of field where it has been asked for; not for several threads at once."""

    def __init__(self, line: Line, lower: Label, upper: Label) -> None:
        """Labels are (2F, 2m). Raises what `component` raises."""
        self._zero = component(line, lower, upper, 0.0)
        self._constants = both_constants(line)
        self._ranks = tuple(find_sublevel(c, *label) for c, label in zip(self._constants, (lower, upper), strict=True))
        self._terms = self._solved(np.zeros(1))[1]
        self._weights: Weights = weights_of(self._terms)
        self._pieces: dict[tuple[float, float], Piece | None] = {}

    def at(self, field_gauss: float) -> Component:
        """Answer with the component at one field: what `component` gives, to rounding error.

        The same field always gives the same bits, whatever was asked before.
        """
        if not abs(field_gauss) <= LARGEST_FIELD_GAUSS:
            as_fields(field_gauss)  # says what is wrong with it
        if field_gauss == 0:
            return self._zero  # where contributions vanish exactly, which no polynomial says
        piece = self._piece_at(field_gauss)
        if piece is None:
            zero = self._zero
            return component(zero.line, zero.lower, zero.upper, field_gauss)
        return self._component(field_gauss, piece.at(field_gauss))

    def _component(self, field_gauss: float, numbers: Array) -> Component:
        zero, terms = self._zero, self._terms
        offset, slope, quadratic, strength = numbers[:OWN].tolist()
        contributions = Terms(terms.keys, terms.constants, terms.names, numbers[OWN:].reshape(-1, 4, 1, 1))
        return Component(
            line=zero.line,
            lower=zero.lower,
            upper=zero.upper,
            q=zero.q,
            field_gauss=field_gauss,
            offset_mhz=offset,
            zero_field_offset_mhz=zero.zero_field_offset_mhz,
            slope_mhz_per_gauss=slope,
            quadratic_hz_per_gauss2=quadratic,
            strength=strength,
            zero_field_strength=zero.zero_field_strength,
            strength_known=zero.strength_known,
            spread=spread(contributions, self._weights),
        )

    def _piece_at(self, field: float) -> Piece | None:
        """Find the piece of a field: the widest that a polynomial carries, of those that halving from |field| gives."""
        width = 2.0 ** math.ceil(math.log2(max(abs(field), 1.0)))
        while width >= NARROWEST_GAUSS:
            low = math.floor(field / width) * width
            piece = self._pieces.get((low, width), UNTRIED)
            if piece is UNTRIED:
                piece = self._keep(low, width)
            if piece is not None:
                return piece
            width /= 2
        return None

    def _keep(self, low: float, width: float) -> Piece | None:
        if len(self._pieces) >= MOST_PIECES:
            self._pieces.clear()
        piece = self._pieces[low, width] = self._fitted(low, low + width)
        return piece

    def _fitted(self, low: float, high: float) -> Piece | None:
        points, to_coefficients = chebyshev()
        columns, _ = self._solved((low + high) / 2 + (high - low) / 2 * points)
        coefficients = to_coefficients @ columns
        smooth = np.all(np.abs(coefficients[-TAIL:]) <= self._tolerance(np.abs(columns).max(axis=0)))
        return Piece(low, high, coefficients) if smooth else None

    def _tolerance(self, sizes: Array) -> Array:
        """How far each column may be off: by rounding error, in contributions of what they make together."""
        own = np.maximum(ROUNDING * sizes[:OWN], FLOORS)
        weights = np.sqrt(self._weights.variances)[:, None]
        weights[self._weights.unstated] += self._weights.shares
        together = (sizes[OWN:].reshape(-1, 4) * weights).max(axis=0)
        open_to_all = np.full((weights.size, 4), np.inf)
        of_terms = np.divide(OF_TERMS * together, weights, out=open_to_all, where=weights > 0)
        return np.concatenate([own, of_terms.ravel()])

    def _solved(self, fields: Array) -> tuple[Array, Terms]:
        """Solve the component and the contributions of its constants at n fields, columns of shape (n, 4 + 4t)."""
        (below, above), (rank_low, rank_up), line = self._constants, self._ranks, self._zero.line
        low = solve_block(below, self._zero.lower[1], fields)
        up = solve_block(above, self._zero.upper[1], fields)
        terms = add_terms(
            terms_of(line.upper, movement(up, fields, [rank_up])),
            terms_of(line.lower, movement(low, fields, [rank_low]), sign=-1.0),
        )
        own = (
            up.energy_mhz[:, rank_up] - low.energy_mhz[:, rank_low],
            up.slope_mhz_per_gauss()[:, rank_up] - low.slope_mhz_per_gauss()[:, rank_low],
            (up.quadratic_mhz_per_gauss2([rank_up]) - low.quadratic_mhz_per_gauss2([rank_low]))[:, 0] * HZ_PER_MHZ,
            amplitudes(line, low, up)[:, rank_up, rank_low] ** 2,
        )
        return np.column_stack([*own, terms.numbers[..., 0].transpose(2, 0, 1).reshape(fields.size, -1)]), terms
