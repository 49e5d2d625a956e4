"""Wavelengths at which two sublevels shift alike (magic), or one does not shift (tune-out).

A side is a sublevel, or the scalar part of a whole level or of one F. The difference of two sides' polarisabilities is
a sum of poles in the light frequency, whose every root in a range `rational` finds. Shifts are first order in the
light; see `response`. A solution's uncertainty is that of the difference over its slope.
"""

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import ArrayLike, NDArray

from levels.constants import MHZ_NM
from levels.errors import OutsideValidity
from levels.lightshift import Label
from levels.partners import Doubt, Partners
from levels.polarisability import LONGEST_NM, SHORTEST_NM
from levels.rational import Rational, every_root, minus, stretches
from levels.response import Response, doubt_of_difference, doubt_of_sublevel, response, scalar_response
from levels.setting import Setting

Array = NDArray[np.float64]
UNKNOWNS = ("wavelength", "ellipticity", "azimuth", "beam_angle", "field")
INSENSITIVE_SHARE = 1e-3
SAMPLES = 2001
DOUBTED = 129  # of these samples, the uncertainty is looked at
SURE = 2.0  # standard uncertainties


@dataclass(frozen=True, slots=True, eq=False)
class Side:
    """One of the two that are compared: a sublevel (2F, 2m), or without a label the scalar of the level or of an F."""

    partners: Partners
    label: Label | None = None
    twice_F: int | None = None

    def at(self, field_gauss: ArrayLike) -> Response:
        """Solve the side at one or many fields."""
        if self.label is None:
            return scalar_response(self.partners, self.twice_F)
        return response(self.partners, self.label, field_gauss)


@dataclass(frozen=True, slots=True)
class Solution:
    """Where a difference vanishes: the setting, and how the difference moves away from zero there.

    `polarisability_a03` is what the lower side has there (the common one of a magic condition). `uncertainty` is that
    of the value solved for, in its own unit, NaN where not known; `stated` the part that stated inputs make. `slopes`
    are d(difference) per nm, degree or gauss. `vector_a03` is half of what the difference changes by from sigma- to
    sigma+, `tensor_a03` what it changes by from there to pi; where both are below a thousandth of the polarisability
    (within one level: of the lines' parts of the difference) no change of polarisation matters (`insensitive`).
    """

    unknown: str
    value: float
    uncertainty: float
    stated: float
    setting: Setting
    polarisability_a03: float
    slopes: dict[str, float]
    vector_a03: float
    tensor_a03: float
    insensitive: bool
    nearest_line: str
    detuning_mhz: float
    excludes: tuple[str, ...]
    reasons: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class Found:
    """Every solution of the sums, or `why_none`; `proved` is False where the search could not be finished."""

    solutions: tuple[Solution, ...]
    why_none: str = ""
    proved: bool = True


def difference(lower: Side | None, upper: Side, setting: Setting) -> Array:
    """Evaluate alpha_q(upper) - alpha_q(lower), or alpha_q(upper) alone, for q = -1, 0, 1 in a0^3."""
    nu = setting.frequency_mhz
    total = upper.at(setting.field_gauss).by_drive(nu)[:, 0]
    return total if lower is None else total - lower.at(setting.field_gauss).by_drive(nu)[:, 0]


def magic_wavelengths(lower: Side, upper: Side, setting: Setting, low_nm: float, high_nm: float) -> Found:
    """Find every wavelength from `low_nm` to `high_nm` at which two sides shift alike in the setting's light."""
    one, two = lower.at(setting.field_gauss), upper.at(setting.field_gauss)
    function = minus(two.rational(list(setting.fractions)), one.rational(list(setting.fractions)))
    return _in_range(lower, upper, setting, function, low_nm, high_nm)


def tune_outs(side: Side, setting: Setting, low_nm: float, high_nm: float) -> Found:
    """Find every wavelength from `low_nm` to `high_nm` at which one side does not shift in the setting's light."""
    function = side.at(setting.field_gauss).rational(list(setting.fractions))
    return _in_range(None, side, setting, function, low_nm, high_nm)


def _in_range(
    lower: Side | None, upper: Side, setting: Setting, function: Rational, low_nm: float, high_nm: float
) -> Found:
    if not SHORTEST_NM <= low_nm < high_nm <= LONGEST_NM:
        allowed = f"rising, from {SHORTEST_NM:g} to {LONGEST_NM:g} nm"
        raise OutsideValidity("range", f"{low_nm:g} to {high_nm:g} nm", allowed)
    low, high = MHZ_NM / high_nm, MHZ_NM / low_nm
    roots = every_root(function, low, high)
    if roots.vanishes:
        return Found((), "the difference is zero at every wavelength: these two shift alike in this light")
    settings = [replace(setting, wavelength_nm=MHZ_NM / root) for root in sorted(roots.roots, reverse=True)]
    found = tuple(solution(lower, upper, at, "wavelength") for at in settings)
    if found:
        return Found(found, "", roots.proved)
    light = [np.linspace(start, end, DOUBTED) for start, end in stretches(function, low, high)]
    doubt = not_excluded(lower, upper, setting, np.concatenate([*light, np.zeros(0)]))
    return Found((), _why_no_root(function, low, high) + doubt, roots.proved)


def not_excluded(lower: Side | None, upper: Side, setting: Setting, light_mhz: Array) -> str:
    """Say where the uncertainty of the difference leaves room for a zero that the sums do not have; else nothing."""
    if not light_mhz.size:
        return ""
    two, one = upper.at(setting.field_gauss), None if lower is None else lower.at(setting.field_gauss)
    value = two.rational(list(setting.fractions)).value(light_mhz)
    if one is not None:
        value = value - one.rational(list(setting.fractions)).value(light_mhz)
    spread = _doubt(one, two, light_mhz, setting.fractions).uncertainty
    if np.any(np.isnan(spread)):
        return "; how far the sums are off is not known, so that a solution is not excluded"
    k = int(np.argmax(spread / np.maximum(np.abs(value), 1e-300)))
    if SURE * spread[k] < abs(value[k]):
        return ""
    where = f"{value[k]:.4g} with an uncertainty of {spread[k]:.2g} a0^3 at {MHZ_NM / light_mhz[k]:.6g} nm"
    return f"; it is {where}, so that a solution is not excluded"


def _doubt(one: Response | None, two: Response, light_mhz: Array, fractions: Array) -> Doubt:
    if one is None:
        return doubt_of_sublevel(two, light_mhz, fractions)
    return doubt_of_difference(two, one, light_mhz, fractions)


def _why_no_root(function: Rational, low: float, high: float) -> str:
    """Say how the function keeps its sign on each stretch between lines, and where it comes closest to zero."""
    best, signs, parts = (np.inf, 0.0), set(), stretches(function, low, high)
    for start, end in parts:
        x = np.linspace(start, end, SAMPLES)
        value = function.value(x)
        k = int(np.argmin(np.abs(value)))
        signs.add(float(np.sign(value[k])))
        best = min(best, (float(np.abs(value[k])), float(x[k])))
    if not parts:
        return "the whole range lies within the lines, where light does more than shift"
    sign = {1.0: "positive", -1.0: "negative"}.get(signs.pop(), "zero") if len(signs) == 1 else "of one sign"
    where = "throughout" if len(parts) == 1 else "between all lines of the range"
    closest = f"it comes closest to zero with {best[0]:.4g} a0^3 at {MHZ_NM / best[1]:.6g} nm"
    return f"the difference stays {sign} {where}; {closest}"


def solution(lower: Side | None, upper: Side, setting: Setting, unknown: str) -> Solution:
    """Describe a root: slopes, sensitivity to polarisation, uncertainty of the value solved for."""
    two = upper.at(setting.field_gauss)
    one = None if lower is None else lower.at(setting.field_gauss)
    slopes = slopes_at(lower, upper, setting)
    minus_, none, plus = difference(lower, upper, setting)
    nu, fractions = np.array([setting.frequency_mhz]), setting.fractions
    doubt = _doubt(one, two, nu, fractions)
    common = float(fractions @ (two if one is None else one).by_drive(nu)[:, 0])
    vector, tensor = float(plus - minus_) / 2, float(none - (plus + minus_) / 2)
    scale = INSENSITIVE_SHARE * _size(one, two, setting, common)
    nearest = _nearest(upper, lower, setting)
    steep = abs(slopes[unknown]) or np.nan
    return Solution(
        unknown,
        _value_of(setting, unknown),
        float(doubt.uncertainty[0] / steep),
        float(doubt.stated[0] / steep),
        setting,
        common,
        slopes,
        vector,
        tensor,
        _feels(lower, upper) and abs(vector) < scale and abs(tensor) < scale,
        *nearest,
        doubt.excludes,
        doubt.reasons,
    )


def _size(one: Response | None, two: Response, setting: Setting, common: float) -> float:
    """Return what changes with polarisation are measured by: the common polarisability; within a level what cancels."""
    if one is None:
        return 1.0
    if one.partners.level.name != two.partners.level.name:
        return abs(common)
    parts = (two.shares(setting.frequency_mhz) - one.shares(setting.frequency_mhz))[:, :, 0] @ setting.fractions
    return float(np.abs(parts).sum())


def _feels(lower: Side | None, upper: Side) -> bool:
    """Tell whether the sides' own answer to polarisation is in the sums, not only their scalar part."""
    sides = (upper,) if lower is None else (lower, upper)
    return all(side.label is not None or side.partners.level.twice_J == 0 for side in sides)


def _value_of(setting: Setting, unknown: str) -> float:
    names = {"wavelength": "wavelength_nm", "field": "field_gauss"}
    return float(getattr(setting, names.get(unknown, f"{unknown}_deg")))


def slopes_at(lower: Side | None, upper: Side, setting: Setting) -> dict[str, float]:
    """Differentiate the difference by each of UNKNOWNS: a0^3 per nm, degree and gauss."""
    minus_, none, plus = difference(lower, upper, setting)
    per_p, per_C = float(none - (plus + minus_) / 2), float(plus - minus_) / 2
    slopes = {name: per_p * dp + per_C * dC for name, (dp, dC) in setting.slopes_per_deg().items()}
    step_gauss = 1e-3 * max(abs(setting.field_gauss), 1.0)

    def along(side: Side) -> tuple[float, float]:
        answer = side.at([setting.field_gauss, setting.field_gauss + step_gauss, setting.field_gauss - step_gauss])
        slope = float(answer.rational(list(setting.fractions)).slope(setting.frequency_mhz)[0])
        if side.label is None:
            return slope, 0.0
        _, ahead, behind = setting.fractions @ answer.along_field(setting.frequency_mhz)
        return slope, float(ahead - behind) / (2 * step_gauss)

    per_mhz, per_gauss = along(upper)
    if lower is not None:
        of_lower = along(lower)
        per_mhz, per_gauss = per_mhz - of_lower[0], per_gauss - of_lower[1]
    per_nm = -per_mhz * MHZ_NM / setting.wavelength_nm**2
    return {"wavelength": per_nm, **slopes, "field": per_gauss}


def _nearest(upper: Side, lower: Side | None, setting: Setting) -> tuple[str, float]:
    lines = [*upper.partners.lines, *(() if lower is None else lower.partners.lines)]
    gaps = [(abs(setting.frequency_mhz - line.centroid.value), line) for line in lines if line.centroid is not None]
    if not gaps:
        return "", np.nan
    _, line = min(gaps, key=lambda pair: pair[0])
    return line.name, setting.frequency_mhz - (line.centroid.value if line.centroid else 0.0)
