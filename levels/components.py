"""The Zeeman components of a line: frequency, shift, slope, quadratic coefficient, strength and polarisation.

A component joins a lower sublevel (F, m) to an upper one (F', m') with q = m' - m, |q| <= k for a line of multipole
rank k. Its strength is |sum over m_J, m_J', m_I of the states' amplitudes times the multipole element|^2, normalised so
that all decays of one upper sublevel to the lower level sum to 1; the nuclear spin looks on. Offsets count from the
line's centroid, shifts from the same component at zero field.
"""

import math
from dataclasses import dataclass
from fractions import Fraction
from functools import lru_cache

import numpy as np
from numpy.typing import ArrayLike, NDArray

from levels.angular import component_strength, multipole_elements, triangle_reason
from levels.blocks import block
from levels.errors import OutsideValidity, UnknownName
from levels.fieldgrid import on_grid
from levels.notation import format_half, format_sublevel
from levels.quantity import Quantity
from levels.records import Level, Line
from levels.sensitivity import ENERGY, SHIFT, Spread, add_terms, movement, spread, terms_of
from levels.sublevels import (
    HZ_PER_MHZ,
    Constants,
    Eigen,
    Sublevels,
    as_fields,
    constants_of,
    find_sublevel,
    labels_of,
    solve_block,
    sublevels,
)

Array = NDArray[np.float64]
Label = tuple[int, int]
Pair = tuple[Label, Label]
STRENGTH_TOLERANCE = 1e-12


@dataclass(frozen=True, slots=True, eq=False)
class Component:
    """One component at one field, with standard uncertainties; frequencies in MHz, the field in gauss.

    `frequency_mhz` is None when neither the component nor the line's centroid is published. `strength_known` is False
    for lines that only a field opens: their strength is not in this model.
    """

    line: Line
    lower: Label
    upper: Label
    q: int
    field_gauss: float
    offset_mhz: float
    zero_field_offset_mhz: float
    slope_mhz_per_gauss: float
    quadratic_hz_per_gauss2: float
    strength: float
    zero_field_strength: Fraction
    strength_known: bool
    spread: Spread

    @property
    def shift_mhz(self) -> float:
        """How far the component has moved from where it is at zero field."""
        return self.offset_mhz - self.zero_field_offset_mhz

    @property
    def measured(self) -> Quantity | None:
        """The zero-field frequency of this hyperfine component in MHz where it was measured itself."""
        return measured_component(self.line, self.lower[0], self.upper[0])

    @property
    def frequency_mhz(self) -> float | None:
        """The frequency to set a laser to: the measured component and the shift, else the centroid and the offset."""
        measured = self.measured
        if measured is not None:
            return measured.value + self.shift_mhz
        return None if self.line.centroid is None else self.line.centroid.value + self.offset_mhz

    @property
    def frequency_uncertainty_mhz(self) -> float | None:
        """Standard uncertainty of the frequency, both its parts in quadrature; None where either is unknown."""
        measured = self.measured
        start, which = (self.line.centroid, ENERGY) if measured is None else (measured, SHIFT)
        moved = self.spread.uncertainty.item(which)
        if start is None or start.uncertainty is None or math.isnan(moved):
            return None
        return math.hypot(start.uncertainty, moved)


@dataclass(frozen=True, slots=True, eq=False)
class Components:
    """Every component of a line at n fields: labels have shape (c,), numbers (n, c), ordered by F, m, F', m'."""

    line: Line
    field_gauss: Array
    lower_twice_F: NDArray[np.int64]
    lower_twice_m: NDArray[np.int64]
    upper_twice_F: NDArray[np.int64]
    upper_twice_m: NDArray[np.int64]
    q: NDArray[np.int64]
    offset_mhz: Array
    shift_mhz: Array
    slope_mhz_per_gauss: Array
    quadratic_hz_per_gauss2: Array
    strength: Array
    zero_field_strength: tuple[Fraction, ...]
    strength_known: bool

    @property
    def frequency_mhz(self) -> Array | None:
        """Absolute frequencies, shape (n, c); None without any published frequency.

        A component that was measured itself counts from that measurement, the others from the line's centroid.
        """
        if self.line.centroid is None:
            return None
        frequency: Array = self.line.centroid.value + self.offset_mhz
        for twice_F, twice_F_up, known in self.line.measured:
            at = (self.lower_twice_F == twice_F) & (self.upper_twice_F == twice_F_up)
            frequency[:, at] = known.value + self.shift_mhz[:, at]
        return frequency


def measured_component(line: Line, twice_F: int, twice_F_up: int) -> Quantity | None:
    """Return the measured zero-field frequency in MHz of one hyperfine component, or None."""
    if not line.measured:
        return None
    return next((known for low, up, known in line.measured if (low, up) == (twice_F, twice_F_up)), None)


def frequency_uncertainties_mhz(found: Components, offset: Array, shift: Array) -> Array:
    """Return the standard uncertainties of the table's frequencies, NaN where unknown."""
    line = found.line
    result: Array = np.hypot(_stated(line.centroid), offset)
    for twice_F, twice_F_up, known in line.measured:
        at = (found.lower_twice_F == twice_F) & (found.upper_twice_F == twice_F_up)
        result[..., at] = np.hypot(_stated(known), shift[..., at])
    return result


def _stated(quantity: Quantity | None) -> float:
    return np.nan if quantity is None or quantity.uncertainty is None else quantity.uncertainty


def both_constants(line: Line) -> tuple[Constants, Constants]:
    """Read the bare numbers of a line's lower and upper level."""
    return constants_of(line.lower), constants_of(line.upper)


def pairs_of(line: Line, q: int | None = None) -> list[Pair]:
    """List ((2F, 2m), (2F', 2m')) of every component, or of those with one q."""
    lower, upper = both_constants(line)
    wanted = range(-line.rank, line.rank + 1) if q is None else (q,)
    steps = {2 * step for step in wanted}
    return [(low, up) for low in labels_of(lower) for up in labels_of(upper) if up[1] - low[1] in steps]


def strength_model(line: Line) -> str:
    """Say which model gives the strengths: "J" (the usual), "F" (hyperfine-induced) or "" (not in this model)."""
    if not triangle_reason(line.lower.twice_J, 2 * line.rank, line.upper.twice_J):
        return "J"
    return "F" if line.induced == "hyperfine" else ""


def zero_field_strength(line: Line, lower: Label, upper: Label) -> Fraction:
    """Compute the exact strength of one component at zero field.

    For a hyperfine-induced line between J = 0 levels the multipole element joins F and F' as if they were J and J'.
    """
    model = strength_model(line)
    if model == "F":
        return component_strength(lower[0], upper[0], 0, lower, upper, line.rank)
    if not model:
        return Fraction(0)
    return component_strength(line.lower.twice_J, line.upper.twice_J, line.lower.twice_I, lower, upper, line.rank)


@lru_cache(maxsize=8192)
def _coupling(twice_J: int, twice_J_up: int, twice_I: int, rank: int, twice_m: int, twice_m_up: int) -> Array:
    """Build the multipole element between the product states of two blocks, shape (d_upper, d_lower)."""
    below, above = block(twice_J, twice_I, twice_m), block(twice_J_up, twice_I, twice_m_up)
    elements = multipole_elements(twice_J, twice_J_up, rank)
    matrix = np.zeros((above.size, below.size))
    for row, (mJ_up, mI_up) in enumerate(zip(above.twice_mJ, above.twice_mI, strict=True)):
        for column, (mJ, mI) in enumerate(zip(below.twice_mJ, below.twice_mI, strict=True)):
            if mI == mI_up:
                matrix[row, column] = elements.get((mJ, mJ_up), 0.0)
    matrix.setflags(write=False)
    return matrix


def amplitudes(line: Line, lower: Eigen, upper: Eigen) -> Array:
    """Compute the signed amplitude of every component between two solved blocks, shape (n, d_upper, d_lower).

    The squares are the strengths. Signs follow the states that were passed in, so that a set of amplitudes made from
    one set of states is coherent.
    """
    model = strength_model(line)
    if not model:
        return np.zeros((lower.energy_mhz.shape[0], upper.block.size, lower.block.size))
    if model == "F":
        twice_J, twice_J_up, twice_I = lower.twice_F[0], upper.twice_F[0], 0
    else:
        twice_J, twice_J_up, twice_I = line.lower.twice_J, line.upper.twice_J, line.lower.twice_I
    coupling = _coupling(twice_J, twice_J_up, twice_I, line.rank, lower.block.twice_m, upper.block.twice_m)
    result: Array = upper.states.swapaxes(-1, -2) @ (coupling @ lower.states)
    return result


def _kind(line: Line) -> str:
    return f"an {line.multipole} line" if line.photons == 1 else f"this {line.photons}-photon line"


def check_component(line: Line, lower: Label, upper: Label) -> None:
    """Refuse a component that the line's multipole does not drive, naming the rule and what would do."""
    q = (upper[1] - lower[1]) // 2
    if abs(q) > line.rank:
        allowed = " or ".join(format_half(lower[1] + 2 * step) for step in range(-line.rank, line.rank + 1))
        raise OutsideValidity(
            "upper",
            format_sublevel(*upper),
            f"{_kind(line)} changes m by at most {line.rank}: from m = {format_half(lower[1])} to {allowed}",
        )


def component(line: Line, lower: Label, upper: Label, field_gauss: float) -> Component:
    """Solve one component at one field: only the two m-blocks that hold its sublevels.

    Labels are (2F, 2m). Raises UnknownName for a sublevel that does not exist, OutsideValidity for a component that the
    multipole forbids, NotPublished for a missing constant.
    """
    below, above = both_constants(line)
    rank_low, rank_up = find_sublevel(below, *lower), find_sublevel(above, *upper)
    check_component(line, lower, upper)
    fields = as_fields(field_gauss)
    low, up = solve_block(below, lower[1], fields), solve_block(above, upper[1], fields)
    terms = add_terms(
        terms_of(line.upper, movement(up, fields, [rank_up])),
        terms_of(line.lower, movement(low, fields, [rank_low]), sign=-1.0),
    )
    slope = up.slope_mhz_per_gauss()[0, rank_up] - low.slope_mhz_per_gauss()[0, rank_low]
    quadratic = up.quadratic_mhz_per_gauss2([rank_up])[0, 0] - low.quadratic_mhz_per_gauss2([rank_low])[0, 0]
    return Component(
        line,
        lower,
        upper,
        (upper[1] - lower[1]) // 2,
        float(fields[0]),
        float(up.energy_mhz[0, rank_up] - low.energy_mhz[0, rank_low]),
        up.given.rest_mhz[rank_up] - low.given.rest_mhz[rank_low],
        float(slope),
        float(quadratic) * HZ_PER_MHZ,
        float(amplitudes(line, low, up)[0, rank_up, rank_low] ** 2),
        zero_field_strength(line, lower, upper),
        bool(strength_model(line)),
        spread(terms),
    )


def components(line: Line, field_gauss: ArrayLike, q: int | None = None) -> Components:
    """Solve every component of a line (or those of one q) at one or many fields."""
    if q is not None and abs(q) > line.rank:
        allowed = f"m' - m of {_kind(line)}, from -{line.rank} to {line.rank}"
        raise OutsideValidity("polarisation", q, allowed)
    fields, pairs = as_fields(field_gauss), pairs_of(line, q)
    if not pairs:
        raise UnknownName("component", f"q = {q}", hint=f"{line.name} has no pair of sublevels with this m' - m")
    below, above = sublevels(line.lower, fields), sublevels(line.upper, fields)
    return between(line, pairs, below, above, strengths(line, fields, pairs), bool(strength_model(line)))


def between(
    line: Line, pairs: list[Pair], below: Sublevels, above: Sublevels, strength: Array, strength_known: bool
) -> Components:
    """Join the sublevels of both ends, solved at the same fields, into the components of these pairs."""
    at_low, at_up = _positions(below.level, [low for low, _ in pairs]), _positions(above.level, [up for _, up in pairs])
    return Components(
        line,
        below.field_gauss,
        below.twice_F[at_low],
        below.twice_m[at_low],
        above.twice_F[at_up],
        above.twice_m[at_up],
        (above.twice_m[at_up] - below.twice_m[at_low]) // 2,
        above.energy_mhz[:, at_up] - below.energy_mhz[:, at_low],
        above.shift_mhz[:, at_up] - below.shift_mhz[:, at_low],
        above.slope_mhz_per_gauss[:, at_up] - below.slope_mhz_per_gauss[:, at_low],
        above.quadratic_hz_per_gauss2[:, at_up] - below.quadratic_hz_per_gauss2[:, at_low],
        strength,
        tuple(zero_field_strength(line, low, up) for low, up in pairs),
        strength_known,
    )


def _positions(level: Level, labels: list[Label]) -> NDArray[np.int64]:
    order = {label: k for k, label in enumerate(labels_of(Constants(level.twice_J, level.twice_I)))}
    return np.array([order[label] for label in labels], dtype=np.int64)


def strengths(line: Line, field_gauss: ArrayLike, pairs: list[Pair]) -> Array:
    """Compute the strength of each listed component at n fields, shape (n, c)."""
    fields = as_fields(field_gauss)
    below, above = both_constants(line)
    position = {pair: k for k, pair in enumerate(pairs)}

    def columns(some: Array) -> Array:
        lows = {m: solve_block(below, m, some) for m in sorted({low[1] for low, _ in pairs})}
        ups = {m: solve_block(above, m, some) for m in sorted({up[1] for _, up in pairs})}
        result = np.zeros((some.size, len(pairs)))
        for m, m_up in sorted({(low[1], up[1]) for low, up in pairs}):
            square = amplitudes(line, lows[m], ups[m_up]) ** 2
            for row, F_up in enumerate(ups[m_up].twice_F):
                for column, F in enumerate(lows[m].twice_F):
                    k = position.get(((F, m), (F_up, m_up)))
                    if k is not None:
                        result[:, k] = square[:, row, column]
        return result

    return on_grid(columns, fields, np.full(len(pairs), STRENGTH_TOLERANCE))
