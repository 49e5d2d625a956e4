"""Walks of an atom from scattering to scattering: where each photon leaves it, and how many it scatters before loss.

A walk stops at lower states that lasers drive, at dark states, and at states whose branching is unknown. From a driven
state one scattering leads on, by the lasers' excitation rates and the decays that follow. Stimulated emission undoes
excitations without a photon: strong light on the cycle scatters no more, while off resonance it goes on to leak. A
state that lasers reach only off resonance counts as driven when they empty it faster than the cycle fills it, else as
dark. What is unknown is bounded: the same walks with every unknown decay at its worst and at its best, found by policy
iteration.
"""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from levels import absorbing
from levels.branching import METASTABLE
from levels.decaygraph import Graph
from levels.lasers import NOMINAL_PER_S, Laser, excitation, resonant_states

Array = NDArray[np.float64]
Indices = NDArray[np.int64]
ROUNDING = 1e-12  # of a distribution's sum
MOST_ROUNDS = 8


@dataclass(frozen=True, slots=True, eq=False)
class Walk:
    """The stops of all walks, the start first, and what leads from each to the others.

    `onward` (all states, stops) says where a decay from any state stops next. `moves` (stops, stops) are those of the
    driven stops; dark stops have none. `choices` lists each stop of unknown branching with its options (options,
    stops). `cooling` is the share of the first laser in what a stop scatters. `rates` are each laser's excitations,
    `leading` (n, n) where all of them lead: to an upper state that decays, or by stimulated emission to a lower one.
    """

    graph: Graph
    lasers: tuple[Laser, ...]
    rates: tuple[Array, ...]
    leading: Array
    stops: Indices
    onward: Array
    moves: Array
    dark: NDArray[np.bool_]
    driven: NDArray[np.bool_]
    choices: tuple[tuple[int, Array], ...]
    cooling: Array
    places: dict[int, int]

    def place(self, state: int) -> int:
        """Return which stop a state is, -1 when it is none."""
        return self.places.get(state, -1)


@dataclass(frozen=True, slots=True, eq=False)
class Outcome:
    """What walks under k sets of lasers come to: photons of the first laser before loss, visits (k, stops).

    `moves` (k, stops, stops) are those walked, `ahead` the photons still to come from each stop, and `chosen`
    (k, choices) says which option each unknown branching took.
    """

    photons: Array
    visits: Array
    ahead: Array
    moves: Array
    chosen: Indices


Pumping = Sequence[tuple[int, Array]]  # stops that another laser empties, each with where one scattering leads


def dark_states(graph: Graph, dark_after_s: float) -> NDArray[np.bool_]:
    """Find the states that stay as they are for longer than the given time without light."""
    metastable = np.array([graph.branchings[state.level.name].closure == METASTABLE for state in graph.states])
    known = ~np.isnan(graph.rates)
    slow = np.where(known, graph.rates, np.where(metastable, 0.0, np.inf)) < 1.0 / dark_after_s
    empty = np.array([len(options) == 0 for options in graph.options])
    result: NDArray[np.bool_] = slow | empty
    return result


def light_of(graph: Graph, lasers: Sequence[Laser], field_gauss: float) -> list[Array]:
    """Compute each laser's excitation rates between all states, shape (n, n), lower states as rows."""
    tables = []
    for laser in lasers:
        table = np.zeros((graph.size, graph.size))
        low, up = graph.spans[laser.line.lower.name], graph.spans[laser.line.upper.name]
        table[low.start : low.stop, up.start : up.stop] = excitation(graph, laser, field_gauss)
        tables.append(table)
    return tables


def resonant_mask(graph: Graph, lasers: Sequence[Laser]) -> NDArray[np.bool_]:
    """Mark the states that some laser is meant to excite."""
    mask = np.zeros(graph.size, dtype=np.bool_)
    for laser in lasers:
        mask[[graph.at(s.level, s.twice_F) for s in resonant_states(graph, laser)]] = True
    return mask


def emptied_off_resonance(
    graph: Graph, lasers: Sequence[Laser], dark_after_s: float, field_gauss: float = 0.0
) -> tuple[int, ...]:
    """Find the states that lasers empty off resonance, within `dark_after_s` and faster than the cycle fills them."""
    light = np.sum(light_of(graph, lasers, field_gauss), axis=0)
    excited = light.sum(axis=1)
    resonant = resonant_mask(graph, lasers)
    weak = np.flatnonzero((excited > 1.0 / dark_after_s) & ~resonant)
    if not weak.size:
        return ()
    walk = walk_of(graph, lasers, dark_after_s, field_gauss, more_stops=weak.tolist())
    outcome = follow(walk, [()], worst=True)
    filled = outcome.visits[0] @ walk.moves / float(outcome.visits[0] @ walk.cooling)
    start = int(walk.stops[0])
    upper = graph.rates[int(light[start].argmax())]
    gamma = NOMINAL_PER_S if np.isnan(upper) else upper
    cycle = excited[start] * gamma / (gamma + 2 * excited[start])
    return tuple(int(k) for k in weak if excited[k] >= filled[walk.place(int(k))] * cycle)


def walk_of(
    graph: Graph,
    lasers: Sequence[Laser],
    dark_after_s: float,
    field_gauss: float = 0.0,
    emptied: Sequence[int] = (),
    more_stops: Sequence[int] = (),
) -> Walk:
    """Set up the walks of an atom under lasers, the first of which cools.

    `emptied` are the states that lasers empty off resonance, `more_stops` states to stop at too.
    """
    tables = light_of(graph, lasers, field_gauss)
    decaying, leading = after_stimulated_emission(graph, np.sum(tables, axis=0))
    excited = leading.sum(axis=1)
    driven = resonant_mask(graph, lasers)
    driven[list(emptied)] = True
    dark = dark_states(graph, dark_after_s) & ~driven
    unknown = np.array([len(options) > 1 for options in graph.options]) & ~driven & ~dark
    first = resonant_states(graph, lasers[0])[0]
    start = graph.at(first.level, first.twice_F)
    others = driven | dark | unknown
    others[list(more_stops)] = True
    others[start] = False
    stops = np.array([start, *np.flatnonzero(others)])
    onward = _onward(graph, stops)
    moves = np.zeros((stops.size, stops.size))
    cooling = np.zeros(stops.size)
    for row, state in enumerate(stops):
        options = graph.options[state]
        own = 0.0 if np.isnan(graph.rates[state]) else graph.rates[state]
        if driven[state]:
            decays = own * (options[0] @ onward) if len(options) else 0.0
            moves[row] = (leading[state] @ onward + decays) / (excited[state] + own)
            cooling[row] = tables[0][state] @ decaying / (excited[state] + own)
        elif not dark[state] and not unknown[state]:
            moves[row] = options[0] @ onward
    choices = tuple((row, graph.options[s] @ onward) for row, s in enumerate(stops) if unknown[s])
    places = {int(state): k for k, state in enumerate(stops)}
    marks = (dark[stops], driven[stops])
    return Walk(graph, tuple(lasers), tuple(tables), leading, stops, onward, moves, *marks, choices, cooling, places)


def after_stimulated_emission(graph: Graph, light: Array) -> tuple[Array, Array]:
    """Compute the chance that a state decays before light takes it down, and the rates (n, n) of where light leads.

    Light that excites l to u with W takes u down with W g_l/g_u. A way back to the same state is no event. An upper
    state without a known lifetime decays at once.
    """
    weights = np.array([state.weight for state in graph.states], dtype=np.float64)
    down = (light * weights[:, None] / weights[None, :]).T
    stimulated = down.sum(axis=1)
    lit = (stimulated > 0) & ~np.isnan(graph.rates)
    leaving = np.where(lit, graph.rates + stimulated, 1.0)
    decaying = np.where(lit, graph.rates / leaving, 1.0)
    swapped = np.where(lit, light / leaving, 0.0) @ down
    np.fill_diagonal(swapped, 0.0)
    return decaying, light * decaying + swapped


def _onward(graph: Graph, stops: Indices) -> Array:
    """Follow all decays down to the next stop; states stand by rising energy, so each needs only those before it."""
    onward = np.zeros((graph.size, stops.size))
    stopped = np.zeros(graph.size, dtype=np.bool_)
    stopped[stops] = True
    onward[stops, np.arange(stops.size)] = 1.0
    for state in range(graph.size):
        if not stopped[state] and len(graph.options[state]):
            onward[state] = graph.options[state][0] @ onward
    return onward


def lost_from(moves: Array, dark: NDArray[np.bool_]) -> Array:
    """Return what is missing to 1 in each row, without rounding; everything for dark rows."""
    missing = 1.0 - moves.sum(axis=-1)
    return np.where(dark, 1.0, np.where(missing > ROUNDING, missing, 0.0))


def follow(walk: Walk, pumpings: Sequence[Pumping], worst: bool) -> Outcome:
    """Walk to the end under each of k extra sets of pumped stops, unknown branching at its worst or at its best.

    Unknown branching that leads back to a pumped stop is no loss: the next decay may go elsewhere.
    """
    count, size = len(pumpings), walk.stops.size
    moves = np.broadcast_to(walk.moves, (count, size, size)).copy()
    dark = np.broadcast_to(walk.dark, (count, size)).copy()
    pumped = np.zeros((count, size), dtype=np.bool_)
    for k, pumping in enumerate(pumpings):
        for stop, row in pumping:
            moves[k, stop], dark[k, stop], pumped[k, stop] = row, False, True
    kept = _alive(walk, moves, dark)
    chosen = _leading_home(walk, moves, pumped)
    for _ in range(MOST_ROUNDS):
        for at, (stop, options) in enumerate(walk.choices):
            free = ~pumped[:, stop]
            moves[free, stop] = options[chosen[free, at]]
        chain = _chain(moves, dark, kept)
        ahead = np.zeros((count, size))
        ahead[:, kept] = absorbing.values(chain, walk.cooling[kept])
        better = np.array(
            [_best(ahead @ options.T, chosen[:, at], worst) for at, (_, options) in enumerate(walk.choices)],
            dtype=np.int64,
        ).reshape(len(walk.choices), count)
        if np.array_equal(better.T, chosen):
            break
        chosen = better.T
    visits = np.zeros((count, size))
    visits[:, kept] = absorbing.visits(chain)
    return Outcome(ahead[:, 0], visits, ahead, moves, chosen)


def _leading_home(walk: Walk, moves: Array, pumped: NDArray[np.bool_]) -> Indices:
    """Choose for each unknown branching an option from which the start can be reached, where there is one.

    From such choices policy iteration never runs into an endless loop that another option would leave.
    """
    count, size = pumped.shape
    chosen = np.zeros((count, len(walk.choices)), dtype=np.int64)
    links = (moves > 0).astype(np.float64)
    home = np.zeros((count, size))
    home[:, 0] = 1.0
    while True:
        wider = np.maximum(home, (links @ home[..., None])[..., 0] > 0)
        for at, (stop, options) in enumerate(walk.choices):
            reach = home @ options.T
            new = (reach.max(axis=1) > 0) & (home[:, stop] == 0) & ~pumped[:, stop]
            chosen[new, at] = reach[new].argmax(axis=1)
            wider[new, stop] = 1.0
        if np.array_equal(wider, home):
            return chosen
        home = wider


def _alive(walk: Walk, moves: Array, dark: NDArray[np.bool_]) -> Indices:
    """List the stops that some walk may reach and leave again; the chain needs no others."""
    links = np.asarray((moves > 0).any(axis=0))
    for stop, options in walk.choices:
        links[stop] |= (options > 0).any(axis=0)
    reached = np.zeros(walk.stops.size, dtype=np.bool_)
    reached[0] = True
    for _ in range(walk.stops.size):
        wider = reached | links[reached].any(axis=0)
        if np.array_equal(wider, reached):
            break
        reached = wider
    return np.flatnonzero(reached & ~dark.all(axis=0))


def _chain(moves: Array, dark: NDArray[np.bool_], kept: Indices) -> absorbing.Reduced:
    """Eliminate the stops that are kept; what leads to the others is lost."""
    inner = moves[:, kept[:, None], kept]
    others = np.ones(moves.shape[-1], dtype=np.bool_)
    others[kept] = False
    loss = lost_from(moves, dark)[:, kept] + moves[:, kept][:, :, others].sum(axis=-1)
    return absorbing.reduce(*absorbing.closed_off(inner, loss))


def _best(values: Array, now: Indices, worst: bool) -> Indices:
    """Pick the worst or best option of each set, staying with the present one unless another is clearly better."""
    signed = -values if worst else values
    kept = np.take_along_axis(signed, now[:, None], axis=1)[:, 0]
    top = signed.max(axis=1)
    result: Indices = np.where(top > kept + 1e-9 * np.abs(kept), signed.argmax(axis=1), now)
    return result
