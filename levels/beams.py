"""Laser beams and the schemes they make: intensity, saturation and Rabi frequency.

Rabi frequencies follow H/hbar = (Omega/2)(|u><l| exp(-i omega t) + h.c.), so a resonant two-level atom is inverted in
the time pi/Omega. The Rabi frequency of a component is Omega_ref times the sum over q of c_q (`geometry.factors`) and
the component's signed amplitude, with the reference Rabi frequency of unit strength

    Omega_ref^2 = 6 pi c^2 I A / (hbar omega^3),

A being the line's partial decay rate; for a dipole line this is (E0 d/hbar)^2 with d^2 = 3 pi eps0 hbar c^3 A/omega^3.
All phases of lines are taken as zero, which only closed loops of several lines could notice.
"""

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import ArrayLike

from levels.components import component
from levels.constants import HBAR, C, H
from levels.decays import Decay, driven_decay, frequency_mhz_of
from levels.errors import OutsideValidity
from levels.geometry import Complex, Vector, as_direction, as_polarisation, as_vector
from levels.records import Atom, Line
from levels.sublevels import constants_of, find_sublevel, zero_field_mhz

Label = tuple[int, int]
W_PER_M2 = 10.0  # 1 mW/cm2
LARGEST_INTENSITY = 1e12  # mW/cm2; far beyond it an atom ionises
LARGEST_OFFSET_MHZ = 1e7


@dataclass(frozen=True, slots=True, eq=False)
class Beam:
    """One travelling wave on one line.

    `offset_mhz` is the laser frequency minus that of the line's centroid. `linewidth_mhz` is the full width of the
    laser's Lorentzian line. `wanted_q` and `wanted_F` (doubled lower and upper F) say what the beam is meant to drive.
    """

    name: str
    line: Line
    direction: Vector
    polarisation: Complex
    offset_mhz: float
    intensity_mw_per_cm2: float
    linewidth_mhz: float = 0.0
    wanted_q: int | None = None
    wanted_F: tuple[int, int] | None = None


@dataclass(frozen=True, slots=True, eq=False)
class Scheme:
    """Beams on one atom in a field (a laboratory vector in gauss)."""

    atom: Atom
    beams: tuple[Beam, ...]
    field_gauss: Vector


def make_beam(
    name: str,
    line: Line,
    direction: ArrayLike,
    polarisation: ArrayLike,
    offset_mhz: float,
    intensity_mw_per_cm2: float,
    *,
    linewidth_mhz: float = 0.0,
    wanted_q: int | None = None,
    wanted_F: tuple[int, int] | None = None,
) -> Beam:
    """Check a beam's numbers and make it; the polarisation is a laboratory vector across the beam."""
    k = as_direction("direction", direction)
    if line.photons != 1:
        raise OutsideValidity("line", line.name, "a one-photon line")
    _within("intensity", intensity_mw_per_cm2, 0.0, LARGEST_INTENSITY, "mW/cm2")
    _within("offset", offset_mhz, -LARGEST_OFFSET_MHZ, LARGEST_OFFSET_MHZ, "MHz from the line's centroid")
    _within("linewidth", linewidth_mhz, 0.0, LARGEST_OFFSET_MHZ, "MHz")
    vector = as_polarisation(k, polarisation)
    return Beam(name, line, k, vector, offset_mhz, intensity_mw_per_cm2, linewidth_mhz, wanted_q, wanted_F)


def _within(name: str, value: float, low: float, high: float, unit: str) -> None:
    if not low <= value <= high:
        raise OutsideValidity(name, value, f"from {low:g} to {high:g} {unit}")


def make_scheme(atom: Atom, beams: Sequence[Beam], field_gauss: ArrayLike) -> Scheme:
    """Put beams and a field together."""
    names = [beam.name for beam in beams]
    repeated = next((name for name in names if names.count(name) > 1), None)
    if repeated is not None:
        raise OutsideValidity("beam", repeated, "names that differ from beam to beam")
    return Scheme(atom, tuple(beams), as_vector("field", field_gauss))


def with_field(scheme: Scheme, field_gauss: ArrayLike) -> Scheme:
    """Return the scheme in another field."""
    return replace(scheme, field_gauss=as_vector("field", field_gauss))


def with_beam(scheme: Scheme, name: str, **changes: object) -> Scheme:
    """Return the scheme with one beam changed in the named attributes."""
    beams = tuple(replace(beam, **changes) if beam.name == name else beam for beam in scheme.beams)  # type: ignore[arg-type]
    return replace(scheme, beams=beams)


def offset_of_hyperfine(line: Line, lower_twice_F: int, upper_twice_F: int, detuning_mhz: float = 0.0) -> float:
    """Return the offset of a laser that is detuned from the zero-field hyperfine component F - F'."""
    below, above = constants_of(line.lower), constants_of(line.upper)
    find_sublevel(below, lower_twice_F, lower_twice_F % 2)
    find_sublevel(above, upper_twice_F, upper_twice_F % 2)
    return zero_field_mhz(above, upper_twice_F) - zero_field_mhz(below, lower_twice_F) + detuning_mhz


def offset_of_component(
    line: Line, lower: Label, upper: Label, field_magnitude_gauss: float, detuning_mhz: float = 0.0
) -> float:
    """Return the offset of a laser that is detuned from one Zeeman component at a field."""
    return component(line, lower, upper, field_magnitude_gauss).offset_mhz + detuning_mhz


def intensity_of_power(power_mw: float, waist_mm: float) -> float:
    """Compute the peak intensity 2P/(pi w^2) in mW/cm2 of a Gaussian beam; the waist is the 1/e^2 radius.

    >>> round(intensity_of_power(1.0, 1.0), 4)
    63.662
    """
    _within("power", power_mw, 0.0, LARGEST_INTENSITY, "mW")
    _within("waist", waist_mm, 1e-4, 1e5, "mm")
    return float(2 * power_mw / (np.pi * (0.1 * waist_mm) ** 2))


def saturation_intensity(line: Line, decay: Decay) -> float:
    """Compute the intensity in mW/cm2 at which a component of unit strength has 2 (Omega/Gamma)^2 = 1.

    It is pi h c Gamma/(3 lambda^3) times Gamma/A, the usual two-level value for a line that is the only decay.
    """
    wavelength_m = C / (frequency_mhz_of(line) * 1e6)
    two_level = np.pi * H * C * decay.total_per_s / (3 * wavelength_m**3)
    return float(two_level * decay.total_per_s / decay.rate_of(line) / W_PER_M2)


def intensity_of_saturation(atom: Atom, line: Line, saturation: float) -> float:
    """Return the intensity in mW/cm2 of a saturation parameter I/I_sat = 2 (Omega_ref/Gamma)^2 on resonance."""
    _within("saturation", saturation, 0.0, 1e12, "times the saturation intensity")
    return saturation * saturation_intensity(line, driven_decay(atom, line))


def reference_rabi_mhz(line: Line, decay: Decay, intensity_mw_per_cm2: float) -> float:
    """Compute Omega_ref/2pi in MHz: the Rabi frequency of a component of unit strength driven purely."""
    omega = 2e6 * np.pi * frequency_mhz_of(line)
    square = 6 * np.pi * C**2 * intensity_mw_per_cm2 * W_PER_M2 * decay.rate_of(line) / (HBAR * omega**3)
    return float(np.sqrt(square) / (2e6 * np.pi))
