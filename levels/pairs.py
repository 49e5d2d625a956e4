"""Pairs of sublevels to store a qubit or a clock in, ranked by what noise does to them.

Candidates are the field-insensitive points of `insensitive` and, on request, every pair at one given field. Each is
told how much a noisy field and a noisy trapping light move its difference, and how to drive it.

With a field noise dB the difference moves by |slope| dB + |quadratic| dB^2. In light that shifts the lower sublevel by
a depth U it moves by U |alpha(upper)/alpha(lower) - 1| for every unit of relative intensity noise (seen by one atom
over time, or by many over the trap). The figure is the two in quadrature; it is a way to rank, not a prediction of
coherence times.
"""

from collections.abc import Iterable, Sequence
from dataclasses import dataclass, replace
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from levels.blocks import block
from levels.components import component, strength_model
from levels.insensitive import difference, insensitive
from levels.lightshift import Label
from levels.magic import Side
from levels.magicangles import ellipticities
from levels.notation import format_polarisation
from levels.partners import Partners
from levels.records import Level, Line
from levels.response import doubt_of_difference
from levels.sensitivity import ENERGY, QUADRATIC
from levels.setting import Setting
from levels.sublevels import as_fields, constants_of, labels_of, solve_block

Array = NDArray[np.float64]
MOST_CONSIDERED = 200
RADIO_MHZ = 300.0
SMALLEST_MOMENT = 1e-9  # Bohr magnetons: below it nothing drives


@dataclass(frozen=True, slots=True)
class Noise:
    """What disturbs: field noise in gauss, depth of the trap in MHz, relative noise of its intensity."""

    field_gauss: float = 1e-3
    depth_mhz: float = 1.0
    intensity: float = 1e-2


@dataclass(frozen=True, slots=True)
class Drive:
    """How to drive a pair: `kind` is microwave, radio frequency, two photons, line or none.

    `polarisation` is that of the wave along the field. `moment_mu_b` is |<u|mu_q|l>| of a magnetic drive, `line` and
    `strength` belong to an optical one (strength as in `components`, None where the model does not have it).
    """

    kind: str
    polarisation: str = ""
    moment_mu_b: float | None = None
    line: str = ""
    multipole: str = ""
    strength: float | None = None


@dataclass(frozen=True, slots=True)
class Pair:
    """One candidate; labels are (2F, 2m). Light figures are None without a light, or where the trap does not shift.

    Uncertainties are None where not known.
    """

    lower: Label
    upper: Label
    field_gauss: float
    insensitive: bool
    difference_mhz: float
    slope_mhz_per_gauss: float
    quadratic_hz_per_gauss2: float
    difference_uncertainty_mhz: float | None
    quadratic_uncertainty_hz_per_gauss2: float | None
    drive: Drive
    field_noise_hz: float
    light_ratio: float | None
    light_ratio_uncertainty: float | None
    light_noise_hz: float | None
    magic_ellipticity_deg: float | None
    figure_hz: float


@dataclass(frozen=True, slots=True)
class Asked:
    """What is asked: the two sides' levels, largest field and difference of m, a field for all pairs or None."""

    lower: Partners
    upper: Partners
    max_field_gauss: float = 2000.0
    max_twice_dm: int = 4
    at_gauss: float | None = None


Candidate = tuple[Label, Label, float, bool]


def candidates(asked: Asked) -> list[Candidate]:
    """List (lower, upper, field, whether insensitive) of every pair worth a look."""
    below, above = asked.lower.level, asked.upper.level
    points = insensitive(below, above, asked.max_field_gauss, asked.max_twice_dm)
    found: list[Candidate] = [(point.lower, point.upper, point.field_gauss, True) for point in points]
    if asked.at_gauss is None:
        return found
    lows, ups = labels_of(constants_of(below)), labels_of(constants_of(above))
    same = below.name == above.name
    for low in lows:
        for up in ups:
            if abs(up[1] - low[1]) <= asked.max_twice_dm and not (same and lows.index(up) <= lows.index(low)):
                found.append((low, up, asked.at_gauss, False))
    return found


def ranked_pairs(
    asked: Asked, lines: Iterable[Line], setting: Setting | None, noise: Noise, limit: int = 20
) -> list[Pair]:
    """Rank the candidates by their figure, best first.

    Light is looked at for the `MOST_CONSIDERED` that a noisy field disturbs least.
    """
    ends = {asked.lower.level.name, asked.upper.level.name}
    joining = [line for line in lines if {line.lower.name, line.upper.name} == ends]
    rough = [_in_field(asked, one, noise) for one in candidates(asked)]
    rough.sort(key=lambda pair: (pair.field_noise_hz, pair.field_gauss))
    whole = [replace(pair, drive=drive_of_pair(asked, joining, pair)) for pair in rough[:MOST_CONSIDERED]]
    if setting is not None:
        whole = [_in_light(asked, pair, setting, noise) for pair in whole]
    return sorted(whole, key=lambda pair: (pair.figure_hz, pair.field_gauss))[:limit]


def _in_field(asked: Asked, candidate: Candidate, noise: Noise) -> Pair:
    low, up, field, is_point = candidate
    below, above = asked.lower.level, asked.upper.level
    at = difference(below, low, above, up, field)
    if below.name == above.name and at.difference_mhz < 0:
        low, up = up, low
        at = difference(below, low, above, up, field)
    slope = 0.0 if is_point else abs(at.slope_mhz_per_gauss) * 1e6
    moved = slope * noise.field_gauss + abs(at.quadratic_hz_per_gauss2) * noise.field_gauss**2
    numbers = at.difference_mhz, at.slope_mhz_per_gauss, at.quadratic_hz_per_gauss2
    energy, quadratic = (_known(at.spread.uncertainty[row, 0, 0]) for row in (ENERGY, QUADRATIC))
    nothing = None, None, None, None
    return Pair(low, up, field, is_point, *numbers, energy, quadratic, Drive("none"), moved, *nothing, moved)


def _known(uncertainty: float) -> float | None:
    return None if np.isnan(uncertainty) else float(uncertainty)


def _in_light(asked: Asked, pair: Pair, setting: Setting, noise: Noise) -> Pair:
    """Add what the light does to a pair, and the ellipticity at which it would do nothing."""
    lower, upper = Side(asked.lower, pair.lower), Side(asked.upper, pair.upper)
    here = replace(setting, field_gauss=pair.field_gauss)
    answers = lower.at(pair.field_gauss), upper.at(pair.field_gauss)
    one, two = (here.fractions @ answer.by_drive(here.frequency_mhz)[:, 0] for answer in answers)
    magic = ellipticities(lower, upper, here).solutions
    best = min(magic, key=lambda found: abs(found.value - setting.ellipticity_deg), default=None)
    if one == 0:
        return replace(pair, magic_ellipticity_deg=None if best is None else best.value)
    ratio = float(two / one) - 1
    doubt = doubt_of_difference(answers[1], answers[0], np.array([here.frequency_mhz]), here.fractions)
    moved = abs(ratio) * noise.depth_mhz * 1e6 * noise.intensity
    return replace(
        pair,
        light_ratio=ratio,
        light_ratio_uncertainty=_known(abs(doubt.uncertainty[0] / one)),
        light_noise_hz=moved,
        magic_ellipticity_deg=None if best is None else best.value,
        figure_hz=float(np.hypot(pair.field_noise_hz, moved)),
    )


# How to drive


def drive_of_pair(asked: Asked, joining: Sequence[Line], pair: Pair) -> Drive:
    """Say how to drive a pair: with an oscillating magnetic field within a level, with a line between two."""
    if asked.lower.level.name != asked.upper.level.name:
        return _optical(joining, pair)
    q = (pair.upper[1] - pair.lower[1]) // 2
    if abs(q) > 1:
        return Drive("two photons" if abs(q) == 2 else f"{abs(q)} photons", f"m changes by {q:+d}")
    moment = abs(magnetic_element(asked.lower.level, pair.lower, pair.upper, pair.field_gauss))
    if moment < SMALLEST_MOMENT:
        return Drive("two photons", format_polarisation(q), moment)
    kind = "radio frequency" if abs(pair.difference_mhz) < RADIO_MHZ else "microwave"
    return Drive(kind, format_polarisation(q), moment)


def _optical(joining: Sequence[Line], pair: Pair) -> Drive:
    """Choose the line that drives a pair between two levels, the strongest component first."""
    q = (pair.upper[1] - pair.lower[1]) // 2
    fitting = []
    for line in joining:
        if line.photons == 1 and abs(q) <= line.rank:
            found = component(line, pair.lower, pair.upper, pair.field_gauss)
            strength = found.strength if strength_model(line) else None
            fitting.append(Drive("line", format_polarisation(q), None, line.name, line.multipole, strength))
    return max(fitting, key=lambda drive: drive.strength or 0.0, default=Drive("none", f"m changes by {q:+d}"))


def magnetic_element(level: Level, lower: Label, upper: Label, field_gauss: float) -> float:
    """Compute <u|g_J J_q + g_I I_q|l> in Bohr magnetons at a field, q = m_u - m_l of -1, 0 or 1.

    J_+1 = -(J_x + i J_y)/sqrt2 and so on: a resonant wave of amplitude B with this polarisation makes the Rabi
    frequency (muB/h) |element| B.
    """
    constants, fields = constants_of(level), as_fields(field_gauss)
    low, up = solve_block(constants, lower[1], fields), solve_block(constants, upper[1], fields)
    matrix = _moment(constants.twice_J, constants.twice_I, lower[1], upper[1], constants.g_J, constants.g_I)
    one, two = low.states[0][:, low.twice_F.index(lower[0])], up.states[0][:, up.twice_F.index(upper[0])]
    return float(two @ matrix @ one)


@lru_cache(maxsize=512)
def _moment(twice_J: int, twice_I: int, twice_m: int, twice_m_up: int, g_J: float, g_I: float) -> Array:
    """Build g_J J_q + g_I I_q between the product states of two blocks."""
    below, above = block(twice_J, twice_I, twice_m), block(twice_J, twice_I, twice_m_up)
    q = (twice_m_up - twice_m) // 2
    matrix = np.zeros((above.size, below.size))
    for row, (mJ_up, mI_up) in enumerate(zip(above.twice_mJ, above.twice_mI, strict=True)):
        for column, (mJ, mI) in enumerate(zip(below.twice_mJ, below.twice_mI, strict=True)):
            if mI == mI_up and mJ_up - mJ == 2 * q:
                matrix[row, column] += g_J * _ladder(twice_J, mJ, q)
            if mJ == mJ_up and mI_up - mI == 2 * q:
                matrix[row, column] += g_I * _ladder(twice_I, mI, q)
    return matrix


def _ladder(twice_j: int, twice_m: int, q: int) -> float:
    """Return <m+q|j_q|m>."""
    j, m = twice_j / 2, twice_m / 2
    return m if q == 0 else float(-q * np.sqrt(max(j * (j + 1) - m * (m + q), 0.0) / 2))
