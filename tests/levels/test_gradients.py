"""Polarisation gradients: textbook potentials, limits, and what rules them out."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from levels.beams import intensity_of_saturation, reference_rabi_mhz
from levels.constants import KB, C, H, U
from levels.decays import decay_of
from levels.errors import OutsideValidity
from levels.gradients import check_gradients, wave
from tests.levels.pumping_records import CS133_D2, RB87_D1, RB87_D2, simple_atom

WIDTH = 1 / (2 * np.pi * 26.2348e-3)


def check(atom, component, detuning, saturation, configuration):
    line = atom.lines[0]
    return check_gradients(
        atom, line, component, detuning, intensity_of_saturation(atom, line, saturation), configuration
    )


@given(st.floats(-300.0, -20.0), st.floats(0.1, 3.0))
def test_depth_of_lin_perp_lin(detuning, saturation):
    """J = 1/2 - 3/2: U0 = (2/3) hbar |delta| s0 with s0 = (Omega^2/2)/(delta^2 + Gamma^2/4) of one wave, and
    kB T = hbar Omega^2/(8 |delta|), 3/8 of it (Dalibard and Cohen-Tannoudji, J. Opt. Soc. Am. B 6, 2023 (1989))."""
    result = check(simple_atom(1, 3), (1, 3), detuning, saturation, "lin-perp-lin")
    s0 = saturation / (1 + 4 * detuning**2 / WIDTH**2)
    assert result.saturation == pytest.approx(s0)
    assert result.depth_mhz == pytest.approx(2 / 3 * abs(detuning) * s0, rel=1e-6)
    assert result.temperature_uk == pytest.approx(3 / 8 * result.depth_uk, rel=0.05)
    assert result.works


def test_light_shifts_of_one_to_two():
    """J = 1 - 2 in sigma+ against sigma-: the local field is linear of intensity two; m = 0 along it shifts by 2/3, the
    others by 1/2 of hbar delta s (Clebsch-Gordan coefficients 2/3 and 1/2); nothing changes along z (same source)."""
    result = check(simple_atom(2, 4), (2, 4), -60.0, 1.0, "sigma+sigma-")
    s0 = 1.0 / (1 + 4 * 60.0**2 / WIDTH**2)
    assert result.depth_mhz == 0.0
    assert result.spread_mhz == pytest.approx((2 / 3 - 1 / 2) * 60.0 * s0, rel=1e-6)


def test_sigma_temperature():
    """J = 1 - 2: kB T = hbar Omega^2/|delta| [29/300 + (254/75)(Gamma^2/4)/(delta^2 + Gamma^2/4)] (same source)."""
    atom = simple_atom(2, 4)
    line = atom.lines[0]
    rabi = reference_rabi_mhz(line, decay_of(atom, line.upper), 0.5)
    result = check_gradients(atom, line, (2, 4), -40.0, 0.5, "sigma+sigma-")
    bracket = 29 / 300 + 254 / 75 * (WIDTH**2 / 4) / (40.0**2 + WIDTH**2 / 4)
    assert result.temperature_uk == pytest.approx(H * 1e12 * rabi**2 / 40.0 * bracket / KB, rel=1e-9)
    assert result.cautions == ()


def test_lowest_temperature_is_of_recoils():
    """The floor stated is two recoil energies."""
    result = check(simple_atom(2, 4), (2, 4), -60.0, 0.1, "sigma+sigma-")
    recoil = (H / 780.241e-9) ** 2 / (2 * 86.909180531 * U)
    assert result.lowest_uk == pytest.approx(2e6 * recoil / KB, rel=1e-6)
    assert C > 0


@pytest.mark.parametrize(
    ("atom", "component", "detuning", "configuration", "word"),
    [
        (simple_atom(0, 2), (0, 2), -60.0, "sigma+sigma-", "too few sublevels"),
        (simple_atom(1, 3), (1, 3), -60.0, "sigma+sigma-", "too few sublevels"),
        (simple_atom(2, 4), (2, 4), 60.0, "lin-perp-lin", "red detuning only"),
        (RB87_D1, (4, 4), -30.0, "lin-perp-lin", "blue detuning only"),
    ],
)
def test_what_rules_it_out(atom, component, detuning, configuration, word):
    """Too few sublevels or the wrong side of resonance: no sub-Doppler cooling and no temperature, with the reason
    (gray molasses needs F' <= F and blue light: Weidemueller et al., Europhys. Lett. 27, 109 (1994))."""
    result = check(atom, component, detuning, 1.0, configuration)
    assert not result.works
    assert word in result.reasons[0]
    assert result.temperature_uk is None


def test_gray_molasses_has_no_formula():
    """Blue light on F -> F works, without a closed formula for its temperature."""
    result = check(RB87_D1, (4, 4), 30.0, 1.0, "lin-perp-lin")
    assert result.works
    assert result.temperature_uk is None
    assert any("gray molasses" in text for text in result.cautions)


def test_close_hyperfine_levels_are_pointed_out():
    """133Cs F = 4 - 5 at -120 MHz: F' = 4 is 251.09 MHz away (Gerginov et al., Phys. Rev. Lett. 91, 072501 (2003))."""
    far, near = (check(CS133_D2, (8, 10), detuning, 1.0, "sigma+sigma-") for detuning in (-120.0, -20.0))
    assert any("251.1 MHz" in text for text in far.cautions)
    assert not any("251.1 MHz" in text for text in near.cautions)


def test_field_that_spoils_it():
    """The tolerable field has the Larmor frequency of the light shifts: g_F muB B = spread, g_F = 1/2 for 87Rb."""
    result = check(RB87_D2, (4, 6), -30.0, 1.0, "sigma+sigma-")
    assert result.largest_field_gauss == pytest.approx(result.spread_mhz / (0.4998 * 1.39962449), rel=2e-3)


def test_waves_carry_two_unit_intensities():
    """Two waves of orthogonal polarisations have intensity 2 everywhere; lin perp lin is circular at one place."""
    phases = np.linspace(0, np.pi, 48, endpoint=False)
    for configuration in ("lin-perp-lin", "sigma+sigma-"):
        power = np.array([np.sum(np.abs(wave(configuration, phase)) ** 2) for phase in phases])
        assert power == pytest.approx(np.full(48, 2.0))
    circular = max(np.abs(wave("lin-perp-lin", phase)).max() ** 2 for phase in phases)
    assert circular == pytest.approx(2.0)
    with pytest.raises(OutsideValidity):
        wave("lin-lin", 0.0)


@pytest.mark.parametrize("detuning", [0.0, float("inf")])
def test_impossible_detunings_are_refused(detuning):
    """On resonance there are no light shifts to speak of."""
    with pytest.raises(OutsideValidity) as caught:
        check(simple_atom(1, 3), (1, 3), detuning, 1.0, "lin-perp-lin")
    assert caught.value.parameter == "detuning"
