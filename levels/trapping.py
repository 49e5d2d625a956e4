"""Magnetic trapping: which sublevels a field minimum holds, how deep, and what takes single atoms out.

A sublevel is drawn to weak field where its energy rises with the field. It is followed along the magnitude of the field
from the bottom of the trap up: from where it first seeks weak field to the field where it turns, or to the largest
field that is asked for; the depth is the energy between. Spins follow the direction of the field: that holds while the
Larmor frequency is far above the trap's frequencies. Gravity is not part of the depth.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.constants import g as STANDARD_GRAVITY

from levels.constants import KB, M_E_U, MU_B_MHZ_PER_GAUSS, H
from levels.errors import OutsideValidity
from levels.insensitive import field_grid, roots
from levels.notation import format_sublevel
from levels.quantity import in_unit
from levels.records import Isotope, Level
from levels.sensitivity import ENERGY, SLOPE, Movement, Spread, movement, spread, terms_of
from levels.sublevels import (
    LARGEST_FIELD_GAUSS,
    Constants,
    Eigen,
    constants_of,
    labels_of,
    solve_block,
    sublevels,
)

Array = NDArray[np.float64]
Label = tuple[int, int]
MHZ_PER_MICROKELVIN = KB * 1e-12 / H
STILL = 1e-9  # MHz/G: a slope below it is rounding


@dataclass(frozen=True, slots=True, eq=False)
class Knife:
    """The radio frequency that takes atoms out at the asked depth: where, at what frequency, to which sublevel.

    `bottom_mhz` is the same splitting where the atoms are coldest.
    """

    to: Label
    field_gauss: float
    frequency_mhz: float
    frequency_uncertainty_mhz: float
    bottom_mhz: float


@dataclass(frozen=True, slots=True, eq=False)
class Trapped:
    """One sublevel in the trap; uncertainties are NaN where a constant without one could outweigh the rest.

    `from_gauss` is where it begins to seek weak field (None: nowhere), `turning_gauss` where it turns (None: not up to
    the largest field). `knife` is None where there is no such depth or no neighbour; `no_knife` says why.
    """

    label: Label
    slope_mhz_per_gauss: float
    slope_uncertainty_mhz_per_gauss: float
    from_gauss: float | None
    turning_gauss: float | None
    turning_uncertainty_gauss: float
    depth_mhz: float | None
    depth_uncertainty_mhz: float
    levitation_gauss_per_cm: float | None
    knife: Knife | None
    no_knife: str
    excludes: tuple[str, ...]

    @property
    def moment_mu_b(self) -> float:
        """Magnetic moment along the field at the bottom, in Bohr magnetons."""
        return -self.slope_mhz_per_gauss / MU_B_MHZ_PER_GAUSS

    @property
    def seeks(self) -> str:
        """What the sublevel seeks at the bottom of the trap."""
        if self.slope_mhz_per_gauss < 0.0:
            return "strong field"
        return "neither" if self.from_gauss is None else "weak field"


@dataclass(frozen=True, slots=True)
class Loss:
    """A way in which single atoms leave: when it acts, and its rate in s-1 where the catalogue has one."""

    channel: str
    acts: str
    rate_per_s: float | None


def trapping(
    isotope: Isotope,
    level: Level,
    bottom_gauss: float = 0.0,
    largest_gauss: float = 2000.0,
    depth_microkelvin: float | None = None,
) -> list[Trapped]:
    """Work out every sublevel of a level in a trap whose field runs from its bottom to a largest value."""
    if not 0 <= bottom_gauss < largest_gauss <= LARGEST_FIELD_GAUSS:
        allowed = f"the bottom from 0 G, the largest field above it, up to {LARGEST_FIELD_GAUSS:g} G"
        raise OutsideValidity("max_field", f"{bottom_gauss:g} to {largest_gauss:g} G", allowed)
    constants = constants_of(level)
    labels = labels_of(constants)
    grid = bottom_gauss + field_grid(constants, largest_gauss - bottom_gauss)
    solved = sublevels(level, grid)
    turning = _turning_points(constants, labels, grid, solved.slope_mhz_per_gauss, solved.quadratic_hz_per_gauss2)
    rising = solved.slope_mhz_per_gauss[1] > STILL
    return [
        _trapped(isotope, level, constants, label, _interval(fields, bool(up), bottom_gauss), grid, depth_microkelvin)
        for label, fields, up in zip(labels, turning, rising, strict=True)
    ]


def _turning_points(
    constants: Constants, labels: list[Label], grid: Array, slopes: Array, quadratics: Array
) -> list[list[float]]:
    """Find the fields above the bottom at which each sublevel's slope changes sign."""

    def numbers(column: NDArray[np.int64], field: Array) -> tuple[Array, Array]:
        result = np.empty((2, field.size))
        for twice_m in {labels[c][1] for c in column}:
            rows = [k for k, c in enumerate(column) if labels[c][1] == twice_m]
            eigen = solve_block(constants, twice_m, field[rows])
            at = np.arange(len(rows)), [eigen.twice_F.index(labels[column[k]][0]) for k in rows]
            result[0, rows] = eigen.slope_mhz_per_gauss()[at]
            result[1, rows] = 2 * eigen.quadratic_mhz_per_gauss2()[at]
        return result[0], result[1]

    slopes = np.where(np.abs(slopes) <= STILL, 0.0, slopes)
    moving = np.abs(slopes).max(axis=0) > 0
    first = np.where(slopes[0] == 0.0, slopes[1], slopes[0])  # what starts flat turns elsewhere
    values = np.concatenate([first[None], slopes[1:]])[:, moving]
    places = np.nonzero(moving)[0]
    found: list[list[float]] = [[] for _ in labels]
    if places.size:
        columns, fields = roots(lambda c, b: numbers(places[c], b), grid, values, 2e-6 * quadratics[:, moving])
        for column, field in zip(places[columns], fields, strict=True):
            if field > grid[0]:
                found[column].append(float(field))
    return [sorted(fields) for fields in found]


def _interval(turning: list[float], rising: bool, bottom: float) -> tuple[float | None, float | None]:
    """Return where a sublevel first seeks weak field and where it turns then."""
    if rising:
        return bottom, turning[0] if turning else None
    if not turning:
        return None, None
    return turning[0], turning[1] if len(turning) > 1 else None


def _solve(constants: Constants, label: Label, field: float) -> tuple[Eigen, int, Array]:
    fields = np.array([field])
    eigen = solve_block(constants, label[1], fields)
    return eigen, eigen.twice_F.index(label[0]), fields


def _energy(constants: Constants, label: Label, field: float) -> float:
    eigen, rank, _ = _solve(constants, label, field)
    return float(eigen.energy_mhz[0, rank])


def _slope(constants: Constants, label: Label, field: float) -> float:
    eigen, rank, _ = _solve(constants, label, field)
    return float(eigen.slope_mhz_per_gauss()[0, rank])


def _movement(constants: Constants, label: Label, field: float) -> Movement:
    eigen, rank, fields = _solve(constants, label, field)
    return movement(eigen, fields, [rank])


def _spread(level: Level, moved: Movement) -> Spread:
    return spread(terms_of(level, moved))


def _trapped(
    isotope: Isotope,
    level: Level,
    constants: Constants,
    label: Label,
    interval: tuple[float | None, float | None],
    grid: Array,
    depth_microkelvin: float | None,
) -> Trapped:
    bottom, (start, turn) = float(grid[0]), interval
    slope = _slope(constants, label, bottom)
    slope = 0.0 if abs(slope) <= STILL else slope
    at_bottom = _spread(level, _movement(constants, label, bottom))
    end = turn if turn is not None else float(grid[-1])
    depth = depth_spread = None
    if start is not None:
        depth = _energy(constants, label, end) - _energy(constants, label, start)
        moved = _movement(constants, label, end).minus(_movement(constants, label, start))
        depth_spread = _spread(level, moved)
    knife, no_knife = _knife(level, constants, label, (start, end), depth, depth_microkelvin)
    excludes = (*at_bottom.excludes, *(depth_spread.excludes if depth_spread else ()))
    return Trapped(
        label,
        slope,
        float(at_bottom.uncertainty[SLOPE, 0, 0]),
        start,
        turn,
        np.nan if turn is None else _turning_spread(level, constants, label, turn),
        depth,
        np.nan if depth_spread is None else float(depth_spread.uncertainty[ENERGY, 0, 0]),
        _levitation(isotope, slope),
        knife,
        no_knife,
        tuple(dict.fromkeys(excludes)),
    )


def _turning_spread(level: Level, constants: Constants, label: Label, turn: float) -> float:
    """A turning point moves by ds/(2q) when the slope there moves by ds."""
    eigen, rank, _ = _solve(constants, label, turn)
    moved = float(_spread(level, _movement(constants, label, turn)).uncertainty[SLOPE, 0, 0])
    return moved / abs(2 * float(eigen.quadratic_mhz_per_gauss2()[0, rank]))


def _levitation(isotope: Isotope, slope_mhz_per_gauss: float) -> float | None:
    """Return the gradient in G/cm whose force balances gravity: m g/(h |dnu/dB|)."""
    if isotope.mass is None or slope_mhz_per_gauss == 0.0:
        return None
    kilograms = in_unit(isotope.mass, "kg").value * (1 - isotope.charge * M_E_U / isotope.mass.value)
    return float(kilograms * STANDARD_GRAVITY / (H * abs(slope_mhz_per_gauss) * 1e10) * 100)


def _knife(
    level: Level,
    constants: Constants,
    label: Label,
    interval: tuple[float | None, float],
    depth_mhz: float | None,
    wanted_microkelvin: float | None,
) -> tuple[Knife | None, str]:
    start, end = interval
    if wanted_microkelvin is None:
        return None, "no depth was asked for"
    if start is None or depth_mhz is None:
        return None, "the sublevel is not drawn to weak field"
    wanted = wanted_microkelvin * MHZ_PER_MICROKELVIN
    if wanted > depth_mhz:
        return None, f"the trap is only {depth_mhz / MHZ_PER_MICROKELVIN:.4g} uK deep"
    neighbours = [(label[0], label[1] + step) for step in (-2, 2) if abs(label[1] + step) <= label[0]]
    if not neighbours:
        return None, "there is no neighbouring sublevel"
    from scipy.optimize import brentq  # 16 MB that a worker spares until it is asked for a trap

    at_start = _energy(constants, label, start)
    field = float(
        brentq(lambda b: _energy(constants, label, b) - at_start - wanted, start, end, xtol=1e-12, rtol=1e-14)
    )
    to = min(neighbours, key=lambda other: _slope(constants, other, field))
    own, other = _slope(constants, label, field), _slope(constants, to, field)
    splitting = _energy(constants, label, field) - _energy(constants, to, field)
    # The field of a given depth moves with the constants too.
    rise = _movement(constants, label, field).numbers - _movement(constants, label, start).numbers
    gap = _movement(constants, label, field).numbers - _movement(constants, to, field).numbers
    moved = gap - (own - other) / own * rise if own > STILL else gap * np.nan
    sigma = float(_spread(level, Movement(moved)).uncertainty[ENERGY, 0, 0])
    at_bottom = abs(at_start - _energy(constants, to, start))
    return Knife(to, field, abs(splitting), sigma, at_bottom), ""


def losses(level: Level, bottom_gauss: float) -> list[Loss]:
    """Name the one-body ways out of a magnetic trap that this level allows. Collisions between the atoms are not among
    them.
    """
    found = [Loss("collisions with background gas", "always; set by the vacuum", None)]
    zero = (
        "the field vanishes at the bottom" if bottom_gauss == 0 else "not while spins follow: the field never vanishes"
    )
    found.append(Loss("spin flips (Majorana) to sublevels that are not held", zero, None))
    found.append(Loss("radio-frequency noise between neighbouring m", "always; at the Larmor frequency", None))
    if level.twice_J and level.twice_I:
        found.append(Loss("microwave noise between hyperfine levels", "always; at the hyperfine splitting", None))
    found.append(Loss("stray light near a line from this level", "always; optical pumping to other sublevels", None))
    if level.lifetime is not None:
        rate = 1.0 / in_unit(level.lifetime, "s").value
        found.append(Loss("radiative decay of the level", "always", rate))
    return found


def name_of(label: Label) -> str:
    """Write a sublevel as F,m."""
    return format_sublevel(*label)
