"""Magneto-optical traps: handedness, detuning and both g factors, against closed forms and known traps."""

import numpy as np
import pytest

from levels.beams import intensity_of_saturation, make_scheme, offset_of_hyperfine
from levels.constants import MU_B_MHZ_PER_GAUSS, C, H, U
from levels.errors import OutsideValidity
from levels.trapcheck import check_trap, coil_field
from tests.levels.pumping_records import RB87_D2, beam, simple_atom

SIX = [(0, 0, 1), (0, 0, -1), (1, 0, 0), (-1, 0, 0), (0, 1, 0), (0, -1, 0)]


def trap(atom, offset, axial="right", radial="left", intensity=0.5):
    beams = [
        beam(atom, offset_mhz=offset, intensity=intensity, direction=k, light=axial if k[2] else radial, name=f"b{n}")
        for n, k in enumerate(SIX)
    ]
    return make_scheme(atom, beams, (0, 0, 0))


def test_field_of_two_coils():
    """The field of the coils has the stated gradient along its axis, minus half of it across, and no divergence."""
    axis = (0, 0, 1)
    assert coil_field(axis, 10.0, (0, 0, 0.1)) == pytest.approx([0, 0, 1.0])
    assert coil_field(axis, 10.0, (0.1, 0, 0)) == pytest.approx([-0.5, 0, 0])
    divergence = sum(coil_field((1, 2, 3), 7.0, np.eye(3)[k])[k] for k in range(3))
    assert divergence == pytest.approx(0.0)


def test_doppler_damping_and_spring_of_two_levels():
    """Weak light on J = 0 - 1: beta = -8 hbar k^2 (delta/Gamma) s0/(1 + (2 delta/Gamma)^2)^2 and
    kappa = (g muB A/hbar k) beta (Metcalf and van der Straten, Laser Cooling and Trapping (1999))."""
    atom, s, delta = simple_atom(0, 2, g_up=1.5), 1e-5, -4.0
    result = check_trap(trap(atom, delta, intensity=intensity_of_saturation(atom, atom.lines[0], s)), 10.0)
    line = atom.lines[0]
    k = 2 * np.pi * line.centroid.value * 1e6 / C
    ratio = delta / (1 / (2 * np.pi * 26.2348e-3))
    mass = 86.909180531 * U
    damping = -8 * (H / (2 * np.pi)) * k**2 * ratio * s / (1 + 4 * ratio**2) ** 2 / mass
    axial = result.axes[0]
    assert axial.damping_per_s == pytest.approx(damping, rel=0.02)
    per_metre = 1.5 * MU_B_MHZ_PER_GAUSS * 10.0 * 100
    expected = damping * per_metre / (line.centroid.value / C)
    assert axial.frequency_per_s2 == pytest.approx(expected, rel=0.02)
    assert result.axes[1].frequency_per_s2 == pytest.approx(expected / 2, rel=0.02)
    assert result.traps
    assert result.cools


@pytest.mark.parametrize(
    ("gradient", "axial", "radial", "detuning", "traps", "cools"),
    [
        (10.0, "right", "left", -10.0, True, True),
        (-10.0, "right", "left", -10.0, False, True),
        (-10.0, "left", "right", -10.0, True, True),
        (10.0, "right", "right", -10.0, False, True),
        (10.0, "right", "left", 10.0, False, False),
    ],
)
def test_handedness_of_a_rubidium_trap(gradient, axial, radial, detuning, traps, cools):
    """87Rb D2: red light, beams along the coil axis of the other handedness than those across, both reversed with the
    current (common practice; Raab et al., Phys. Rev. Lett. 59, 2631 (1987))."""
    offset = offset_of_hyperfine(RB87_D2.lines[0], 4, 6, detuning)
    result = check_trap(trap(RB87_D2, offset, axial, radial), gradient)
    assert (result.traps, result.cools) == (traps, cools)
    assert result.warnings == ()


def test_advice_names_the_axis_to_turn():
    """With all beams of one handedness only the axes across the coils are wrong, and turning them is the advice."""
    offset = offset_of_hyperfine(RB87_D2.lines[0], 4, 6, -10)
    result = check_trap(trap(RB87_D2, offset, "right", "right"), 10.0)
    assert [axis.traps for axis in result.axes] == [True, False, False]
    assert result.axes[0].advice == ""
    assert "reverse the handedness" in result.axes[1].advice
    assert result.axes[1].helicities == {"b2": pytest.approx(1.0), "b3": pytest.approx(1.0)}


def test_negative_g_factor_turns_the_handedness():
    """With both g factors reversed the same coils need the other handedness."""
    good, bad = (trap(simple_atom(2, 4, g_low=0.5 * sign, g_up=0.7 * sign), -6.0) for sign in (1, -1))
    assert check_trap(good, 10.0).traps
    assert not check_trap(bad, 10.0).traps
    assert all(axis.traps_reversed for axis in check_trap(bad, 10.0).axes)


def test_type_two_lines():
    """F' = F - 1 needs the other handedness, and without an upper Zeeman shift nothing traps; dark superpositions are
    pointed out (Tarbutt, New J. Phys. 17, 015007 (2015), recalled)."""
    result = check_trap(trap(simple_atom(4, 2, g_low=0.5, g_up=1.0), -6.0), 10.0)
    assert not result.traps
    assert all(axis.traps_reversed for axis in result.axes)
    assert any("F' <= F" in text for text in result.warnings)
    none = check_trap(trap(simple_atom(4, 2, g_low=0.5, g_up=0.0), -6.0), 10.0)
    assert not any(axis.traps or axis.traps_reversed for axis in none.axes)
    assert all("either handedness" in axis.advice for axis in none.axes)


@pytest.mark.parametrize("gradient", [0.0, float("nan"), 1e6])
def test_impossible_gradients_are_refused(gradient):
    """A trap needs a gradient that is a number and not zero."""
    with pytest.raises(OutsideValidity) as caught:
        check_trap(trap(simple_atom(0, 2), -6.0), gradient)
    assert caught.value.parameter == "gradient"
