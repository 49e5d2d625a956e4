"""What stands between a lock point and the atoms, and every chain that can be made of it.

Light of frequency f leaves an acousto-optic or electro-optic modulator at f + c x, with x its radio frequency and c the
diffraction order times the passes, or the sideband order; a harmonic stage turns f into n f. A modulator placed "lock"
sits between laser and lock point, so the laser runs at f - c x, or at f/n. Elements are listed from lock to atoms; a
whole chain is f = M f_lock + sum of c_j x_j, where every multiplication scales what came before it.
"""

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from itertools import combinations, permutations, product

import numpy as np
from numpy.typing import NDArray

from levels.errors import OutsideValidity

Array = NDArray[np.float64]
Indices = NDArray[np.int64]
ACOUSTO, ELECTRO, HARMONIC = "acousto-optic", "electro-optic", "harmonic"
KINDS = (ACOUSTO, ELECTRO, HARMONIC)
PLACES = ("atoms", "lock")
LARGEST_RF_MHZ = 1e6
MOST_CHAINS = 60_000


@dataclass(frozen=True, slots=True)
class Modulator:
    """One device: radio frequencies from `low_mhz` to `high_mhz`, signed orders, passes; `factor` of a harmonic stage.

    `step_mhz` is the resolution of its synthesiser, zero for none.
    """

    name: str
    kind: str
    low_mhz: float = 0.0
    high_mhz: float = 0.0
    orders: tuple[int, ...] = (1, -1)
    passes: int = 1
    factor: int = 1
    step_mhz: float = 0.0
    place: str = "atoms"

    @property
    def centre_mhz(self) -> float:
        """The middle of its range."""
        return (self.low_mhz + self.high_mhz) / 2

    @property
    def half_mhz(self) -> float:
        """Half of its range."""
        return (self.high_mhz - self.low_mhz) / 2


@dataclass(frozen=True, slots=True)
class Element:
    """A modulator in a chain, at one order (1 for a harmonic stage)."""

    modulator: int
    order: int


@dataclass(frozen=True, slots=True, eq=False)
class Chains:
    """Every chain, the empty one first; `coefficients` (n, modulators) are light per radio frequency, in MHz/MHz.

    `centre` and `reach` are the sums over a chain of c_j times the centre, and of |c_j| times half the range. `mask`
    has a bit for each modulator used.
    """

    elements: tuple[tuple[Element, ...], ...]
    multiplier: Array
    coefficients: Array
    centre: Array
    reach: Array
    mask: Indices
    length: Indices
    cut: str


def check_modulator(one: Modulator) -> Modulator:
    """Refuse a modulator that cannot be, naming the member and what would do."""
    named = f"modulator {one.name}"
    if one.kind not in KINDS:
        raise OutsideValidity(f"{named} kind", one.kind, f"one of {', '.join(KINDS)}")
    if one.place not in PLACES:
        raise OutsideValidity(f"{named} place", one.place, f"one of {', '.join(PLACES)}")
    if one.kind == HARMONIC:
        if not 2 <= one.factor <= 8:
            raise OutsideValidity(f"{named} factor", one.factor, "the harmonic, from 2 (doubling) to 8")
        return one
    if not 0 < one.low_mhz <= one.high_mhz <= LARGEST_RF_MHZ:
        allowed = f"0 < low <= high <= {LARGEST_RF_MHZ:g} MHz"
        raise OutsideValidity(f"{named} range", f"{one.low_mhz:g} to {one.high_mhz:g} MHz", allowed)
    if one.passes not in ((1, 2) if one.kind == ACOUSTO else (1,)):
        raise OutsideValidity(f"{named} passes", one.passes, "1 or 2 of an acousto-optic modulator, else 1")
    if not one.orders or len(set(one.orders)) < len(one.orders) or any(not 1 <= abs(k) <= 10 for k in one.orders):
        raise OutsideValidity(f"{named} orders", list(one.orders), "different signed orders such as 1 and -1, up to 10")
    if not 0 <= one.step_mhz <= 1:
        raise OutsideValidity(f"{named} step", one.step_mhz, "from 0 to 1 MHz")
    return one


def chains_of(modulators: Sequence[Modulator], longest: int, most: int = MOST_CHAINS) -> Chains:
    """List every chain of up to `longest` elements; longer lengths than `most` chains allow are cut, which is said."""
    elements: list[tuple[Element, ...]] = [()]
    rows: list[tuple[float, list[float]]] = [(1.0, [0.0] * len(modulators))]
    cut = ""
    for length in range(1, min(longest, len(modulators)) + 1):
        found = []
        for chain in _chains(modulators, length):
            found.append(chain)
            if len(elements) + len(found) > most:
                break
        if len(elements) + len(found) > most:
            cut = f"chains of {length} elements or more are not searched: there are more than {most}"
            break
        elements += found
        rows += [_affine(modulators, chain) for chain in found]
    multiplier = np.array([row[0] for row in rows])
    coefficients = np.array([row[1] for row in rows]).reshape(len(rows), len(modulators))
    centre = coefficients @ np.array([one.centre_mhz for one in modulators])
    reach = np.abs(coefficients) @ np.array([one.half_mhz for one in modulators])
    mask = np.array([sum(1 << part.modulator for part in chain) for chain in elements], dtype=np.int64)
    length_of = np.array([len(chain) for chain in elements], dtype=np.int64)
    return Chains(tuple(elements), multiplier, coefficients, centre, reach, mask, length_of, cut)


def _chains(modulators: Sequence[Modulator], length: int) -> Iterator[tuple[Element, ...]]:
    for some in combinations(range(len(modulators)), length):
        by_lock = [k for k in some if modulators[k].place == "lock"]
        by_atoms = [k for k in some if modulators[k].place == "atoms"]
        seen = set()
        for arrangement in product(_arranged(modulators, by_lock), _arranged(modulators, by_atoms)):
            order = (*arrangement[0], *arrangement[1])
            for orders in product(*(_orders(modulators[k]) for k in order)):
                chain = tuple(Element(k, one) for k, one in zip(order, orders, strict=True))
                multiplier, coefficients = _affine(modulators, chain)
                key = (multiplier, tuple(coefficients))
                if key not in seen:
                    seen.add(key)
                    yield chain


def _orders(one: Modulator) -> tuple[int, ...]:
    return (1,) if one.kind == HARMONIC else one.orders


def _arranged(modulators: Sequence[Modulator], some: Sequence[int]) -> Iterator[tuple[int, ...]]:
    """Give the orders that matter: frequency shifts commute, harmonic stages do not."""
    if any(modulators[k].kind == HARMONIC for k in some):
        yield from permutations(some)
    else:
        yield tuple(some)


def _affine(modulators: Sequence[Modulator], chain: Sequence[Element]) -> tuple[float, list[float]]:
    """Return M and the c_j of a chain, in the order of the modulators."""
    multiplier, coefficients = 1.0, [0.0] * len(modulators)
    for part in chain:
        one = modulators[part.modulator]
        sign = -1.0 if one.place == "lock" else 1.0
        if one.kind == HARMONIC:
            scale = float(one.factor) ** sign
            multiplier *= scale
            coefficients = [c * scale for c in coefficients]
        else:
            coefficients[part.modulator] = sign * part.order * one.passes
    return multiplier, coefficients


def after(one: Modulator, order: int, rf_mhz: float, light_mhz: float) -> float:
    """Return the light after one element, going from lock to atoms.

    >>> after(Modulator("a", ACOUSTO, 70, 90, passes=2), -1, 80.0, 1000.0)
    840.0
    """
    sign = -1.0 if one.place == "lock" else 1.0
    if one.kind == HARMONIC:
        return light_mhz * one.factor if sign > 0 else light_mhz / one.factor
    return light_mhz + sign * order * one.passes * rf_mhz
