"""What a Gaussian beam makes of a light shift: depth, oscillation frequencies, sag, heating.

The beam has power P and 1/e^2 radii w_x, w_y, so that its peak intensity is 2P/(pi w_x w_y). A sublevel whose shift
there is negative is trapped at the focus, with depth U equal to the shift's size and, for an atom of mass M,

    omega_x = sqrt(4U/(M w_x^2)),   omega_z = sqrt(U (1/z_x^2 + 1/z_y^2)/M),   z_x = pi w_x^2/lambda

(harmonic near the bottom). Retro-reflected with the same polarisation it is a lattice: four times the intensity at the
antinodes and omega_axial = k sqrt(2U/M) along it. Grimm, Weidemueller, Ovchinnikov, Adv. At. Mol. Opt. Phys. 42, 95
(2000). Each scattered photon adds two recoil energies on average, shared as in a harmonic trap (3 kT per atom).
Neglected: saturation, aberrations, gravity's effect on the frequencies (its sag is given), and heating by noise.
"""

from dataclasses import dataclass

import numpy as np
from scipy.constants import g as STANDARD_GRAVITY

from levels.constants import KB, H, U
from levels.errors import OutsideValidity

HZ = 1e6  # per MHz
LATTICE_GAIN = 4.0


@dataclass(frozen=True, slots=True)
class GaussianBeam:
    """A focused beam: power in mW and 1/e^2 radii at the focus in micrometres, alone or retro-reflected."""

    power_mw: float
    waist_x_um: float
    waist_y_um: float
    retro_reflected: bool = False

    @property
    def peak_intensity_mw_per_cm2(self) -> float:
        """The peak intensity of the travelling wave, times four at the antinodes of a lattice.

        >>> round(GaussianBeam(1000.0, 50.0, 50.0).peak_intensity_mw_per_cm2 * 1e-6, 4)  # kW/cm2
        25.4648
        """
        one = 2 * self.power_mw / (np.pi * self.waist_x_um * self.waist_y_um * 1e-8)
        return float(one * (LATTICE_GAIN if self.retro_reflected else 1.0))


@dataclass(frozen=True, slots=True)
class DipoleTrap:
    """A trap of one sublevel at the focus; frequencies in Hz, energies in MHz and microkelvin.

    Where the shift is positive the focus repels: `trapped` is False and depth, frequencies and sag are None. `sag_um`
    is how far gravity pulls an atom along x (radially), `tilted` whether it outweighs the trap's largest force there.
    """

    trapped: bool
    depth_mhz: float | None
    depth_uk: float | None
    depth_recoils: float | None
    frequency_x_hz: float | None
    frequency_y_hz: float | None
    frequency_axial_hz: float | None
    rayleigh_range_um: float
    sag_um: float | None
    tilted: bool | None
    recoil_hz: float
    heating_uk_per_s: float


def make_beam(
    power_mw: float, waist_um: float, waist_y_um: float | None = None, retro_reflected: bool = False
) -> GaussianBeam:
    """Check a beam's numbers and make it."""
    other = waist_um if waist_y_um is None else waist_y_um
    bounds = (
        ("power", power_mw, 0.0, 1e8, "mW"),
        ("waist", waist_um, 0.1, 1e5, "um"),
        ("waist", other, 0.1, 1e5, "um"),
    )
    for name, value, low, high, unit in bounds:
        if not low <= value <= high:
            raise OutsideValidity(name, value, f"from {low:g} to {high:g} {unit}")
    return GaussianBeam(power_mw, waist_um, other, retro_reflected)


def recoil_hz(wavelength_nm: float, mass_u: float) -> float:
    """Compute the recoil energy over h, h/(2 M lambda^2), in Hz.

    >>> round(recoil_hz(1064.0, 86.909180531), 1)
    2027.8
    """
    return float(H / (2 * mass_u * U * (wavelength_nm * 1e-9) ** 2))


def dipole_trap(
    beam: GaussianBeam, wavelength_nm: float, shift_mhz: float, scattering_per_s: float, mass_u: float
) -> DipoleTrap:
    """Compute the trap of a sublevel whose shift at the beam's peak intensity is `shift_mhz`.

    `scattering_per_s` is the rate at which it scatters there.
    """
    lambda_m, mass = wavelength_nm * 1e-9, mass_u * U
    w_x, w_y = beam.waist_x_um * 1e-6, beam.waist_y_um * 1e-6
    z_x, z_y = np.pi * w_x**2 / lambda_m, np.pi * w_y**2 / lambda_m
    recoil = recoil_hz(wavelength_nm, mass_u)
    heating = 2 * recoil * H * scattering_per_s / (3 * KB) * 1e6
    mean_range = float(np.sqrt(2 / (1 / z_x**2 + 1 / z_y**2)) * 1e6)
    if shift_mhz >= 0:
        return DipoleTrap(False, None, None, None, None, None, None, mean_range, None, None, recoil, heating)
    energy = -shift_mhz * HZ * H
    omega_x, omega_y = np.sqrt(4 * energy / mass) / w_x, np.sqrt(4 * energy / mass) / w_y
    omega_z = np.sqrt(energy * (1 / z_x**2 + 1 / z_y**2) / mass)
    if beam.retro_reflected:
        omega_z = np.hypot(omega_z, 2 * np.pi / lambda_m * np.sqrt(2 * energy / mass))
    steepest = energy / (w_x * np.sqrt(np.e) / 2)
    return DipoleTrap(
        True,
        -shift_mhz,
        energy / KB * 1e6,
        -shift_mhz * HZ / recoil,
        float(omega_x / (2 * np.pi)),
        float(omega_y / (2 * np.pi)),
        float(omega_z / (2 * np.pi)),
        mean_range,
        float(STANDARD_GRAVITY / omega_x**2 * 1e6),
        bool(mass * STANDARD_GRAVITY > steepest),
        recoil,
        heating,
    )
