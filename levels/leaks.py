"""Where an atom leaks to under its present lasers: states reached, photons before loss, and the time that takes.

"Photons" are those that the first, cooling laser makes the atom scatter. Bounds enclose what unknown branching allows;
levels that the book does not hold are not considered. The time follows from rate equations between the levels with
stimulated emission, so it depends on the lasers' intensities and detunings. The number of photons does so where leaks
are off-resonant, which saturation of the cycle makes more frequent per photon, or where lasers share an upper state.
"""

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from levels import absorbing
from levels.branching import DATA, METASTABLE, RULE, UNKNOWN
from levels.decaygraph import Graph, State
from levels.lasers import Laser
from levels.leaktime import seconds_before_loss
from levels.records import Level
from levels.walks import Outcome, Walk, emptied_off_resonance, follow, walk_of

Array = NDArray[np.float64]
LOST, RETURNS, EITHER = "lost", "returns", "either"
CLOSED = "the cycle is closed"
DECAY, OFF_RESONANT = "decay", "off-resonant excitation"
Bound = Callable[..., Any]  # np.max or np.min over the options of an unknown branching
NEGLIGIBLE = 1e-15  # per photon: what rounding and very distant light make


@dataclass(frozen=True, slots=True)
class Reached:
    """One state that the present lasers do not drive: how often it is entered per photon, from where, and its fate.

    `at_least` and `at_most` bound how often; they differ where branching is unknown. `returns` is the probability that
    the atom comes back to scatter. `through` names the levels it comes from, the most frequent first.
    """

    position: int
    state: State
    at_least: float
    at_most: float
    cause: str
    through: tuple[str, ...]
    returns: float
    lifetime_s: float | None

    @property
    def fate(self) -> str:
        """Whether what gets here is lost, returns, or may do either."""
        if self.returns <= 0.0:
            return LOST
        return RETURNS if self.returns > 1 - 1e-12 else EITHER


@dataclass(frozen=True, slots=True, eq=False)
class Leaks:
    """The present scheme. `photons` and `most` bound the photons before loss (None: the cycle is closed).

    `emitted` is the share of them that is emitted on the cooling line. `closure` is that of the loosest level on the
    way; `unknown` says which branchings are not published. `seconds` is None where a lifetime is missing or the cycle
    is closed, `reason` says which.
    """

    walk: Walk
    emptied: tuple[int, ...]
    outcome: Outcome
    photons: float | None
    most: float | None
    uncertainty: float | None
    emitted: float
    seconds: float | None
    reason: str
    reached: tuple[Reached, ...]
    closure: str
    unknown: tuple[str, ...]


def leaks_of(graph: Graph, lasers: Sequence[Laser], dark_after_s: float, field_gauss: float = 0.0) -> Leaks:
    """Follow the atom under the present lasers to every state it can reach."""
    emptied = emptied_off_resonance(graph, lasers, dark_after_s, field_gauss)
    walk = walk_of(graph, lasers, dark_after_s, field_gauss, emptied)
    low, high = follow(walk, [()], worst=True), follow(walk, [()], worst=False)
    flow, parents, resonant = _flows(walk, low, np.max)
    least, _, _ = _flows(walk, low, np.min)
    rate = float(low.visits[0] @ walk.cooling)
    photons, most = endless(float(low.photons[0])), endless(float(high.photons[0]))
    reached = _reached(walk, low, (least / rate, flow / rate), parents, resonant / rate)
    line = lasers[0].line
    span = graph.spans[line.upper.name]
    branching = graph.branchings[line.upper.name]
    share = next((c.share for c in branching.channels if c.line.name == line.name), 0.0)
    seconds, reason = (None, CLOSED) if photons is None else seconds_before_loss(walk, low, flow)
    return Leaks(
        walk,
        emptied,
        low,
        photons,
        most,
        None if photons is None else _uncertainty(walk, low, flow),
        share * float(flow[span.start : span.stop].sum()) / rate,
        seconds,
        reason,
        reached,
        *_closure(walk, flow / rate),
    )


def metastable_elsewhere(leaks: Leaks) -> list[Level]:
    """List the metastable levels below the cooling cycle that no decay reaches.

    Collisions, blackbody radiation or other light can fill them.
    """
    graph, lasers = leaks.walk.graph, leaks.walk.lasers
    seen = {item.state.level.name for item in leaks.reached} | {laser.line.lower.name for laser in lasers}
    highest = max((laser.line.upper.energy.value if laser.line.upper.energy else 0.0) for laser in lasers)
    return [
        level
        for level in graph.atom.levels
        if graph.branchings[level.name].closure == METASTABLE
        and level.name not in seen
        and level.energy is not None
        and level.energy.value < highest
        and level.name != graph.atom.isotope.ground
    ]


def neglected(leaks: Leaks) -> list[str]:
    """Say of each level on the way which dipole-allowed decays its one published share leaves no room for."""
    graph = leaks.walk.graph
    on_the_way = {laser.line.upper.name for laser in leaks.walk.lasers} | {
        one.state.level.name for one in leaks.reached
    }
    notes = []
    for name in graph.spans:
        note = graph.branchings[name].note
        if name in on_the_way and note.endswith("neglected"):
            shares = [channel.line.branching for channel in graph.branchings[name].channels]
            why = "; ".join(share.note for share in shares if share is not None and share.note)
            notes.append(f"{name}: {note} ({why})" if why else f"{name}: {note}")
    return notes


def endless(photons: float) -> float | None:
    """Return the number, or None for a walk without end."""
    return None if photons > absorbing.ENDLESS else photons


def row_of(walk: Walk, stop: int, bound: Bound) -> Array:
    """Return how often one visit to a stop leads directly into each state; unknown branching by its bound."""
    graph, state = walk.graph, int(walk.stops[stop])
    options = graph.options[state]
    option: Array | None = bound(options, axis=0) if len(options) else None
    if walk.driven[stop]:
        light = walk.leading[state]
        own = 0.0 if option is None or np.isnan(graph.rates[state]) else float(graph.rates[state])
        row: Array = (light + (own * option if own and option is not None else 0.0)) / (light.sum() + own)
        return row
    return np.zeros(graph.size) if walk.dark[stop] or option is None else option


def _flows(walk: Walk, outcome: Outcome, bound: Bound) -> tuple[Array, Array, Array]:
    """Count entries into every state in all walks: the total, by parent level (levels, n), by resonant light alone."""
    graph = walk.graph
    names = list(graph.spans)
    level_of = np.array([names.index(state.level.name) for state in graph.states])
    flow, resonant = np.zeros(graph.size), np.zeros(graph.size)
    parents = np.zeros((len(names), graph.size))
    meant = _meant(walk)
    for stop, visits in enumerate(outcome.visits[0]):
        row = row_of(walk, stop, bound)
        flow += visits * row
        parents[level_of[walk.stops[stop]]] += visits * row
        resonant += visits * row * (meant if walk.driven[stop] else meant[walk.stops[stop]])
    stopped = np.zeros(graph.size, dtype=np.bool_)
    stopped[walk.stops] = True
    for state in range(graph.size - 1, -1, -1):
        if not stopped[state] and flow[state] > 0 and len(graph.options[state]):
            option = graph.options[state][0]
            flow += flow[state] * option
            parents[level_of[state]] += flow[state] * option
            resonant += resonant[state] * option
    return flow, parents, resonant


def _meant(walk: Walk) -> Array:
    """Mark the upper states that the lasers are tuned to, and everything that is not an upper state of a laser."""
    graph = walk.graph
    meant = np.ones(graph.size)
    for laser in walk.lasers:
        if laser.component is not None and graph.resolved:
            for k in graph.spans[laser.line.upper.name]:
                meant[k] = 0.0
    for laser in walk.lasers:
        span = graph.spans[laser.line.upper.name]
        wanted = None if laser.component is None or not graph.resolved else laser.component[1]
        for k in span:
            if wanted is None or graph.states[k].twice_F == wanted:
                meant[k] = 1.0
    return meant


def _reached(
    walk: Walk, outcome: Outcome, bounds: tuple[Array, Array], parents: Array, resonant: Array
) -> tuple[Reached, ...]:
    least, share = bounds
    graph, names = walk.graph, list(walk.graph.spans)
    back = _chance_of_return(walk, outcome)
    uppers = {laser.line.upper.name for laser in walk.lasers}
    found = []
    for k, state in enumerate(graph.states):
        place = walk.place(k)
        if share[k] <= NEGLIGIBLE or state.level.name in uppers or (place >= 0 and walk.driven[place]):
            continue
        order = np.argsort(-parents[:, k])
        through = tuple(names[p] for p in order if parents[p, k] > 1e-3 * parents[:, k].max())
        rate = graph.rates[k]
        lifetime = None if np.isnan(rate) or rate == 0 else 1.0 / float(rate)
        cause = DECAY if resonant[k] > 0.5 * share[k] else OFF_RESONANT
        found.append(Reached(k, state, float(least[k]), float(share[k]), cause, through, float(back[k]), lifetime))
    return tuple(sorted(found, key=lambda item: -item.at_most))


def _chance_of_return(walk: Walk, outcome: Outcome) -> Array:
    """Compute the chance to come back to a driven stop from every state."""
    rows = walk.moves.copy()
    for at, (stop, options) in enumerate(walk.choices):
        rows[stop] = options[outcome.chosen[0, at]]
    chance = np.where(walk.driven, 1.0, 0.0)
    free = ~walk.driven & ~walk.dark
    for _ in range(walk.stops.size):
        chance = np.where(free, rows @ chance, chance)
    result: Array = walk.onward @ chance
    return result


def _uncertainty(walk: Walk, outcome: Outcome, flow: Array) -> float | None:
    """Propagate the shares' uncertainties into the photons: each share moves against the largest of its level.

    None where a share that matters states none, or where nothing but off-resonant excitation matters.
    """
    graph = walk.graph
    ahead = walk.onward @ outcome.ahead[0]
    variance, unstated = 0.0, False
    for name, branching in graph.branchings.items():
        span = graph.spans[name]
        through = flow[span.start : span.stop]
        if len(branching.channels) < 2 or through.sum() <= 0:
            continue
        means = [_mean_ahead(graph, name, c.line.lower.name, ahead, through) for c in branching.channels]
        largest = int(np.argmax([c.share for c in branching.channels]))
        for k, channel in enumerate(branching.channels):
            slope = means[k] - means[largest]
            if k != largest:
                variance += (slope * channel.uncertainty) ** 2
                unstated |= channel.uncertainty == 0 and abs(slope) * channel.share > 1e-3 * outcome.photons[0]
    return None if unstated or variance == 0 else float(np.sqrt(variance))


def _mean_ahead(graph: Graph, upper: str, lower: str, ahead: Array, through: Array) -> float:
    """Return the photons still ahead after all decays from one level to another, summed over what passes."""
    low, up = graph.spans[lower], graph.spans[upper]
    total = 0.0
    for passing, k in zip(through, up, strict=True):
        if passing > 0 and len(graph.options[k]):
            row = graph.options[k][0][low.start : low.stop]
            total += passing * float(row @ ahead[low.start : low.stop]) / max(float(row.sum()), 1e-300)
    return total


def _closure(walk: Walk, share: Array) -> tuple[str, tuple[str, ...]]:
    """Say what the answer rests on: the loosest closure among the levels that decay on the way, and what is unknown."""
    still = np.zeros(walk.graph.size, dtype=np.bool_)
    still[walk.stops] = walk.driven | walk.dark
    used = {s.level.name for k, s in enumerate(walk.graph.states) if share[k] > NEGLIGIBLE and not still[k]}
    found = [(name, walk.graph.branchings[name]) for name in walk.graph.spans if name in used]
    texts = tuple(
        f"{name}: {b.note}; may go to {', '.join(level.name for level in b.possible)}"
        for name, b in found
        if b.possible and b.closure != METASTABLE
    )
    closures = [b.closure for _, b in found if b.closure != METASTABLE]
    return next((name for name in (UNKNOWN, DATA) if name in closures), RULE), texts
