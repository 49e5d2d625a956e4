"""Polarisations as a laboratory describes them: linear, circular, elliptical, or wave plates after a polariser.

A Jones vector (E1, E2) refers to the transverse axes e1, e2 of `geometry.transverse_basis`; angles are in degrees from
e1 towards e2, counter-clockwise for someone who looks into the beam. The time factor is exp(-i omega t), so that
(1, i)/sqrt2 turns from e1 to e2: positive helicity, the photon spin along the beam.

Handedness, stated here once: by `helicity`, the house convention, right-handed light has positive helicity (its field
turns about the beam as the fingers of a right hand whose thumb points along the beam). By `optics`, the convention of
most optics texts (Born and Wolf, Principles of Optics, section 1.4), right-handed light has negative helicity.
"""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from levels.errors import OutsideValidity
from levels.geometry import Axes, Complex, attainable, best_jones

HANDEDNESS = {"helicity": {"right": 1, "left": -1}, "optics": {"right": -1, "left": 1}}
WAVES = {"half": 0.5, "quarter": 0.25, "full": 1.0}


@dataclass(frozen=True, slots=True)
class Plate:
    """A wave plate: retardance in waves (0.25 for a quarter-wave plate) and the angle of its fast axis."""

    waves: float
    fast_axis_deg: float


@dataclass(frozen=True, slots=True)
class Ellipse:
    """A polarisation ellipse: azimuth of the long axis (0 to 180), ellipticity from -45 (helicity -1) to 45 degrees."""

    azimuth_deg: float
    ellipticity_deg: float


@dataclass(frozen=True, slots=True)
class PlateSetting:
    """Fast-axis angles (0 to 180 degrees) of a half-wave plate and the quarter-wave plate after it."""

    half_wave_deg: float
    quarter_wave_deg: float
    ellipse: Ellipse


def _angle(name: str, value_deg: float) -> float:
    if not np.isfinite(value_deg):
        raise OutsideValidity(name, value_deg, "a finite angle in degrees")
    return float(np.radians(value_deg))


def linear(angle_deg: float) -> Complex:
    """Return the Jones vector of linear polarisation at an angle from e1."""
    angle = _angle("linear angle", angle_deg)
    return np.array([np.cos(angle), np.sin(angle)], dtype=np.complex128)


def circular(handedness: str, convention: str = "helicity") -> Complex:
    """Return the Jones vector of `right` or `left` circular light by the named convention.

    >>> circular("right").round(3).tolist()
    [(0.707+0j), 0.707j]
    """
    if convention not in HANDEDNESS:
        raise OutsideValidity("convention", convention, f"one of {', '.join(HANDEDNESS)}")
    if handedness not in HANDEDNESS[convention]:
        raise OutsideValidity("handedness", handedness, "right or left")
    return elliptical(45.0 * HANDEDNESS[convention][handedness])


def elliptical(ellipticity_deg: float, azimuth_deg: float = 0.0) -> Complex:
    """Return the Jones vector of an ellipse; tan(ellipticity) is short axis over long axis, positive for helicity +."""
    chi, psi = _angle("ellipticity", ellipticity_deg), _angle("azimuth", azimuth_deg)
    if abs(ellipticity_deg) > 45.0:
        raise OutsideValidity("ellipticity", ellipticity_deg, "from -45 (helicity -) to 45 (helicity +) degrees")
    long, short = np.cos(chi), 1j * np.sin(chi)
    return np.array([long * np.cos(psi) - short * np.sin(psi), long * np.sin(psi) + short * np.cos(psi)])


def with_impurity(jones: Sequence[complex] | Complex, impurity: float, phase_deg: float = 0.0) -> Complex:
    """Mix a share of intensity of the opposite (orthogonal) polarisation into a Jones vector, with a phase."""
    if not 0.0 <= impurity <= 1.0:
        raise OutsideValidity("impurity", impurity, "a share of the intensity from 0 to 1")
    pair = np.asarray(jones, dtype=np.complex128)
    other = np.array([-pair[1].conj(), pair[0].conj()])
    turn = np.exp(1j * _angle("phase", phase_deg))
    mixed: Complex = np.sqrt(1 - impurity) * pair + np.sqrt(impurity) * turn * other
    return mixed


def plate(kind: str, fast_axis_deg: float) -> Plate:
    """Make a `half`, `quarter` or `full` wave plate with its fast axis at an angle."""
    if kind not in WAVES:
        raise OutsideValidity("plate", kind, f"one of {', '.join(WAVES)}, or a retardance in waves")
    return Plate(WAVES[kind], fast_axis_deg)


def through_plates(polariser_deg: float, plates: Sequence[Plate]) -> Complex:
    """Return the Jones vector after a linear polariser and a chain of wave plates, first plate first.

    The slow axis lags: exp(2 pi i waves) beside the fast one. Linear light 45 degrees counter-clockwise from the fast
    axis of a quarter-wave plate leaves with positive helicity.
    """
    vector = linear(polariser_deg)
    for item in plates:
        if not np.isfinite(item.waves):
            raise OutsideValidity("waves", item.waves, "a finite retardance in waves")
        angle = _angle("fast axis", item.fast_axis_deg)
        fast = np.array([np.cos(angle), np.sin(angle)])
        slow = np.array([-np.sin(angle), np.cos(angle)])
        vector = (vector @ fast) * fast + np.exp(2j * np.pi * item.waves) * (vector @ slow) * slow
    return vector


def ellipse_of(jones: Sequence[complex] | Complex) -> Ellipse:
    """Compute azimuth and ellipticity of a Jones vector."""
    first, second = np.asarray(jones, dtype=np.complex128)
    total = abs(first) ** 2 + abs(second) ** 2
    s1 = (abs(first) ** 2 - abs(second) ** 2) / total
    s2, s3 = 2 * (first.conjugate() * second).real / total, 2 * (first.conjugate() * second).imag / total
    azimuth = np.degrees(np.arctan2(s2, s1)) / 2 % 180.0
    return Ellipse(float(azimuth), float(np.degrees(np.arctan2(s3, np.hypot(s1, s2))) / 2))


def plates_for(jones: Sequence[complex] | Complex, polariser_deg: float = 0.0) -> PlateSetting:
    """Find the half-wave and quarter-wave plate angles that turn a polariser's light into a Jones vector exactly.

    The quarter-wave plate's fast axis lies on the long axis of the ellipse and the light enters it turned from there by
    the ellipticity; the half-wave plate does that turning.
    """
    wanted = ellipse_of(jones)
    entering = wanted.azimuth_deg + wanted.ellipticity_deg
    half = (entering + polariser_deg) / 2 % 180.0
    return PlateSetting(float(half), wanted.azimuth_deg, wanted)


def plates_toward(
    direction: ArrayLike,
    axes: Axes,
    q: int,
    wanted: float = 1.0,
    *,
    polariser_deg: float = 0.0,
    multipole: str = "E1",
    reference: ArrayLike | None = None,
) -> tuple[PlateSetting, float]:
    """Find the plate angles that bring the fraction of q closest to a wanted one, and the fraction they reach.

    Only the part of the light along the best polarisation drives q, so any fraction from zero to the attainable one is
    reached by mixing in the orthogonal polarisation, which drives none.
    """
    if not 0.0 <= wanted <= 1.0:
        raise OutsideValidity("purity", wanted, "a fraction from 0 to 1")
    best = best_jones(direction, axes, q, multipole, reference)
    largest = attainable(direction, axes, multipole)
    reached = min(wanted, float(largest[q + largest.size // 2]))
    share = reached / float(largest[q + largest.size // 2])
    return plates_for(with_impurity(best, max(0.0, 1.0 - share)), polariser_deg), reached
