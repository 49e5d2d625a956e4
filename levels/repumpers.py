"""Which lines empty a leak: every line of the book from there, with the hyperfine components it needs.

A repumper is one laser with sidebands: it excites every hyperfine level of the leak that the atom gets into, each to
the F' from which decays lead back to the cooling cycle best. Where a single F leaks, each F' makes its own repumper.
"""

from collections.abc import Iterable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from levels.decaygraph import Graph, momenta
from levels.lasers import Laser
from levels.records import Level, Line
from levels.walks import Walk

Array = NDArray[np.float64]
Component = tuple[int, int]
EMPTIES = 1e-9  # chance to leave the level with one scattering, below which a laser does not empty it


@dataclass(frozen=True, slots=True)
class Repumper:
    """One laser that empties a level: its line and, at hyperfine resolution, its components (doubled F, F')."""

    line: Line
    components: tuple[Component, ...]
    pumped: tuple[tuple[int, int], ...]  # lower and upper states in the graph

    @property
    def key(self) -> tuple[str, tuple[Component, ...]]:
        """What tells it from others of the same atom."""
        return self.line.name, self.components

    @property
    def empties(self) -> Level:
        """The level that it empties."""
        return self.line.lower


def landing(walk: Walk, state: int) -> Array:
    """Return where a decay from a state stops first: at itself when its branching is unknown."""
    row: Array = walk.onward[state]
    return row


def repumpers_of(walk: Walk, leaking: Sequence[int], chance: Array, present: Sequence[Laser]) -> list[Repumper]:
    """List every repumper for the leaking states; `chance` is that of return to the cycle from each stop."""
    graph = walk.graph
    found = []
    levels = dict.fromkeys(graph.states[k].level.name for k in leaking)
    for name in levels:
        needed = [k for k in leaking if graph.states[k].level.name == name]
        for line in graph.atom.lines:
            if line.lower.name == name and line.photons == 1 and not _is_present(line, present, graph):
                found += _for_line(walk, line, needed, chance)
    return found


def _is_present(line: Line, present: Sequence[Laser], graph: Graph) -> bool:
    """Whether a laser on all of this line is there already; one on a single component leaves the others to repump."""
    return any(laser.line.name == line.name and (laser.component is None or not graph.resolved) for laser in present)


def _for_line(walk: Walk, line: Line, needed: Sequence[int], chance: Array) -> list[Repumper]:
    graph = walk.graph
    if not graph.resolved:
        up = graph.at(line.upper)
        pumped = ((needed[0], up),)
        return [Repumper(line, (), pumped)] if _leaving(walk, needed, up) > EMPTIES else []
    options = {k: _uppers(walk, line, k, needed, chance) for k in needed}
    if any(not ups for ups in options.values()):
        return []
    if len(needed) == 1:
        firsts: list[tuple[tuple[int, int], ...]] = [((needed[0], up),) for up in options[needed[0]]]
    else:
        firsts = [tuple((k, ups[0]) for k, ups in options.items())]
    return [_completed(walk, line, first, chance) for first in firsts]


def _uppers(walk: Walk, line: Line, low: int, needed: Iterable[int], chance: Array) -> list[int]:
    """List the F' that empty one F, the surest way back to the cycle first, then the quickest."""
    graph = walk.graph
    F = graph.states[low].twice_F or 0
    places = [walk.place(k) for k in graph.spans[line.lower.name] if walk.place(k) >= 0]
    own = [p for p in places if not walk.driven[p]]
    ranked = []
    for F_up in momenta(line.upper):
        if abs(F - F_up) <= 2 * line.rank <= F + F_up:
            up = graph.at(line.upper, F_up)
            leaving = _leaving(walk, [low], up)
            row = landing(walk, up).copy()
            row[own] = 0.0
            if leaving > EMPTIES:
                ranked.append((-round(float(row @ chance) / max(row.sum(), 1e-300), 9), -round(leaving, 9), F_up, up))
    return [up for *_, up in sorted(ranked)]


def _leaving(walk: Walk, low: Sequence[int], up: int) -> float:
    """Return the chance that one scattering through `up` does not end where it began."""
    row = landing(walk, up)
    stays = sum(float(row[walk.place(k)]) for k in low if walk.place(k) >= 0)
    return 1.0 - stays


def _completed(walk: Walk, line: Line, first: tuple[tuple[int, int], ...], chance: Array) -> Repumper:
    """Add the components for other F of the level that the repumper itself fills."""
    graph = walk.graph
    pumped = dict(first)
    while True:
        filled = {
            int(walk.stops[p])
            for up in pumped.values()
            for p in np.flatnonzero(landing(walk, up) > EMPTIES)
            if walk.dark[p] and int(walk.stops[p]) in graph.spans[line.lower.name]
        }
        missing = [k for k in sorted(filled) if k not in pumped]
        ups = {k: _uppers(walk, line, k, filled, chance) for k in missing}
        more = {k: options[0] for k, options in ups.items() if options}
        if not more:
            break
        pumped |= more
    ends = tuple((graph.states[low].twice_F or 0, graph.states[up].twice_F or 0) for low, up in pumped.items())
    return Repumper(line, ends, tuple(pumped.items()))
