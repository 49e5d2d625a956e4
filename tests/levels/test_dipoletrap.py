"""Traps of Gaussian beams: frequencies as derivatives of the potential, energies, gravity."""

import numpy as np
import pytest

from levels.constants import KB, H, U
from levels.dipoletrap import dipole_trap, make_beam, recoil_hz
from levels.errors import OutsideValidity

MASS_U, LAMBDA_NM = 86.909180531, 1064.0


def potential(x: float, y: float, z: float, depth: float, w_x: float, w_y: float, lattice: bool) -> float:
    """-U I(r)/I_peak of an elliptical Gaussian beam, from its textbook intensity; a lattice multiplies by cos^2 kz."""
    k = 2 * np.pi / (LAMBDA_NM * 1e-9)
    s_x, s_y = 1 + (2 * z / (k * w_x**2)) ** 2, 1 + (2 * z / (k * w_y**2)) ** 2
    beam = np.exp(-2 * x**2 / (w_x**2 * s_x) - 2 * y**2 / (w_y**2 * s_y)) / np.sqrt(s_x * s_y)
    return float(-depth * beam * (np.cos(k * z) ** 2 if lattice else 1.0))


@pytest.mark.parametrize("lattice", [False, True])
def test_frequencies_are_the_curvatures_of_the_potential(lattice: bool) -> None:
    """omega^2 = U''/M along each axis, by differences of the intensity of an elliptical beam."""
    beam = make_beam(1000.0, 50.0, 20.0, lattice)
    trap = dipole_trap(beam, LAMBDA_NM, -20.0, 0.0, MASS_U)
    depth = 20e6 * H
    for axis, frequency, step in (
        (0, trap.frequency_x_hz, 1e-8),
        (1, trap.frequency_y_hz, 1e-8),
        (2, trap.frequency_axial_hz, 1e-10 if lattice else 1e-6),
    ):
        at = np.zeros(3)
        at[axis] = step
        moved = potential(*at, depth, 50e-6, 20e-6, lattice) - potential(0, 0, 0, depth, 50e-6, 20e-6, lattice)
        assert frequency == pytest.approx(np.sqrt(2 * moved / step**2 / (MASS_U * U)) / (2 * np.pi), rel=1e-3)


def test_energies_in_every_unit() -> None:
    """20.837 MHz is 1 mK; the recoil of 87Rb at 1064 nm is 2.03 kHz; the lattice is four times as intense."""
    trap = dipole_trap(make_beam(1000.0, 50.0), LAMBDA_NM, -20.836619, 100.0, MASS_U)
    assert trap.depth_uk == pytest.approx(1000.0, rel=1e-6)
    assert trap.depth_recoils == pytest.approx(20.836619e6 / recoil_hz(LAMBDA_NM, MASS_U))
    assert trap.heating_uk_per_s == pytest.approx(2 * trap.recoil_hz * H * 100 / (3 * KB) * 1e6)
    plain, lattice = (make_beam(10.0, 30.0, None, retro).peak_intensity_mw_per_cm2 for retro in (False, True))
    assert plain == pytest.approx(2 * 10.0 / (np.pi * (30e-4) ** 2))
    assert lattice == pytest.approx(4 * plain)


def test_gravity() -> None:
    """The sag is g/omega^2, and a trap whose steepest slope is less than the weight is tilted open."""
    deep = dipole_trap(make_beam(1000.0, 50.0), LAMBDA_NM, -1.0, 0.0, MASS_U)
    assert deep.frequency_x_hz is not None
    assert deep.sag_um == pytest.approx(9.80665 / (2 * np.pi * deep.frequency_x_hz) ** 2 * 1e6)
    assert deep.tilted is False
    # At the steepest point, w/2, the slope is 2U/(w sqrt e); it equals M g here at U/h = 4.4 kHz.
    least = MASS_U * U * 9.80665 * 50e-6 * np.sqrt(np.e) / 2 / H * 1e-6
    assert dipole_trap(make_beam(1.0, 50.0), LAMBDA_NM, -0.999 * least, 0.0, MASS_U).tilted is True
    assert dipole_trap(make_beam(1.0, 50.0), LAMBDA_NM, -1.001 * least, 0.0, MASS_U).tilted is False


def test_light_to_the_blue_does_not_trap() -> None:
    """A positive shift makes no trap: what does not exist is None."""
    none = dipole_trap(make_beam(1000.0, 50.0), 700.0, 5.0, 10.0, MASS_U)
    assert not none.trapped
    assert none.depth_uk is None
    assert none.frequency_x_hz is None
    assert none.heating_uk_per_s > 0


def test_impossible_beams_are_refused() -> None:
    """Negative powers and waists below the wavelength's order are refused by name."""
    with pytest.raises(OutsideValidity, match="power"):
        make_beam(-1.0, 50.0)
    with pytest.raises(OutsideValidity, match="waist"):
        make_beam(1.0, 50.0, 0.0)
