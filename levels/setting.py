"""Light and field of one question: wavelength, beam angle, polarisation ellipse and magnetic field.

The beam makes an angle theta with the field's axis z. Its ellipse has ellipticity chi, from -45 to 45 degrees
(helicity -1 to 1), and its long axis the azimuth psi from the plane of beam and field. Then the share of the light
along the field and the circularity along it are

    p = sin^2 theta (cos^2 chi cos^2 psi + sin^2 chi sin^2 psi),    C = sin 2chi cos theta

and the fractions that drive sigma-, pi, sigma+ are (1-p-C)/2, p, (1-p+C)/2.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from levels.constants import MHZ_NM
from levels.errors import OutsideValidity
from levels.lightshift import Light, drive_of
from levels.polarisability import as_wavelengths

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Setting:
    """Vacuum wavelength in nm, angles in degrees, field along z in gauss."""

    wavelength_nm: float
    beam_angle_deg: float = 90.0
    ellipticity_deg: float = 0.0
    azimuth_deg: float = 0.0
    field_gauss: float = 0.0

    @property
    def frequency_mhz(self) -> float:
        """The light's frequency."""
        return MHZ_NM / self.wavelength_nm

    @property
    def along(self) -> float:
        """The share p of the light along the field."""
        return float(np.sin(np.radians(self.beam_angle_deg)) ** 2 * _tilt(self.ellipticity_deg, self.azimuth_deg))

    @property
    def circularity(self) -> float:
        """The degree of circularity C along the field."""
        return float(np.sin(2 * np.radians(self.ellipticity_deg)) * np.cos(np.radians(self.beam_angle_deg)))

    @property
    def fractions(self) -> Array:
        """The fractions that drive sigma-, pi and sigma+."""
        p, C = self.along, self.circularity
        return np.array([(1 - p - C) / 2, p, (1 - p + C) / 2])

    def light(self, intensity_mw_per_cm2: float) -> Light:
        """Return the light with its amplitudes."""
        drive = drive_of(self.beam_angle_deg, self.ellipticity_deg, self.azimuth_deg)
        return Light(self.wavelength_nm, intensity_mw_per_cm2, drive)

    def slopes_per_deg(self) -> dict[str, tuple[float, float]]:
        """Return dp and dC per degree of each angle."""
        theta, chi, psi = np.radians([self.beam_angle_deg, self.ellipticity_deg, self.azimuth_deg])
        square, degree = np.sin(theta) ** 2, np.pi / 180
        tilt = _tilt(self.ellipticity_deg, self.azimuth_deg)
        rows = {
            "ellipticity": (-square * np.sin(2 * chi) * np.cos(2 * psi), 2 * np.cos(2 * chi) * np.cos(theta)),
            "azimuth": (-square * np.sin(2 * psi) * np.cos(2 * chi), 0.0),
            "beam_angle": (np.sin(2 * theta) * tilt, -np.sin(2 * chi) * np.sin(theta)),
        }
        return {name: (float(p * degree), float(C * degree)) for name, (p, C) in rows.items()}


def _tilt(ellipticity_deg: float, azimuth_deg: float) -> float:
    chi, psi = np.radians(ellipticity_deg), np.radians(azimuth_deg)
    return float(np.cos(chi) ** 2 * np.cos(psi) ** 2 + np.sin(chi) ** 2 * np.sin(psi) ** 2)


def make_setting(
    wavelength_nm: float,
    beam_angle_deg: float = 90.0,
    ellipticity_deg: float = 0.0,
    azimuth_deg: float = 0.0,
    field_gauss: float = 0.0,
) -> Setting:
    """Check the numbers and make a setting.

    >>> make_setting(1064.0).fractions.tolist()
    [0.0, 1.0, 0.0]
    """
    as_wavelengths(wavelength_nm)
    if not 0 <= beam_angle_deg <= 180:
        raise OutsideValidity("beam_angle", beam_angle_deg, "from 0 to 180 degrees")
    if not -45 <= ellipticity_deg <= 45:
        raise OutsideValidity("ellipticity", ellipticity_deg, "from -45 (helicity -) to 45 (helicity +) degrees")
    if not -360 <= azimuth_deg <= 360:
        raise OutsideValidity("azimuth", azimuth_deg, "from -360 to 360 degrees")
    return Setting(wavelength_nm, beam_angle_deg, ellipticity_deg, azimuth_deg, field_gauss)
