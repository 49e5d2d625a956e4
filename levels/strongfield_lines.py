"""The Zeeman components of a line between whole terms: what `components` answers, with both ends solved in their terms.

A state of the upper term holds several J', one of the lower several J, so that a strength is the square of a sum over
pairs of J. The reduced elements of the pairs stand to each other as LS coupling has it (Edmonds 7.1.7, coupling order
L, S); the line's own pair keeps the normalisation of `components`. For lines whose terms have one lower level (D
lines) the strengths from one upper sublevel still sum to 1; else the sum is its share of the line's own zero-field
decays. The cube of the frequency is taken as that of the line for every pair.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from levels.angular import multipole_elements, six_j, triangle_reason
from levels.components import (
    STRENGTH_TOLERANCE,
    Component,
    Components,
    between,
    check_component,
    pairs_of,
    strength_model,
    zero_field_strength,
)
from levels.errors import OutsideValidity
from levels.fieldgrid import on_grid
from levels.notation import term_quantum_numbers
from levels.records import Level, Line
from levels.sensitivity import Spread
from levels.strongfield import (
    TermBlock,
    TermConstants,
    TermEigen,
    solve_term_block,
    term_constants,
    term_sublevels,
)
from levels.strongfield_spread import contributions, joined, spread_of
from levels.sublevels import HZ_PER_MHZ, as_fields, find_sublevel, zero_field_mhz
from levels.terms import Term

Array = NDArray[np.float64]
Label = tuple[int, int]
Pair = tuple[Label, Label]


@dataclass(frozen=True, slots=True)
class Ends:
    """A line with the terms of its two levels (`terms.alone` where a level stands by itself)."""

    line: Line
    lower: Term
    upper: Term


def pair_ratios(ends: Ends) -> dict[tuple[int, int], float]:
    """Return the amplitude of each pair (2J, 2J') relative to the line's own; empty where no model has it.

    sqrt(2J+1) (-1)^(L'+S+J+k) {L' J' S; J L k}, over the same of the line's own pair. Where only the own pair obeys the
    triangle rule no coupling scheme is needed.
    """
    line, rank = ends.line, 2 * ends.line.rank
    if strength_model(line) != "J":
        return {}
    own = (line.lower.twice_J, line.upper.twice_J)
    every = [(low.twice_J, up.twice_J) for low in ends.lower.levels for up in ends.upper.levels]
    allowed = [(low, up) for low, up in every if not triangle_reason(low, rank, up)]
    if allowed == [own]:
        return {own: 1.0}
    if not line.multipole.startswith("E") or not _same_spin(line.lower, line.upper):
        return {}
    amplitude = {pair: _ls_amplitude(line, *pair) for pair in allowed}
    if not amplitude[own]:
        return {}
    return {pair: value / amplitude[own] for pair, value in amplitude.items() if value}


def _same_spin(lower: Level, upper: Level) -> bool:
    if not lower.coupling == upper.coupling == "LS":
        return False
    return term_quantum_numbers(lower.term)["S"] == term_quantum_numbers(upper.term)["S"]


def _ls_amplitude(line: Line, twice_J: int, twice_J_up: int) -> float:
    low, up = term_quantum_numbers(line.lower.term), term_quantum_numbers(line.upper.term)
    symbol = float(six_j(up["L"], twice_J_up, low["S"], twice_J, low["L"], 2 * line.rank))
    sign = -1 if (up["L"] + low["S"] + twice_J + 2 * line.rank) // 2 % 2 else 1
    return sign * symbol * float(np.sqrt(twice_J + 1))


def amplitudes(ends: Ends, ratios: dict[tuple[int, int], float], lower: TermEigen, upper: TermEigen) -> Array:
    """Compute the signed amplitude of every pair of states of two solved blocks, shape (n, d_upper, d_lower)."""
    coupling = np.zeros((upper.block.size, lower.block.size))
    for low, start in zip(lower.block.parts, lower.block.starts, strict=True):
        for up, start_up in zip(upper.block.parts, upper.block.starts, strict=True):
            ratio = ratios.get((low.twice_J, up.twice_J))
            if ratio is None:
                continue
            elements = multipole_elements(low.twice_J, up.twice_J, ends.line.rank)
            for column, (mJ, mI) in enumerate(zip(low.twice_mJ, low.twice_mI, strict=True)):
                for row, (mJ_up, mI_up) in enumerate(zip(up.twice_mJ, up.twice_mI, strict=True)):
                    if mI == mI_up:
                        coupling[start_up + row, start + column] = ratio * elements.get((mJ, mJ_up), 0.0)
    return np.asarray(upper.states.swapaxes(-1, -2) @ (coupling @ lower.states))


def _rank(block: TermBlock, own: int, twice_F: int) -> int:
    return block.labels.index((own, twice_F))


def term_component(ends: Ends, lower: Label, upper: Label, field_gauss: float) -> Component:
    """Solve one component at one field between whole terms; labels and answer as `components.component`."""
    line, fields = ends.line, as_fields(field_gauss)
    below, above = term_constants(ends.lower), term_constants(ends.upper)
    find_sublevel(below.levels[below.own], *lower), find_sublevel(above.levels[above.own], *upper)
    check_component(line, lower, upper)
    low, up = solve_term_block(below, lower[1], fields), solve_term_block(above, upper[1], fields)
    at_low, at_up = _rank(low.block, below.own, lower[0]), _rank(up.block, above.own, upper[0])
    ratios = pair_ratios(ends)
    total = joined(contributions(ends.upper, fields, [upper]), contributions(ends.lower, fields, [lower], sign=-1.0))
    quadratic = up.quadratic_mhz_per_gauss2()[0, at_up] - low.quadratic_mhz_per_gauss2()[0, at_low]
    return Component(
        line,
        lower,
        upper,
        (upper[1] - lower[1]) // 2,
        float(fields[0]),
        float(up.energy_mhz[0, at_up] - low.energy_mhz[0, at_low]),
        _at_zero(above, upper[0]) - _at_zero(below, lower[0]),
        float(up.slope_mhz_per_gauss()[0, at_up] - low.slope_mhz_per_gauss()[0, at_low]),
        float(quadratic) * HZ_PER_MHZ,
        float(amplitudes(ends, ratios, low, up)[0, at_up, at_low] ** 2),
        zero_field_strength(line, lower, upper),
        bool(ratios),
        spread_of(total),
    )


def _at_zero(constants: TermConstants, twice_F: int) -> float:
    return zero_field_mhz(constants.levels[constants.own], twice_F)


def term_components(ends: Ends, field_gauss: ArrayLike, q: int | None = None) -> Components:
    """Solve every component of a line between whole terms at one or many fields; as `components.components`."""
    line, fields = ends.line, as_fields(field_gauss)
    pairs = _pairs(line, q)
    below, above = term_sublevels(ends.lower, fields), term_sublevels(ends.upper, fields)
    return between(line, pairs, below, above, term_strengths(ends, fields, pairs), bool(pair_ratios(ends)))


def _pairs(line: Line, q: int | None) -> list[Pair]:
    if q is not None and abs(q) > line.rank:
        allowed = f"m' - m of an {line.multipole} line, from -{line.rank} to {line.rank}"
        raise OutsideValidity("polarisation", q, allowed)
    return pairs_of(line, q)


def term_strengths(ends: Ends, fields: Array, pairs: list[Pair]) -> Array:
    """Compute the strength of each listed component at n fields, shape (n, c); zero where no model has it."""
    below, above = term_constants(ends.lower), term_constants(ends.upper)
    ratios = pair_ratios(ends)
    if not ratios:
        return np.zeros((fields.size, len(pairs)))

    def columns(some: Array) -> Array:
        lows = {m: solve_term_block(below, m, some) for m in sorted({low[1] for low, _ in pairs})}
        ups = {m: solve_term_block(above, m, some) for m in sorted({up[1] for _, up in pairs})}
        squares = {
            (m, m_up): amplitudes(ends, ratios, lows[m], ups[m_up]) ** 2
            for m, m_up in {(low[1], up[1]) for low, up in pairs}
        }
        result = np.empty((some.size, len(pairs)))
        for k, ((F, m), (F_up, m_up)) in enumerate(pairs):
            row, column = _rank(ups[m_up].block, above.own, F_up), _rank(lows[m].block, below.own, F)
            result[:, k] = squares[m, m_up][:, row, column]
        return result

    return on_grid(columns, fields, np.full(len(pairs), STRENGTH_TOLERANCE))


def term_component_spread(ends: Ends, field_gauss: ArrayLike, q: int | None = None) -> Spread:
    """Compute the standard uncertainties of the table of components, shape (4, n, c), without the centroid's."""
    fields, pairs = as_fields(field_gauss), _pairs(ends.line, q)
    up = contributions(ends.upper, fields, [pair[1] for pair in pairs])
    low = contributions(ends.lower, fields, [pair[0] for pair in pairs], sign=-1.0)
    return spread_of(joined(up, low))
