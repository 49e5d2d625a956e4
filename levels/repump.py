"""Searches the repumpers, and sets of them, that keep an atom in its cooling cycle longest.

Every repumper is tried alone; where none closes the cycle, pairs are tried, and larger sets are grown from the best
pairs and from the best repumper of each leak. Sets are ranked by the photons before loss that published branching
guarantees, then by what unknown branching may allow at best. Among equals come first: fewer lasers; light between 350
and 1700 nm, where lasers are common (common practice, no law); electric-dipole lines; a surer way back (by half orders
of magnitude); the driven line itself; fewer photons for each leak. A set beyond these bounds is not tried, and the
answer says how far the search went.
"""

from collections.abc import Iterable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from levels.decaygraph import Graph
from levels.lasers import Laser
from levels.leaks import LOST, NEGLIGIBLE, Leaks, Reached, endless, leaks_of
from levels.repumpers import Repumper, landing, repumpers_of
from levels.walks import Outcome, Pumping, Walk, follow, walk_of

Array = NDArray[np.float64]
MOST_REPUMPERS = 60
MOST_PAIRED = 14
MOST_PAIRS = 120
MOST_LASERS = 4
GROWN_FROM = 3
COMMON_NM = (350.0, 1700.0)
SHORTEST_S = 1e-6  # a leak that decays within this time is over before a repumper acts
SAME = 1e-3  # relative difference of photon numbers below which they rank as equal


@dataclass(frozen=True, slots=True)
class Scheme:
    """A set of repumpers beside the present lasers. `photons`, `most`: bounds of the photons before loss, None endless.

    `returning` is the least chance that a scattering of a repumper leads back before any other leak, `per_photon` the
    photons of all repumpers for each cooling photon, `per_leak` those for each time that a leak is entered. `opens`
    names the states that only now are reached and lost.
    """

    repumpers: tuple[Repumper, ...]
    photons: float | None
    most: float | None
    returning: float
    per_photon: float
    per_leak: float
    opens: tuple[str, ...]

    @property
    def is_closed(self) -> bool:
        """Whether published branching closes the cycle."""
        return self.photons is None


@dataclass(frozen=True, slots=True, eq=False)
class Search:
    """The present scheme, single repumpers and sets of them by rank, and how far the search went."""

    leaks: Leaks
    singles: tuple[Scheme, ...]
    sets: tuple[Scheme, ...]
    bounds: tuple[str, ...]


def repump(graph: Graph, lasers: Sequence[Laser], dark_after_s: float, field_gauss: float = 0.0) -> Search:
    """Find what brings the atom back."""
    leaks = leaks_of(graph, lasers, dark_after_s, field_gauss)
    leaking = [item.position for item in leaks.reached if item.returns < 1 - 1e-9 and _stays(item)]
    passing = [k for k in leaking if leaks.walk.place(k) < 0]
    walk = walk_of(graph, lasers, dark_after_s, field_gauss, leaks.emptied, passing) if passing else leaks.walk
    tried = Tried(walk, leaks)
    first = repumpers_of(walk, leaking, tried.chance, lasers)
    bounds = []
    if len(first) > MOST_REPUMPERS:
        bounds.append(f"the first {MOST_REPUMPERS} of {len(first)} repumpers were tried")
        first = first[:MOST_REPUMPERS]
    singles = tried.schemes([(one,) for one in first])
    sets: list[Scheme] = []
    if singles and not any(one.is_closed for one in singles):
        second = repumpers_of(walk, tried.opened(first), tried.chance, lasers)[:MOST_REPUMPERS]
        pairs = _pairs(singles, second, tried, bounds)
        sets = tried.schemes(pairs)
        if not any(one.is_closed for one in sets):
            sets += _grown(tried, singles, sets, second, bounds)
    elif singles:
        bounds.append("pairs were not searched: one repumper closes the cycle")
    return Search(leaks, tuple(sorted(singles, key=tried.rank)), tuple(sorted(sets, key=tried.rank)), tuple(bounds))


def _stays(item: Reached) -> bool:
    """Whether a state lives long enough for a repumper to act."""
    return item.fate == LOST or item.lifetime_s is None or item.lifetime_s > SHORTEST_S


def _pairs(
    singles: Sequence[Scheme], second: Sequence[Repumper], tried: "Tried", bounds: list[str]
) -> list[tuple[Repumper, ...]]:
    """List the pairs to try: of the best single ones, and of each with what empties the leaks that it opens."""
    ranked = [one.repumpers[0] for one in sorted(singles, key=tried.rank)]
    best = ranked[:MOST_PAIRED]
    pairs: list[tuple[Repumper, ...]] = []
    pairs += [(one, other) for k, one in enumerate(best) for other in best[k + 1 :] if _are_apart((one, other))]
    pairs += [(one, other) for one in best for other in second if _are_apart((one, other))]
    if len(ranked) > MOST_PAIRED:
        bounds.append(f"pairs were searched among the best {MOST_PAIRED} of {len(ranked)} repumpers")
    if len(pairs) > MOST_PAIRS:
        bounds.append(f"{MOST_PAIRS} of {len(pairs)} pairs were tried")
    return list({_keys(pair): pair for pair in pairs}.values())[:MOST_PAIRS]


def _are_apart(some: Sequence[Repumper]) -> bool:
    """Whether no state is pumped twice."""
    lows = [low for one in some for low, _ in one.pumped]
    return len(set(lows)) == len(lows)


def _keys(some: Iterable[Repumper]) -> frozenset[object]:
    """Return what tells one set of repumpers from another."""
    return frozenset(one.key for one in some)


def _grown(
    tried: "Tried", singles: Sequence[Scheme], pairs: Sequence[Scheme], second: Sequence[Repumper], bounds: list[str]
) -> list[Scheme]:
    """Grow larger sets: from the best pairs laser by laser, and from the best repumper of each leak at once."""
    ranked = [one.repumpers[0] for one in sorted(singles, key=tried.rank)]
    of_each = tuple({one.empties.name: one for one in reversed(ranked)}.values())
    found = tried.schemes([of_each]) if len(of_each) > 2 and _are_apart(of_each) else []
    done = {_keys(one.repumpers) for one in found}
    front = [one.repumpers for one in sorted(pairs, key=tried.rank)[:GROWN_FROM]]
    pool = [*ranked[:MOST_PAIRED], *second[:MOST_PAIRED]]
    for _size in range(3, MOST_LASERS + 1):
        larger = [(*some, one) for some in front for one in pool if _are_apart((*some, one))]
        schemes = tried.schemes(list({_keys(some): some for some in larger}.values()))
        found += [one for one in schemes if _keys(one.repumpers) not in done]
        done |= {_keys(one.repumpers) for one in schemes}
        front = [one.repumpers for one in sorted(schemes, key=tried.rank)[:1]]
        if any(one.is_closed for one in found) or not front:
            break
    bounds.append(f"sets of more than two, up to {MOST_LASERS}, were grown from the best, not all tried")
    return found


class Tried:
    """Tries sets of repumpers on one walk."""

    def __init__(self, walk: Walk, leaks: Leaks) -> None:
        self.walk, self.leaks = walk, leaks
        self.known = {item.position for item in leaks.reached}
        self.base = follow(walk, [()], worst=True)
        self.chance, self.paths = self._chance(), self._paths()
        self.cooling = leaks.walk.lasers[0].line

    def _chance(self) -> Array:
        """The chance of return from every stop under the present lasers, unknown branching at its worst."""
        walk, base = self.walk, self.base
        chance = np.where(walk.driven, 1.0, 0.0)
        free = ~walk.driven & ~walk.dark
        for _ in range(walk.stops.size):
            chance = np.where(free, base.moves[0] @ chance, chance)
        return chance

    def pumping(self, repumpers: Iterable[Repumper]) -> Pumping:
        """Which stops a set of repumpers empties and where one scattering leads from each."""
        walk = self.walk
        return [(walk.place(low), landing(walk, up)) for one in repumpers for low, up in one.pumped]

    def _opened(self, repumpers: Sequence[Repumper]) -> list[int]:
        """The dark stops that repumpers lead or may lead to and that the present lasers do not."""
        reach = np.zeros(self.walk.stops.size, dtype=np.bool_)
        for one in repumpers:
            for _, up in one.pumped:
                reach |= ((landing(self.walk, up) > NEGLIGIBLE) @ self.paths) > 0
        return [int(p) for p in np.flatnonzero(reach & self.walk.dark) if int(self.walk.stops[p]) not in self.known]

    def opened(self, repumpers: Sequence[Repumper]) -> list[int]:
        """The dark states that repumpers open."""
        return [int(self.walk.stops[p]) for p in self._opened(repumpers)]

    def _paths(self) -> Array:
        """Which stops decays may lead to from each, whatever unknown branching is; light is not followed."""
        walk = self.walk
        step = np.where((walk.driven | walk.dark)[:, None], 0.0, walk.moves > NEGLIGIBLE) + np.eye(walk.stops.size)
        for stop, options in walk.choices:
            step[stop] += options.max(axis=0) > NEGLIGIBLE
        for _ in range(4):  # sixteen decays in a row
            step = np.minimum(step @ step, 1.0)
        return step

    def schemes(self, some: Sequence[tuple[Repumper, ...]]) -> list[Scheme]:
        """Try each set of repumpers."""
        if not some:
            return []
        pumpings = [self.pumping(one) for one in some]
        low, high = follow(self.walk, pumpings, worst=True), follow(self.walk, pumpings, worst=False)
        return [self._scheme(one, k, pumpings[k], low, high) for k, one in enumerate(some)]

    def _scheme(self, repumpers: tuple[Repumper, ...], k: int, pumping: Pumping, low: Outcome, high: Outcome) -> Scheme:
        walk = self.walk
        photons = float(low.visits[k] @ walk.cooling)
        stops = [stop for stop, _ in pumping]
        pumped = float(low.visits[k, stops].sum())
        others = np.ones(walk.stops.size, dtype=np.bool_)
        others[stops] = False
        entered = float(low.visits[k, others] @ low.moves[k][others][:, stops].sum(axis=1))
        names = [str(walk.graph.states[walk.stops[p]]) for p in self._opened(repumpers) if p not in stops]
        return Scheme(
            repumpers,
            endless(float(low.photons[k])),
            endless(float(high.photons[k])),
            self._returning(pumping),
            pumped / photons,
            pumped / entered if entered > 0 else 0.0,
            tuple(names),
        )

    def _returning(self, pumping: Pumping) -> float:
        chances = []
        for _, row in pumping:
            away = row.copy()
            away[[stop for stop, _ in pumping]] = 0.0
            chances.append(float(away @ self.chance) / max(float(away.sum()), 1e-300))
        return min(chances, default=0.0)

    def rank(self, scheme: Scheme) -> tuple[object, ...]:
        """The order of schemes, best first."""
        lines = [one.line for one in scheme.repumpers]
        return (
            _level(scheme.photons),
            _level(scheme.most),
            len(lines),
            sum(not COMMON_NM[0] <= line.nominal_nm <= COMMON_NM[1] for line in lines),
            sum(line.multipole != "E1" for line in lines),
            -round(2 * float(np.log10(max(scheme.returning, 1e-9)))),
            sum(line.name != self.cooling.name for line in lines),
            round(scheme.per_leak, 3),
            [line.nominal_nm for line in lines],
            [one.components for one in scheme.repumpers],
        )


def _level(photons: float | None) -> float:
    """Return a number that falls with the photons and is the same for those that differ by rounding only."""
    return -1e9 if photons is None else -round(float(np.log(max(photons, 1e-300))) / SAME)
