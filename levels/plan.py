"""A frequency plan: for every wanted laser frequency a lock point and modulator settings, no modulator used twice.

Every chain of up to the stated length is tried from every lock for every wanted frequency, and the assignment is the
cheapest of all: first as many frequencies as can be reached, then the fewest elements, then the least distance from
the centre of the ranges. Frequencies asked to share a laser, or a modulator as well, are served together; there only
the most promising common settings are compared, which is said. A beat may be taken with a wanted frequency that stands
before. Nothing here drives hardware: the numbers are for people to set.
"""

from collections.abc import Sequence
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from levels.assignment import Variant, assign
from levels.errors import OutsideValidity, UnknownName
from levels.locks import BEAT, Lock, Point, Wanted, resolved
from levels.modulators import Chains, Modulator, chains_of
from levels.reaching import Options, Route, Source, options_of, route, sources_of
from levels.sharing import Share, Shared, costs_of, member_of, shared_variants

Array = NDArray[np.float64]
Indices = NDArray[np.int64]

MOST_WANTED, MOST_LOCKS, MOST_MODULATORS, LONGEST_CHAIN = 12, 8, 14, 4
MOST_TRIALS = 6_000_000
Structure = tuple[str, tuple[tuple[str, int], ...]]  # lock, then (modulator, order) from lock to atoms


@dataclass(frozen=True, slots=True, eq=False)
class Order:
    """What a plan is asked for. `keep` holds the structures of an earlier plan, which stay where they still reach."""

    wanted: tuple[Wanted, ...]
    locks: tuple[Lock, ...]
    modulators: tuple[Modulator, ...]
    longest: int = 2
    tolerance_mhz: float = 1e-3
    shares: tuple[Share, ...] = ()
    alternatives: int = 3
    keep: dict[str, Structure] = field(default_factory=dict)


@dataclass(frozen=True, slots=True, eq=False)
class Served:
    """What one wanted frequency got: its route (None if none is left), the next ones, and the nearest miss.

    `others` do not heed which modulators the rest of the plan uses.
    """

    wanted: Wanted
    route: Route | None
    others: tuple[Route, ...]
    nearest: Route | None
    reachable: bool


@dataclass(frozen=True, slots=True, eq=False)
class Plan:
    """The whole plan, and how far it was searched."""

    order: Order
    served: tuple[Served, ...]
    points: dict[str, Point]
    tried: int
    bounds: tuple[str, ...]

    @property
    def is_exhaustive(self) -> bool:
        """Whether every chain within the stated bounds was compared."""
        return not self.bounds


def check_order(order: Order) -> None:
    """Refuse a plan beyond the bounds, or one whose names do not fit together."""
    for name, count, most in (
        ("wanted", len(order.wanted), MOST_WANTED),
        ("locks", len(order.locks), MOST_LOCKS),
    ):
        if not 1 <= count <= most:
            raise OutsideValidity(name, count, f"from 1 to {most}")
    if len(order.modulators) > MOST_MODULATORS:
        raise OutsideValidity("modulators", len(order.modulators), f"at most {MOST_MODULATORS}")
    if not 0 <= order.longest <= LONGEST_CHAIN:
        raise OutsideValidity("max_chain", order.longest, f"from 0 to {LONGEST_CHAIN}")
    for kind, names in (
        ("wanted", [one.name for one in order.wanted]),
        ("locks", [one.name for one in order.locks]),
        ("modulators", [one.name for one in order.modulators]),
    ):
        twice = next((name for name in names if names.count(name) > 1), None)
        if twice is not None:
            raise OutsideValidity(kind, twice, "names that differ")
    locks = [one.name for one in order.locks]
    for one in order.wanted:
        for name in one.locks:
            if name not in locks:
                raise UnknownName("lock", name, locks, f"asked for by {one.name}")
    _check_shares(order)


def _check_shares(order: Order) -> None:
    wanted = [one.name for one in order.wanted]
    modulators = [one.name for one in order.modulators]
    seen: set[str] = set()
    for share in order.shares:
        for name in share.wanted:
            if name not in wanted:
                raise UnknownName("wanted", name, wanted, "named in share")
            if name in seen:
                raise OutsideValidity("share", name, "each wanted frequency in at most one share")
            seen.add(name)
        if len(share.wanted) < 2:
            raise OutsideValidity("share", list(share.wanted), "at least two wanted frequencies")
        if share.modulator and share.modulator not in modulators:
            raise UnknownName("modulator", share.modulator, modulators, "named in share")
        if share.modulator and order.modulators[modulators.index(share.modulator)].factor > 1:
            raise OutsideValidity("share", share.modulator, "a modulator that shifts; harmonic stages are not shared")


def plan(order: Order) -> Plan:
    """Find the cheapest plan."""
    check_order(order)
    points = resolved(order.locks, order.wanted)
    sources = sources_of(order.locks, points)
    chains = chains_of(order.modulators, order.longest, max(1, MOST_TRIALS // (len(order.wanted) * len(sources))))
    bounds = [chains.cut] if chains.cut else []
    options = [options_of(one, _allowed(order, one, sources), chains, order.tolerance_mhz) for one in order.wanted]
    banned: set[tuple[str, str]] = set()
    while True:
        routes, cut = _assigned(order, sources, chains, options, banned)
        loose = _loose(routes)
        if loose <= banned:
            break
        banned |= loose
    if cut:
        bounds.append("of the common settings of shared lasers only the most promising were compared")
    served = tuple(_served(order, k, one, routes) for k, one in enumerate(options))
    return Plan(order, served, points, sum(int(one.miss_mhz.size) for one in options), tuple(bounds))


def _allowed(order: Order, wanted: Wanted, sources: Sequence[Source]) -> list[Source]:
    """List the sources that a wanted frequency may use: its own locks, and beats with frequencies that stand before."""
    names = [one.name for one in order.wanted]
    before = names[: names.index(wanted.name)]
    later = [name for name in names if name not in before]
    return [
        source
        for source in sources
        if (not wanted.locks or source.lock.name in wanted.locks) and source.lock.partner not in later
    ]


def _loose(routes: dict[str, Route | None]) -> set[tuple[str, str]]:
    """Find the beats with a wanted frequency that is itself not reached."""
    found = set()
    for name, one in routes.items():
        if one is not None and one.source.lock.kind == BEAT and routes.get(one.source.lock.partner, one) is None:
            found.add((name, one.source.lock.name))
    return found


def _assigned(
    order: Order, sources: Sequence[Source], chains: Chains, options: Sequence[Options], banned: set[tuple[str, str]]
) -> tuple[dict[str, Route | None], bool]:
    """Serve all wanted frequencies together."""
    at = {one.name: k for k, one in enumerate(order.wanted)}
    names = [one.name for one in order.modulators]
    groups = [tuple(at[name] for name in share.wanted) for share in order.shares]
    alone = [k for k in range(len(order.wanted)) if not any(k in group for group in groups)]
    items: list[list[Variant]] = []
    shared: list[list[Shared]] = []
    cut = False
    for share, group in zip(order.shares, groups, strict=True):
        common = names.index(share.modulator) if share.modulator else None
        members = [order.wanted[k] for k in group]
        own = [source for source in sources if all(source in _allowed(order, one, sources) for one in members)]
        found, more = shared_variants(members, own, chains, order.modulators, common, order.tolerance_mhz)
        cut |= more
        nothing = Variant(0, 0.0, tuple(_nothing() for _ in group))
        items.append([*(one.variant for one in found), nothing])
        shared.append(found)
    items += [[Variant(0, 0.0, (_member(order, options[k], banned),))] for k in alone]
    choices = assign(items, len(order.modulators))
    routes: dict[str, Route | None] = {}
    for found, group, choice in zip(shared, groups, choices, strict=False):
        for place, k in enumerate(group):
            number = choice.options[place]
            known = number >= 0 and choice.variant < len(found)
            picked = found[choice.variant].options[place] if known else None
            routes[order.wanted[k].name] = route(order.wanted[k], picked, number, order.modulators) if picked else None
    for k, choice in zip(alone, choices[len(groups) :], strict=True):
        number = choice.options[0]
        wanted = order.wanted[k]
        routes[wanted.name] = route(wanted, options[k], number, order.modulators) if number >= 0 else None
    return routes, cut


def _nothing() -> tuple[Indices, Array, Indices]:
    return np.zeros(0, dtype=np.int64), np.zeros(0), np.zeros(0, dtype=np.int64)


def _member(order: Order, options: Options, banned: set[tuple[str, str]]) -> tuple[Indices, Array, Indices]:
    """List the options of one wanted frequency: those of its earlier structure while that reaches, else all."""
    usable = _usable(options, {lock for name, lock in banned if name == options.wanted.name})
    kept = usable & of_structure(options, order.modulators, order.keep.get(options.wanted.name))
    return member_of(options, only=kept if (kept & (options.miss_mhz == 0)).any() else usable)


def _usable(options: Options, banned: set[str]) -> NDArray[np.bool_]:
    good = np.array([source.lock.name not in banned for source in options.sources], dtype=np.bool_)
    result: NDArray[np.bool_] = good[options.source]
    return result


def of_structure(options: Options, modulators: Sequence[Modulator], wanted: Structure | None) -> NDArray[np.bool_]:
    """Mark the options with one lock and one chain of modulators and orders."""
    if wanted is None:
        return np.zeros(options.source.size, dtype=np.bool_)
    lock, chain = wanted
    by_lock = np.array([source.lock.name == lock for source in options.sources], dtype=np.bool_)
    names = [tuple((modulators[part.modulator].name, part.order) for part in one) for one in options.chains.elements]
    by_chain = np.array([one == chain for one in names], dtype=np.bool_)
    result: NDArray[np.bool_] = by_lock[options.source] & by_chain[options.chain]
    return result


def structure_of(one: Route) -> Structure:
    """Return what stays when frequencies move: the lock and the chain with its orders."""
    return one.source.lock.name, tuple((setting.modulator.name, setting.order) for setting in one.settings)


def _served(order: Order, k: int, options: Options, routes: dict[str, Route | None]) -> Served:
    wanted = order.wanted[k]
    chosen = routes[wanted.name]
    reached = np.flatnonzero(options.miss_mhz == 0)
    ranked = reached[np.argsort(costs_of(options)[reached], kind="stable")]
    others: list[Route] = []
    for number in ranked[: order.alternatives + 1]:
        one = route(wanted, options, int(number), order.modulators)
        if chosen is None or structure_of(one) != structure_of(chosen):
            others.append(one)
    nearest = None
    if not reached.size and options.miss_mhz.size:
        nearest = route(wanted, options, int(np.argmin(options.miss_mhz)), order.modulators)
    return Served(wanted, chosen, tuple(others[: order.alternatives]), nearest, bool(reached.size))
