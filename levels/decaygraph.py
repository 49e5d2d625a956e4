"""The decays of a whole atom as a graph of levels, or of hyperfine levels F, each with every way its decays may go.

A state whose decays are known has one option: the distribution over the states below. Where branching is unknown it has
several, one for each extreme that the bounds allow; the truth lies between them. What an option lacks to 1 is lost.
At hyperfine resolution the nuclear spin looks on: F' -> F goes by (2J'+1)(2F+1){J J' k; F' F I}^2.
"""

from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from levels.angular import triangle_reason
from levels.branching import Branching, branching_of
from levels.components import components, strength_model
from levels.errors import NotPublished
from levels.notation import format_half
from levels.racah import six_j_square
from levels.records import Atom, Level, Line

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class State:
    """A level, or one of its hyperfine levels (doubled F)."""

    level: Level
    twice_F: int | None

    def __str__(self) -> str:
        return self.level.name if self.twice_F is None else f"{self.level.name} F={format_half(self.twice_F)}"

    @property
    def weight(self) -> int:
        """How many sublevels it has."""
        if self.twice_F is None:
            return (self.level.twice_J + 1) * (self.level.twice_I + 1)
        return self.twice_F + 1


@dataclass(frozen=True, slots=True, eq=False)
class Graph:
    """Every state by rising energy; `options[s]` has shape (o, n), no row for a state that nothing leaves by itself.

    `rates` are total decay rates in s-1, NaN where unknown.
    """

    atom: Atom
    resolved: bool
    states: tuple[State, ...]
    spans: dict[str, range]
    options: tuple[Array, ...]
    rates: Array
    branchings: dict[str, Branching]

    @property
    def size(self) -> int:
        """How many states there are."""
        return len(self.states)

    def at(self, level: Level, twice_F: int | None = None) -> int:
        """Return the position of a state; F is that of the graph's resolution."""
        span = self.spans[level.name]
        return span.start if twice_F is None else next(k for k in span if self.states[k].twice_F == twice_F)


def momenta(level: Level) -> range:
    """List every doubled F of a level."""
    return range(abs(level.twice_J - level.twice_I), level.twice_J + level.twice_I + 1, 2)


@lru_cache(maxsize=1024)
def hyperfine_shares(twice_J_up: int, twice_J: int, twice_I: int, rank: int) -> Array:
    """Return the share of each F (columns) in the decays of each F' (rows) at zero field."""
    ups = range(abs(twice_J_up - twice_I), twice_J_up + twice_I + 1, 2)
    lows = range(abs(twice_J - twice_I), twice_J + twice_I + 1, 2)
    table = np.zeros((len(ups), len(lows)))
    if triangle_reason(twice_J, 2 * rank, twice_J_up):
        table[:] = np.array([F + 1 for F in lows]) / sum(F + 1 for F in lows)
    else:
        for row, F_up in enumerate(ups):
            for column, F in enumerate(lows):
                square = six_j_square(twice_J_up, twice_J, 2 * rank, F, F_up, twice_I)
                table[row, column] = float((twice_J_up + 1) * (F + 1) * square)
    table.setflags(write=False)
    return table


def shares_in_field(line: Line, field_gauss: float) -> Array:
    """Return the share of each F in the decays of each F' in a field, averaged over the sublevels of F'."""
    found = components(line, field_gauss)
    ups, lows = list(momenta(line.upper)), list(momenta(line.lower))
    table = np.zeros((len(ups), len(lows)))
    rows = (found.upper_twice_F - ups[0]) // 2
    columns = (found.lower_twice_F - lows[0]) // 2
    np.add.at(table, (rows, columns), found.strength[0] / (found.upper_twice_F + 1))
    return table


def decay_shares(upper: Level, lower: Level, line: Line | None, field_gauss: float) -> Array:
    """Return the share of each F in the decays of each F'; without a line, as a dipole line."""
    model = "J" if line is None else strength_model(line)
    rank = 1 if line is None else line.rank
    if model == "F":
        return hyperfine_shares(upper.twice_I, lower.twice_I, 0, rank)
    if model == "J" and line is not None and field_gauss:
        try:
            return shares_in_field(line, field_gauss)
        except NotPublished:  # constants of a level nobody drives: its zero-field shares do
            pass
    return hyperfine_shares(upper.twice_J, lower.twice_J, upper.twice_I, rank)


@dataclass(frozen=True, slots=True)
class Tables:
    """Where the states of each level stand, and by which line one level goes to another."""

    spans: dict[str, range]
    size: int
    resolved: bool
    field_gauss: float
    lines: dict[str, Line]

    def of(self, upper: Level, lower: Level) -> Array:
        """Return the distribution over all states that the decays to one level make, a row for each F'."""
        span, table = self.spans[lower.name], np.zeros((len(self.spans[upper.name]), self.size))
        line = self.lines.get(lower.name)
        shares = decay_shares(upper, lower, line, self.field_gauss) if self.resolved else np.ones((1, 1))
        table[:, span.start : span.stop] = shares
        return table


def graph_of(atom: Atom, resolved: bool, field_gauss: float = 0.0) -> Graph:
    """Build the graph of an atom; a field mixes the hyperfine levels of lines whose constants are known."""
    levels = sorted(atom.levels, key=lambda level: float("inf") if level.energy is None else level.energy.value)
    states: list[State] = []
    spans: dict[str, range] = {}
    for level in levels:
        start = len(states)
        states += [State(level, F) for F in momenta(level)] if resolved else [State(level, None)]
        spans[level.name] = range(start, len(states))
    branchings = {level.name: branching_of(atom, level) for level in levels}
    options: list[Array] = []
    for level in levels:
        lines = {line.lower.name: line for line in atom.lines if line.upper.name == level.name and line.photons == 1}
        tables = Tables(spans, len(states), resolved, field_gauss, lines)
        options += _options(branchings[level.name], tables)
    rates = [branchings[state.level.name].total_per_s for state in states]
    totals = np.array([np.nan if rate is None else rate for rate in rates])
    return Graph(atom, resolved, tuple(states), spans, tuple(options), totals, branchings)


def _options(found: Branching, tables: Tables) -> list[Array]:
    """Write the options of all states of one level: known shares with each extreme of what is unknown."""
    level, own = found.level, len(tables.spans[found.level.name])
    if not found.channels and not found.possible:
        return [np.zeros((0, tables.size))] * own
    known = sum((c.share * tables.of(level, c.line.lower) for c in found.channels), np.zeros((own, tables.size)))
    low, high = found.unknown
    if high == 0:
        return [known[row : row + 1] for row in range(own)]
    ends = [tables.of(level, lower) for lower in found.possible] or [np.zeros((own, tables.size))]
    amounts = (high,) if low == high else (low, high)
    rows = [(1 - part) * known + part * end for part in amounts for end in ends]
    return [np.array([row[k] for row in rows]) for k in range(own)]
