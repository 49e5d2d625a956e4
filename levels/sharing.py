"""Wanted frequencies that come from one laser: the same lock light, and perhaps one modulator that all of them pass.

What they share is one number y, the light that the beat and the shared modulator add to the lock. Each member's own
chain leaves an interval for y; where intervals of all members meet, the point of the meeting that lies nearest to
centre is the nearest point of one of the intervals, so only those points need trying.
"""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from levels.assignment import WITHOUT, Variant, cheapest_by_mask
from levels.locks import Wanted
from levels.modulators import Chains, Modulator
from levels.reaching import Options, Setting, Source, options_of

Array = NDArray[np.float64]
Indices = NDArray[np.int64]
PER_ELEMENT = 1000.0
MOST_POINTS = 300
MOST_VARIANTS = 6


@dataclass(frozen=True, slots=True)
class Share:
    """Names of wanted frequencies that one laser serves, and the modulator that all pass first (empty for none)."""

    wanted: tuple[str, ...]
    modulator: str = ""


@dataclass(frozen=True, slots=True, eq=False)
class Shared:
    """A variant with the options of its members, to find the routes again."""

    variant: Variant
    options: tuple[Options, ...]


def costs_of(options: Options, extra: float = 0.0) -> Array:
    """Return what each option costs: elements first, then distance from centre, then little tuning range to spare."""
    beats = np.array([source.elements for source in options.sources], dtype=np.int64)
    elements = options.length + beats[options.source]
    cost: Array = PER_ELEMENT * elements + np.abs(options.share) + 1e-3 / (1.0 + options.spare_mhz) + extra
    return cost


def member_of(
    options: Options, forbidden: int = 0, only: NDArray[np.bool_] | None = None
) -> tuple[Indices, Array, Indices]:
    """Return masks, costs and numbers of the options that reach, the cheapest of each set of modulators."""
    good = (options.miss_mhz == 0) & ((options.mask & forbidden) == 0)
    if only is not None:
        good &= only
    numbers = np.flatnonzero(good)
    masks, costs = options.mask[numbers], costs_of(options)[numbers]
    kept = cheapest_by_mask(masks, costs)
    return masks[kept], costs[kept], numbers[kept]


def shared_variants(
    members: Sequence[Wanted],
    sources: Sequence[Source],
    chains: Chains,
    modulators: Sequence[Modulator],
    common: int | None,
    tolerance_mhz: float,
) -> tuple[list[Shared], bool]:
    """Find the best common sources for all members; the flag says whether some were not tried."""
    forbidden = 0 if common is None else 1 << common
    usable = (chains.mask & forbidden) == 0
    fixed: list[Source] = []
    cut = False
    for source in sources:
        for order in (None,) if common is None else modulators[common].orders:
            points, more = _points(members, source, chains, usable, modulators, common, order)
            cut |= more
            fixed += [_fixed(source, modulators, common, order, y, tooth) for y, tooth in points]
    found = [_tried(members, one, chains, forbidden, tolerance_mhz, common) for one in fixed]
    found.sort(key=lambda item: item[0])
    return [shared for _, shared in found[:MOST_VARIANTS]], cut or len(found) > MOST_VARIANTS


def _range(
    source: Source, modulators: Sequence[Modulator], common: int | None, order: int | None
) -> tuple[float, float]:
    """Return centre and half range of y."""
    centre, half = source.beat_centre_mhz, source.beat_half_mhz
    if common is not None and order is not None:
        one = modulators[common]
        c = _coefficient(one, order)
        centre, half = centre + c * one.centre_mhz, half + abs(c) * one.half_mhz
    return centre, half


def _coefficient(one: Modulator, order: int) -> float:
    return order * one.passes * (-1.0 if one.place == "lock" else 1.0)


def _points(
    members: Sequence[Wanted],
    source: Source,
    chains: Chains,
    usable: NDArray[np.bool_],
    modulators: Sequence[Modulator],
    common: int | None,
    order: int | None,
) -> tuple[list[tuple[float, int]], bool]:
    """List the (y, comb line) worth trying, the nearest to centre first."""
    centre, half = _range(source, modulators, common, order)
    found: list[NDArray[np.float64]] = []
    for one in members:
        M, sums, reach = chains.multiplier[usable], chains.centre[usable], chains.reach[usable]
        middle = (one.point.frequency_mhz - sums) / M - source.frequency_mhz
        wide = reach / np.abs(M)
        tooth = np.zeros(M.size)
        if source.spacing_mhz:
            last = source.lock.last_tooth
            tooth = np.clip(np.rint((middle - centre) / source.spacing_mhz), -last, last)
        y = np.clip(centre, middle - tooth * source.spacing_mhz - wide, middle - tooth * source.spacing_mhz + wide)
        inside = np.abs(y - centre) <= half + 1e-12
        found.append(np.array([np.clip(y[inside], centre - half, centre + half), tooth[inside]]).T)
    points = np.unique(np.concatenate(found).round(9), axis=0) if found else np.zeros((0, 2))
    nearest = points[np.argsort(np.abs(points[:, 0] - centre), kind="stable")]
    return [(float(y), int(tooth)) for y, tooth in nearest[:MOST_POINTS]], len(points) > MOST_POINTS


def _fixed(
    source: Source, modulators: Sequence[Modulator], common: int | None, order: int | None, y: float, tooth: int
) -> Source:
    """Make the source with y and the comb line settled: beat and modulator at the same share of their ranges."""
    centre, half = _range(source, modulators, common, order)
    share = (y - centre) / half if half else 0.0
    beat = source.beat_centre_mhz + share * source.beat_half_mhz
    light = source.frequency_mhz + tooth * source.spacing_mhz + beat
    shared: tuple[Setting, ...] = ()
    if common is not None and order is not None:
        one = modulators[common]
        c = _coefficient(one, order)
        radio = one.centre_mhz + float(np.sign(c)) * share * one.half_mhz
        if one.step_mhz:
            radio = min(max(round(radio / one.step_mhz) * one.step_mhz, one.low_mhz), one.high_mhz)
        light += c * radio
        shared = (Setting(one, order, radio, light),)
    return Source(source.lock, source.point, light, tooth=tooth, beat_mhz=beat, shared=shared)


def _tried(
    members: Sequence[Wanted], source: Source, chains: Chains, forbidden: int, tolerance_mhz: float, common: int | None
) -> tuple[float, Shared]:
    """Return what a common source costs when each member takes its cheapest option, and the variant."""
    options = tuple(options_of(one, [source], chains, tolerance_mhz) for one in members)
    parts = tuple(member_of(one, forbidden) for one in options)
    total = sum(float(costs.min()) if costs.size else WITHOUT for _, costs, _ in parts)
    own = PER_ELEMENT * (common is not None)
    return total + own, Shared(Variant(forbidden, own, parts), options)
