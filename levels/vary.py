"""What a scan may change about a scheme's description, one table of parameters, and how each is changed.

An axis changes one thing and leaves the rest of the laboratory as it is: lasers that were set to a Zeeman component do
not follow the field, beams given by angles from the field do not turn with it.
"""

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from levels.beams import LARGEST_INTENSITY, LARGEST_OFFSET_MHZ, Beam
from levels.errors import OutsideValidity
from levels.geometry import Axes, axes_of, direction_from_angles
from levels.jones import Ellipse, Plate, ellipse_of
from levels.purity import tilted
from levels.remedies import plane_of
from levels.setup import BeamSetup, Optics, Setup, jones_of
from levels.sublevels import LARGEST_FIELD_GAUSS

Array = NDArray[np.float64]
MOST_AXES = 3


@dataclass(frozen=True, slots=True)
class Parameter:
    """One thing that a scan may change, between two bounds: `of` the field, a beam, or the field as a beam sees it."""

    name: str
    unit: str
    of: str
    low: float
    high: float
    meaning: str


TURNS = 100 * 360.0
PARAMETERS = {
    row.name: row
    for row in (
        Parameter(
            "field_magnitude", "G", "field", -LARGEST_FIELD_GAUSS, LARGEST_FIELD_GAUSS,
            "size of the field, signed along its direction",
        ),
        Parameter("field_polar", "deg", "field", -TURNS, TURNS, "polar angle of the field from the laboratory z"),
        Parameter(
            "field_azimuth", "deg", "field", -TURNS, TURNS,
            "azimuth of the field around the laboratory z, from x towards y",
        ),
        Parameter("misalignment", "deg", "field", -TURNS, TURNS, "angle by which the field leaves its direction"),
        Parameter(
            "field_from_polarisation", "deg", "field and beam", -TURNS, TURNS,
            "angle of the field from the long axis of the beam's polarisation, towards the beam's direction",
        ),
        Parameter(
            "detuning", "MHz", "beam", -LARGEST_OFFSET_MHZ, LARGEST_OFFSET_MHZ,
            "detuning, from what the beam's description counts it from",
        ),
        Parameter("intensity", "mW/cm2", "beam", 0.0, LARGEST_INTENSITY, "intensity"),
        Parameter("saturation", "1", "beam", 0.0, 1e12, "intensity over the saturation intensity"),
        Parameter("power", "mW", "beam", 0.0, LARGEST_INTENSITY, "power, with the waist as described"),
        Parameter("linewidth", "MHz", "beam", 0.0, LARGEST_OFFSET_MHZ, "full width of the laser's line"),
        Parameter(
            "linear", "deg", "beam", -TURNS, TURNS, "angle of linear polarisation from the first transverse axis"
        ),
        Parameter("ellipticity", "deg", "beam", -45.0, 45.0, "from -45 (helicity -) to 45, with the azimuth kept"),
        Parameter(
            "azimuth", "deg", "beam", -TURNS, TURNS,
            "azimuth of the polarisation's long axis, with the ellipticity kept",
        ),
        Parameter("impurity", "1", "beam", 0.0, 1.0, "share of the intensity in the orthogonal polarisation"),
        Parameter(
            "polariser", "deg", "beam", -TURNS, TURNS, "angle of the polariser in front of the wave plates"
        ),
        Parameter("plate", "deg", "beam", -TURNS, TURNS, "fast axis of one of the beam's wave plates"),
        Parameter("angle_to_field", "deg", "beam", -TURNS, TURNS, "angle of the beam from the field"),
    )
}  # fmt: skip


@dataclass(frozen=True, slots=True, eq=False)
class Axis:
    """One axis of a grid; `beam` names whose parameter it is, `plate` which wave plate (from 1)."""

    parameter: str
    values: Array
    beam: str = ""
    plate: int = 1


def check_axes(setup: Setup, axes: Sequence[Axis]) -> None:
    """Refuse axes that are unknown, too many, of beams that do not exist, or that change one thing twice."""
    if not 1 <= len(axes) <= MOST_AXES:
        raise OutsideValidity("axes", len(axes), f"from 1 to {MOST_AXES} axes")
    for place, axis in enumerate(axes):
        _check_axis(setup, axis, f"axes.{place}")
    kinds = [(axis.parameter, axis.beam, axis.plate if axis.parameter == "plate" else 1) for axis in axes]
    if len(set(kinds)) < len(kinds):
        raise OutsideValidity("axes", "one parameter twice", "parameters that differ from axis to axis")
    names = {axis.parameter for axis in axes}
    if "field_from_polarisation" in names and names & {"field_polar", "field_azimuth"}:
        raise OutsideValidity("axes", "two directions of the field", "either its angles or field_from_polarisation")


def _check_axis(setup: Setup, axis: Axis, where: str) -> None:
    row, names = PARAMETERS.get(axis.parameter), [beam.name for beam in setup.beams]
    if row is None:
        raise OutsideValidity(f"{where}.parameter", axis.parameter, f"one of {', '.join(PARAMETERS)}")
    if "beam" in row.of and axis.beam not in names:
        raise OutsideValidity(f"{where}.beam", axis.beam, f"one of {', '.join(names)}")
    if "beam" not in row.of and axis.beam:
        raise OutsideValidity(f"{where}.beam", axis.beam, f"nothing: {row.name} is of the field, not of a beam")
    if axis.values.ndim != 1 or not axis.values.size or not np.all(np.isfinite(axis.values)):
        raise OutsideValidity(f"{where}.values", f"{axis.values.size} values", "finite values, at least one")
    low, high = float(axis.values.min()), float(axis.values.max())
    if low < row.low or high > row.high:
        given = f"{low if low < row.low else high:g}"
        raise OutsideValidity(f"{where}.values", given, f"from {row.low:g} to {row.high:g} {row.unit}")


def varied_field(axes: Axes, beams: Sequence[Beam], values: Sequence[tuple[Axis, float]]) -> Array:
    """Return the field in gauss with some parameters at new values: size, then direction, then misalignment."""
    given = {axis.parameter: (axis, value) for axis, value in values if PARAMETERS[axis.parameter].of != "beam"}
    x, y, z = axes.direction
    direction = axes.direction
    if "field_polar" in given or "field_azimuth" in given:
        polar = given["field_polar"][1] if "field_polar" in given else np.degrees(np.arctan2(np.hypot(x, y), z))
        azimuth = given["field_azimuth"][1] if "field_azimuth" in given else np.degrees(np.arctan2(y, x))
        direction = direction_from_angles(axes_of((0.0, 0.0, 1.0)), float(polar), float(azimuth))
    if "field_from_polarisation" in given:
        axis, value = given["field_from_polarisation"]
        plane = plane_of(next(beam for beam in beams if beam.name == axis.beam))
        direction = np.cos(np.radians(value)) * plane[0] + np.sin(np.radians(value)) * plane[1]
    field: Array = varied_magnitude(axes, values) * direction
    return tilted(field, given["misalignment"][1]) if "misalignment" in given else field


def varied_magnitude(axes: Axes, values: Sequence[tuple[Axis, float]]) -> float:
    """Return the signed size of the field in gauss with some parameters at new values."""
    return next((value for axis, value in values if axis.parameter == "field_magnitude"), axes.magnitude_gauss)


def varied_beam(beam: BeamSetup, base: Beam, axes: Axes, values: Sequence[tuple[Axis, float]]) -> BeamSetup:
    """Describe a beam anew, with some of its parameters at new values; `base` is the beam as it was made."""
    plain = replace(beam.optics, impurity=0.0)
    kept = ellipse_of(jones_of(plain, base.direction, axes, beam.line.multipole))
    for axis, value in values:
        if axis.parameter in _OPTICS:
            beam = replace(beam, optics=_OPTICS[axis.parameter](beam.optics, kept, value))
        elif axis.parameter == "plate":
            beam = replace(beam, optics=_with_plate(beam.optics, axis.plate, value))
        else:
            beam = _BEAM[axis.parameter](beam, value)
    return beam


def _unpolarised(optics: Optics) -> Optics:
    """Keep of a description what does not say the polarisation: reference and impurity."""
    return Optics(impurity=optics.impurity, phase_deg=optics.phase_deg, reference=optics.reference)


def _ellipse(optics: Optics, kept: Ellipse) -> Ellipse:
    if optics.ellipticity_deg is None:
        return kept
    return Ellipse(optics.azimuth_deg, optics.ellipticity_deg)


def _with_ellipticity(optics: Optics, kept: Ellipse, value: float) -> Optics:
    azimuth = _ellipse(optics, kept).azimuth_deg
    return replace(_unpolarised(optics), ellipticity_deg=value, azimuth_deg=azimuth)


def _with_azimuth(optics: Optics, kept: Ellipse, value: float) -> Optics:
    ellipticity = _ellipse(optics, kept).ellipticity_deg
    return replace(_unpolarised(optics), ellipticity_deg=ellipticity, azimuth_deg=value)


def _with_polariser(optics: Optics, kept: Ellipse, value: float) -> Optics:
    if optics.polariser_deg is None:
        raise OutsideValidity("polarisation", "no polariser", "a polariser, where its angle is scanned")
    return replace(optics, polariser_deg=value)


def _with_plate(optics: Optics, number: int, value: float) -> Optics:
    if not 1 <= number <= len(optics.plates):
        raise OutsideValidity("plate", number, f"the number of a wave plate: this beam has {len(optics.plates)}")
    turned = Plate(optics.plates[number - 1].waves, value)
    return replace(optics, plates=(*optics.plates[: number - 1], turned, *optics.plates[number:]))


def _with_power(beam: BeamSetup, value: float) -> BeamSetup:
    if beam.waist_mm is None:
        raise OutsideValidity("waist", "nothing", "a waist, where the power is scanned")
    return replace(_unlit(beam), power_mw=value, waist_mm=beam.waist_mm)


def _with_angle(beam: BeamSetup, value: float) -> BeamSetup:
    return replace(beam, direction=None, angle_to_field_deg=value)


def _unlit(beam: BeamSetup) -> BeamSetup:
    return replace(beam, intensity_mw_per_cm2=None, saturation=None, power_mw=None, waist_mm=None)


_OPTICS: dict[str, Callable[[Optics, Ellipse, float], Optics]] = {
    "linear": lambda optics, kept, value: replace(_unpolarised(optics), linear_deg=value),
    "ellipticity": _with_ellipticity,
    "azimuth": _with_azimuth,
    "impurity": lambda optics, kept, value: replace(optics, impurity=value),
    "polariser": _with_polariser,
}
_BEAM: dict[str, Callable[[BeamSetup, float], BeamSetup]] = {
    "detuning": lambda beam, value: replace(beam, tuning=replace(beam.tuning, detuning_mhz=value)),
    "intensity": lambda beam, value: replace(_unlit(beam), intensity_mw_per_cm2=value),
    "saturation": lambda beam, value: replace(_unlit(beam), saturation=value),
    "power": _with_power,
    "linewidth": lambda beam, value: replace(beam, linewidth_mhz=value),
    "angle_to_field": _with_angle,
}
