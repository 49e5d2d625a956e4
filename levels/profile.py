"""The shape of a line in a vapour: the Voigt profiles of all its components, added up.

Each component is a Lorentzian of its natural width, broadened by the light's power, folded with the Gaussian of the
atoms' velocities (`scipy.special.voigt_profile`). Neglected: collisions, optical pumping, light narrower or broader
than what is asked, the thickness of the vapour.
"""

from collections.abc import Sequence

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.special import voigt_profile

from levels.errors import NotPublished, OutsideValidity
from levels.features import FWHM_OF_DOPPLER, Features

Array = NDArray[np.float64]
AT_ONCE = 2_000_000  # numbers of one piece of a long grid


def power_width_mhz(natural_mhz: float, saturation: float) -> float:
    """Compute the power-broadened Lorentzian width, natural width times sqrt(1 + s) with s = I/I_sat of the component.

    >>> power_width_mhz(6.0, 3.0)
    12.0
    """
    if not 0 <= saturation <= 1e9:
        raise OutsideValidity("saturation", saturation, "from 0 to 1e9 times the saturation intensity")
    return float(natural_mhz * np.sqrt(1.0 + saturation))


def voigt_width_mhz(lorentzian_mhz: float, gaussian_mhz: float) -> float:
    """Estimate the full width at half maximum of a Voigt profile from both its widths, to 0.02 %.

    Olivero and Longbothum, J. Quant. Spectrosc. Radiat. Transfer 17, 233 (1977).
    """
    return float(0.5346 * lorentzian_mhz + np.sqrt(0.2166 * lorentzian_mhz**2 + gaussian_mhz**2))


def profile(parts: Sequence[tuple[Features, float]], detuning_mhz: ArrayLike, saturation: float = 0.0) -> Array:
    """Add up the absorption of several isotopes per MHz on a grid, each with its centroid's offset on that grid.

    The area under the whole profile is 1 when the shares of the isotopes add up to 1.
    """
    grid = np.asarray(detuning_mhz, dtype=np.float64)
    total = np.zeros(grid.shape)
    for found, centroid_mhz in parts:
        if found.natural_mhz is None:
            raise NotPublished("lifetime", f"{found.sample.line.atom} {found.sample.line.upper.name}")
        lines = ~found.is_crossover
        at, weight = centroid_mhz + found.offset_mhz[lines], found.absorption[lines]
        gamma = power_width_mhz(found.natural_mhz, saturation) / 2
        sigma = found.doppler_mhz / FWHM_OF_DOPPLER
        step = max(1, AT_ONCE // at.size)
        for start in range(0, grid.size, step):
            piece = grid[start : start + step]
            total[start : start + step] += voigt_profile(piece[:, None] - at, sigma, gamma) @ weight
    return total
