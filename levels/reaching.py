"""Which chains reach a wanted frequency from a lock, and the settings that do it.

All elements of a chain run at the same share t of their half ranges from centre, t = (gap - sum c_j centre_j) /
sum |c_j| half_j: this hits the frequency exactly whenever any settings do (|t| <= 1), keeps the largest excursion as
small as can be, and leaves (1 - |t|) of the chain's tuning range to spare on the nearer side. A beat at the lock is one
more element.
"""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from levels.locks import Lock, Point, Wanted
from levels.modulators import Chains, Element, Modulator, after

Array = NDArray[np.float64]
Indices = NDArray[np.int64]


@dataclass(frozen=True, slots=True)
class Setting:
    """One element set: its radio frequency and the light after it, in MHz."""

    modulator: Modulator
    order: int
    rf_mhz: float
    light_mhz: float


@dataclass(frozen=True, slots=True, eq=False)
class Source:
    """A lock as chains start from it: its frequency, spacing, and one sign of the beat it adds.

    A source that several wanted frequencies share is fixed: `tooth`, `beat_mhz` and `shared` (an element that all of
    them pass first) are then part of its frequency.
    """

    lock: Lock
    point: Point
    frequency_mhz: float
    spacing_mhz: float = 0.0
    beat_centre_mhz: float = 0.0
    beat_half_mhz: float = 0.0
    tooth: int = 0
    beat_mhz: float = 0.0
    shared: tuple[Setting, ...] = ()

    @property
    def elements(self) -> int:
        """How many elements it counts for: one where it adds a beat."""
        return int(self.lock.beat_mhz is not None)


@dataclass(frozen=True, slots=True, eq=False)
class Options:
    """All (source, chain) pairs for one wanted frequency, flattened: shape (s n,). `miss_mhz` is zero where it reaches.

    `share` is t, signed; `tooth` counts comb lines from the lock's own frequency.
    """

    wanted: Wanted
    sources: tuple[Source, ...]
    chains: Chains
    source: Indices
    chain: Indices
    tooth: Indices
    share: Array
    miss_mhz: Array
    spare_mhz: Array

    @property
    def length(self) -> Indices:
        """How many elements each takes."""
        return self.chains.length[self.chain]

    @property
    def mask(self) -> Indices:
        """Which modulators each takes, a bit for each."""
        return self.chains.mask[self.chain]


@dataclass(frozen=True, slots=True, eq=False)
class Route:
    """How one wanted frequency is made. `lock_light_mhz` is the light at the lock, comb line and beat included.

    `laser_mhz` is where the laser runs: after the elements placed at the lock. `gap_mhz` is what all elements make,
    `residual_mhz` the light less what was wanted.
    """

    wanted: Wanted
    source: Source
    tooth: int
    beat_mhz: float
    lock_light_mhz: float
    laser_mhz: float
    settings: tuple[Setting, ...]
    multiplier: float
    share: float
    spare_mhz: float
    residual_mhz: float
    miss_mhz: float


def sources_of(locks: Sequence[Lock], points: dict[str, Point]) -> list[Source]:
    """List what chains may start from: each lock, with either sign of its beat."""
    found = []
    for lock in locks:
        point = points[lock.name]
        spacing = lock.spacing_mhz or 0.0
        if lock.beat_mhz is None:
            found.append(Source(lock, point, point.frequency_mhz, spacing, 0.0, 0.0))
            continue
        low, high = lock.beat_mhz
        for sign in (1.0, -1.0):
            found.append(Source(lock, point, point.frequency_mhz, spacing, sign * (low + high) / 2, (high - low) / 2))
    return found


def options_of(wanted: Wanted, sources: Sequence[Source], chains: Chains, tolerance_mhz: float) -> Options:
    """Try every chain from every source."""
    M, count = chains.multiplier, chains.multiplier.size
    nothing = (np.zeros(0, dtype=np.int64), np.zeros(0), np.zeros(0), np.zeros(0))
    parts = [nothing, *(_from_source(wanted, source, chains, tolerance_mhz) for source in sources)]
    tooth, share, miss, spare = (np.concatenate(column) for column in zip(*parts, strict=True))
    return Options(
        wanted,
        tuple(sources),
        chains,
        np.repeat(np.arange(len(sources)), count),
        np.tile(np.arange(M.size), len(sources)),
        tooth,
        share,
        miss,
        spare,
    )


def _from_source(
    wanted: Wanted, source: Source, chains: Chains, tolerance_mhz: float
) -> tuple[Indices, Array, Array, Array]:
    M = chains.multiplier
    gap = wanted.point.frequency_mhz - M * source.frequency_mhz - M * source.beat_centre_mhz - chains.centre
    reach = chains.reach + np.abs(M) * source.beat_half_mhz
    tooth = np.zeros(M.size, dtype=np.int64)
    if source.spacing_mhz:
        last = source.lock.last_tooth
        tooth = np.clip(np.rint(gap / (M * source.spacing_mhz)), -last, last).astype(np.int64)
        gap = gap - tooth * M * source.spacing_mhz
    outside = np.abs(gap) - reach
    miss = np.where(outside > tolerance_mhz, outside, 0.0)
    share = np.where(reach > 0, gap / np.where(reach > 0, reach, 1.0), 0.0)
    spare = np.maximum(reach - np.abs(gap), 0.0)
    return tooth, np.clip(share, -1.0, 1.0), miss, spare


def route(wanted: Wanted, options: Options, at: int, modulators: Sequence[Modulator]) -> Route:
    """Work out the settings of one option."""
    source, chain = options.sources[options.source[at]], int(options.chain[at])
    elements = options.chains.elements[chain]
    coefficients, share = options.chains.coefficients[chain], float(options.share[at])
    multiplier = float(options.chains.multiplier[chain])
    beat = source.beat_centre_mhz + np.sign(multiplier) * share * source.beat_half_mhz
    start = source.frequency_mhz + int(options.tooth[at]) * source.spacing_mhz + float(beat)
    lock_light = source.shared[0].light_mhz - _shift(source.shared) if source.shared else start
    radio = {
        part.modulator: modulators[part.modulator].centre_mhz
        + float(np.sign(coefficients[part.modulator])) * share * modulators[part.modulator].half_mhz
        for part in elements
    }
    _to_steps(radio, coefficients, modulators)
    settings = (*source.shared, *_settings(elements, radio, start, modulators))
    laser = next((s.light_mhz for s in reversed(settings) if s.modulator.place == "lock"), lock_light)
    light = settings[-1].light_mhz if settings else start
    return Route(
        wanted,
        source,
        source.tooth + int(options.tooth[at]),
        source.beat_mhz + float(beat),
        lock_light,
        laser,
        settings,
        multiplier,
        share,
        float(options.spare_mhz[at]),
        light - wanted.point.frequency_mhz,
        float(options.miss_mhz[at]),
    )


def _shift(shared: Sequence[Setting]) -> float:
    """Return what shared elements add to the lock's light."""
    return sum(after(one.modulator, one.order, one.rf_mhz, 0.0) for one in shared)


def _to_steps(radio: dict[int, float], coefficients: Array, modulators: Sequence[Modulator]) -> None:
    """Round to the synthesisers' steps, coarse ones first; each finer one makes up for what was rounded before."""
    owed = 0.0
    for k in sorted(radio, key=lambda k: -abs(coefficients[k]) * modulators[k].step_mhz):
        one = modulators[k]
        if (not one.step_mhz and not owed) or coefficients[k] == 0:
            continue
        exact = radio[k] + owed / coefficients[k]
        near = round(exact / one.step_mhz) * one.step_mhz if one.step_mhz else exact
        if one.step_mhz:
            lowest, highest = np.ceil(one.low_mhz / one.step_mhz), np.floor(one.high_mhz / one.step_mhz)
            near = float(min(max(near, lowest * one.step_mhz), highest * one.step_mhz))
        near = min(max(near, one.low_mhz), one.high_mhz)
        owed += coefficients[k] * (radio[k] - near)
        radio[k] = near


def _settings(
    elements: tuple[Element, ...], radio: dict[int, float], light_mhz: float, modulators: Sequence[Modulator]
) -> tuple[Setting, ...]:
    settings = []
    for part in elements:
        one = modulators[part.modulator]
        light_mhz = after(one, part.order, radio[part.modulator], light_mhz)
        settings.append(Setting(one, part.order, radio[part.modulator], light_mhz))
    return tuple(settings)
