"""Ellipticities, angles and fields at which two sublevels shift alike, or one does not shift.

With p and C of `setting` the difference is mean + p t + C v, where t = alpha_0 - mean and v = (alpha_+ - alpha_-)/2
of the two sides' difference. As a function of the ellipticity or the azimuth that is a + b cos x + c sin x with x twice
the angle, as a function of the beam angle a quadratic in its cosine: solved in closed form. In the field it is searched
on a grid, with a finer look wherever it turns near zero, and polished by halving.
"""

from collections.abc import Callable
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from levels.insensitive import field_grid, insensitive
from levels.magic import Found, Side, difference, not_excluded, solution
from levels.setting import Setting
from levels.sublevels import constants_of

Array = NDArray[np.float64]
SAME = 1e-9  # degrees, or relative to the field: closer solutions are one
FINE_POINTS = 129
ROUNDING = 1e-12  # of the polarisabilities that are subtracted


def _parts(lower: Side | None, upper: Side, setting: Setting) -> tuple[float, float, float, float]:
    """Return mean, t, v of the difference, and the size below which it is rounding."""
    minus, none, plus = difference(lower, upper, setting)
    size = float(np.abs(upper.at(setting.field_gauss).by_drive(setting.frequency_mhz)).max())
    return float(plus + minus) / 2, float(none - (plus + minus) / 2), float(plus - minus) / 2, ROUNDING * size


def _angles(a: float, b: float, c: float, low: float, high: float) -> list[float]:
    """Solve a + b cos x + c sin x = 0 for x in degrees from `low` to `high`."""
    radius = float(np.hypot(b, c))
    if radius == 0.0 or abs(a) > radius:
        return []
    centre, half = np.degrees(np.arctan2(c, b)), np.degrees(np.arccos(np.clip(-a / radius, -1.0, 1.0)))
    turned = [centre + sign * half + 360.0 * turn for sign in (-1, 1) for turn in (-1, 0, 1)]
    return _distinct([float(x) for x in turned if low <= x <= high], SAME)


def _distinct(values: list[float], apart: float) -> list[float]:
    kept: list[float] = []
    for value in sorted(values):
        if not kept or value - kept[-1] > apart:
            kept.append(value)
    return kept


def ellipticities(lower: Side | None, upper: Side, setting: Setting) -> Found:
    """Find every ellipticity from -45 to 45 degrees that does it, with beam angle and azimuth held."""
    mean, t, v, least = _parts(lower, upper, setting)
    square = np.sin(np.radians(setting.beam_angle_deg)) ** 2
    b = t * square * np.cos(2 * np.radians(setting.azimuth_deg)) / 2
    c = v * np.cos(np.radians(setting.beam_angle_deg))
    return _angular(lower, upper, setting, "ellipticity", (mean + t * square / 2, b, c), (-90.0, 90.0), least)


def azimuths(lower: Side | None, upper: Side, setting: Setting) -> Found:
    """Find every azimuth from 0 to 180 degrees (not included) that does it, with beam angle and ellipticity held."""
    mean, t, v, least = _parts(lower, upper, setting)
    square = np.sin(np.radians(setting.beam_angle_deg)) ** 2
    b = t * square * np.cos(2 * np.radians(setting.ellipticity_deg)) / 2
    a = mean + t * square / 2 + v * setting.circularity
    return _angular(lower, upper, setting, "azimuth", (a, b, 0.0), (0.0, 360.0 - 2 * SAME), least)


def _angular(
    lower: Side | None,
    upper: Side,
    setting: Setting,
    unknown: str,
    terms: tuple[float, float, float],
    twice_range: tuple[float, float],
    least: float,
) -> Found:
    a, b, c = terms
    if max(abs(a), np.hypot(b, c)) <= least:
        return Found((), f"the difference is zero for every {unknown}")
    if np.hypot(b, c) <= least:
        return Found((), f"the {unknown} changes nothing here: the difference stays {a:.4g} a0^3")
    found = [x / 2 for x in _angles(a, b, c, *twice_range)]
    grid = np.radians(np.linspace(*twice_range, 721))
    return _found(lower, upper, setting, unknown, found, a + b * np.cos(grid) + c * np.sin(grid), np.degrees(grid) / 2)


def beam_angles(lower: Side | None, upper: Side, setting: Setting) -> Found:
    """Find every angle from 0 to 180 degrees between beam and field that does it, with the ellipse held."""
    mean, t, v, least = _parts(lower, upper, setting)
    across = replace(setting, beam_angle_deg=90.0).along
    turn = v * np.sin(2 * np.radians(setting.ellipticity_deg))
    a, b, c = -t * across, turn, mean + t * across  # a cos^2 + b cos + c
    if max(abs(a), abs(b), abs(c)) <= least:
        return Found((), "the difference is zero for every beam angle")
    if max(abs(a), abs(b)) <= least:
        return Found((), f"the beam angle changes nothing here: the difference stays {c:.4g} a0^3")
    cosines = np.roots([a, b, c]) if abs(a) > least else np.array([-c / b])
    real = cosines[np.abs(cosines.imag) < 1e-12].real
    found = _distinct([float(np.degrees(np.arccos(x))) for x in real if -1 <= x <= 1], SAME)
    grid = np.linspace(0.0, 180.0, 721)
    x = np.cos(np.radians(grid))
    return _found(lower, upper, setting, "beam_angle", found, a * x**2 + b * x + c, grid)


def _found(
    lower: Side | None, upper: Side, setting: Setting, unknown: str, values: list[float], sample: Array, grid: Array
) -> Found:
    """Describe the solutions, or say what the difference does over the range instead."""
    name = "field_gauss" if unknown == "field" else f"{unknown}_deg"
    if values:
        return Found(tuple(solution(lower, upper, replace(setting, **{name: value}), unknown) for value in values))
    k = int(np.argmin(np.abs(sample)))
    unit = "G" if unknown == "field" else "degrees"
    spoken = unknown.replace("_", " ")
    closest = replace(setting, **{name: float(grid[k])})
    doubt = not_excluded(lower, upper, closest, np.array([setting.frequency_mhz]))
    return Found(
        (),
        f"the difference runs from {sample.min():.4g} to {sample.max():.4g} a0^3 over the whole range of the {spoken}; "
        f"it comes closest to zero with {abs(sample[k]):.4g} a0^3 at {grid[k]:.6g} {unit}{doubt}",
    )


# Fields


def magic_fields(lower: Side | None, upper: Side, setting: Setting, max_field_gauss: float) -> Found:
    """Find the fields from 0 to a largest one that do it, in the light of the setting.

    Two solutions closer together than a grid interval over `FINE_POINTS` may be missed.
    """
    if any(side is not None and side.label is None for side in (lower, upper)):
        return Found((), "a scalar polarisability does not depend on the field: name the sublevels")
    grid = field_grid(constants_of(upper.partners.level), max_field_gauss)

    def value(fields: Array) -> Array:
        total = upper.at(fields).along_field(setting.frequency_mhz)
        if lower is not None:
            total = total - lower.at(fields).along_field(setting.frequency_mhz)
        number: Array = setting.fractions @ total
        return number

    sample = value(grid)
    size = float(np.abs(upper.at(grid[:1]).along_field(setting.frequency_mhz)).max())
    if np.abs(sample).max() <= ROUNDING * size:
        return Found((), "the difference is zero at every field of the range")
    found = [_halved(value, low, high) for low, high in _brackets(value, grid, sample)]
    if abs(sample[0]) <= ROUNDING * size:
        found.append(0.0)
    return _found(lower, upper, setting, "field", _distinct(found, SAME * max_field_gauss), sample, grid)


def _brackets(value: Callable[[Array], Array], grid: Array, sample: Array) -> list[tuple[float, float]]:
    """Bracket every change of sign, looking closer where the size has a minimum without one."""
    rows = np.nonzero(np.sign(sample[:-1]) * np.sign(sample[1:]) < 0)[0]
    brackets = [(float(grid[k]), float(grid[k + 1])) for k in rows]
    size = np.abs(sample)
    inner = np.nonzero((size[1:-1] < size[:-2]) & (size[1:-1] < size[2:]))[0] + 1
    for k in inner:
        if np.sign(sample[k - 1]) == np.sign(sample[k]) == np.sign(sample[k + 1]):
            fine = np.linspace(grid[k - 1], grid[k + 1], FINE_POINTS)
            closer = value(fine)
            rows = np.nonzero(np.sign(closer[:-1]) * np.sign(closer[1:]) < 0)[0]
            brackets += [(float(fine[j]), float(fine[j + 1])) for j in rows]
    return brackets


def _halved(value: Callable[[Array], Array], low: float, high: float) -> float:
    """Close in on a change of sign, a hundredfold with each array call."""
    while high - low > SAME * max(abs(high), 1e-6):
        fine = np.linspace(low, high, FINE_POINTS)
        signs = np.sign(value(fine))
        changes = np.nonzero(signs[:-1] * signs[1:] <= 0)[0]
        if not changes.size or float(fine[1] - fine[0]) == 0.0:
            break
        low, high = float(fine[changes[0]]), float(fine[changes[0] + 1])
    return (low + high) / 2


def at_insensitive_fields(lower: Side, upper: Side, setting: Setting, max_field_gauss: float) -> list[Found]:
    """Solve the ellipticity at each field where the two sublevels do not move apart: insensitive to field and light.

    The list has one entry for each such field; its solutions carry that field in their setting.
    """
    if lower.label is None or upper.label is None:
        return []
    below, above = lower.partners.level, upper.partners.level
    wanted = {lower.label, upper.label}
    largest = abs(upper.label[1] - lower.label[1])
    points = insensitive(below, above, max_field_gauss, largest)
    fields = [point.field_gauss for point in points if {point.lower, point.upper} == wanted]
    return [ellipticities(lower, upper, replace(setting, field_gauss=field)) for field in _distinct(fields, SAME)]
