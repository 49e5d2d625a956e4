"""What beams drive: detunings, Rabi frequencies, scattering rates, wanted components, other lines."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from levels.beams import (
    intensity_of_power,
    intensity_of_saturation,
    make_beam,
    make_scheme,
    offset_of_component,
    offset_of_hyperfine,
)
from levels.components import component
from levels.constants import HBAR, C
from levels.driven import components_driven, drive_of, other_lines
from levels.errors import OutsideValidity
from tests.levels.pumping_records import CA40, RB87_D2, beam, simple_atom

LINE = RB87_D2.lines[0]
CYCLING = ((4, 4), (6, 6))


def test_cycling_component_at_saturation():
    """At I = I_sat the cycling component has Omega = Gamma/sqrt2 and, on resonance, scatters Gamma/2 (low-saturation
    formula; definition of the saturation intensity in Steck, Rubidium 87 D Line Data)."""
    offset = offset_of_component(LINE, *CYCLING, 2.0)
    intensity = intensity_of_saturation(RB87_D2, LINE, 1.0)
    scheme = make_scheme(RB87_D2, [beam(RB87_D2, offset_mhz=offset, intensity=intensity)], (0, 0, 2.0))
    table = components_driven(drive_of(scheme), "a")
    assert (table.lower_twice_F[0], table.lower_twice_m[0], table.upper_twice_F[0]) == (4, 4, 6)
    width = 1 / (2 * np.pi * 26.2348e-3)
    assert table.rabi_mhz[0] == pytest.approx(width / np.sqrt(2))
    assert table.detuning_mhz[0] == pytest.approx(0.0, abs=1e-9)
    assert table.scattering_per_s[0] == pytest.approx(0.5 / 26.2348e-9)


@given(st.floats(0.0, 50.0), st.floats(-500.0, 500.0))
def test_detunings_are_laser_minus_component(field, offset):
    """Every row's detuning is the laser's offset minus that component's at the field, and q runs over those present."""
    scheme = make_scheme(RB87_D2, [beam(RB87_D2, offset_mhz=offset, light=30.0, direction=(1, 0, 1))], (0, 0, field))
    table = components_driven(drive_of(scheme), "a")
    k = table.q.size // 2
    pair = [
        (int(f[k]), int(m[k]))
        for f, m in ((table.lower_twice_F, table.lower_twice_m), (table.upper_twice_F, table.upper_twice_m))
    ]
    assert table.detuning_mhz[k] == pytest.approx(offset - component(LINE, *pair, field).offset_mhz, abs=1e-6)
    assert set(table.q.tolist()) == {-1, 0, 1}


def test_wanted_and_unwanted_components():
    """A beam meant for sigma+ on 2 - 3, 5 degrees off the field, also drives pi and sigma- near resonance."""
    offset = offset_of_hyperfine(LINE, 4, 6)
    tilted = (np.sin(np.radians(5)), 0, np.cos(np.radians(5)))
    light = beam(RB87_D2, offset_mhz=offset, direction=tilted, wanted_q=1, wanted_F=(4, 6))
    table = components_driven(drive_of(make_scheme(RB87_D2, [light], (0, 0, 1.0))), "a")
    assert set(table.q[table.wanted].tolist()) == {1}
    near = table.unwanted_within(1.0)
    assert set(table.q[near].tolist()) == {0, -1}
    assert set(table.upper_twice_F[near].tolist()) == {6}
    assert {4, 2} <= set(table.upper_twice_F[table.unwanted_within(100.0)].tolist())


def test_other_lines_of_an_ion():
    """A 397 nm beam also reaches no other E1 line within a fifth of its frequency; one at 866 nm neither."""
    assert other_lines(CA40, beam(CA40, "blue")) == []


def test_other_lines_scatter_off_resonance():
    """Light of the D1 line scatters on D2 at Omega^2 Gamma/(4 Delta^2), the far-detuned limit."""
    from dataclasses import replace

    from tests.records_for_tests import quantity

    atom = simple_atom(0, 2)
    second = replace(atom.lines[0], name="795", upper=replace(atom.levels[1], name="f"),
                     centroid=quantity(atom.lines[0].centroid.value - 7e6, unit="MHz"))  # fmt: skip
    both = replace(atom, lines=(*atom.lines, second))
    (found,) = other_lines(both, beam(both, "780", intensity=5.0))
    width = 1 / (2 * np.pi * 26.2348e-3)
    assert found.detuning_mhz == pytest.approx(7e6)
    assert found.scattering_per_s == pytest.approx(2e6 * np.pi * found.rabi_mhz**2 * width / (4 * 7e6**2), rel=1e-6)
    assert other_lines(both, beam(both, "780"), lower_levels=["nowhere"]) == []


def test_peak_intensity_of_a_gaussian_beam():
    """Integrating I0 exp(-2 r^2/w^2) over the plane gives back the power."""
    r = np.linspace(0, 1.0, 20001)  # cm
    profile = intensity_of_power(3.0, 1.5) * np.exp(-2 * r**2 / 0.15**2) * 2 * np.pi * r
    assert np.trapezoid(profile, r) == pytest.approx(3.0, rel=1e-6)


def test_quadrupole_line_agrees_with_the_tensor_formula():
    """hbar Omega = (e E0 omega/2c) |r_i r_j S_ij| with S = (eps k + k eps)/2, and A = (4 alpha omega^5/15 c^4) summed
    |r^2 C2_q|^2 /4 (James, Appl. Phys. B 66, 181 (1998)), give Omega^2 = 20 pi c^2 I A |S_q|^2/(hbar omega^3)."""
    line = CA40.lines[2]  # S1/2 - D3/2
    scheme = make_scheme(CA40, [beam(CA40, "E2", intensity=1e6, direction=(1, 0, 1), light=0.0)], (0, 0, 1.0))
    drive = drive_of(scheme)
    coupling, m = drive.couplings[0], drive.structure.twice_m
    omega = 2e6 * np.pi * line.centroid.value
    S_q = np.array(
        [1 / 16, 0, 3 / 8, 0, 1 / 16]
    )  # squares for k = (1,0,1)/sqrt2, eps = (-1,0,1)/sqrt2: S = diag(-1,0,1)/2
    square = 20 * np.pi * C**2 * 1e7 / (1.1998 * HBAR * omega**3) * S_q / (4e12 * np.pi**2)
    amplitude = drive.structure.amplitudes["E2"]
    up, low = np.nonzero(np.abs(coupling.rabi_mhz))
    q = (m[coupling.upper][up] - m[coupling.lower][low]) // 2
    assert np.abs(coupling.rabi_mhz[up, low]) ** 2 == pytest.approx(square[q + 2] * amplitude[up, low] ** 2)


@pytest.mark.parametrize(
    ("make", "parameter"),
    [
        (lambda: make_beam("a", LINE, (0, 0, 1), (1, 0, 0), 0.0, -1.0), "intensity"),
        (lambda: make_beam("a", LINE, (0, 0, 1), (1, 0, 0), float("nan"), 1.0), "offset"),
        (lambda: make_beam("a", LINE, (0, 0, 1), (0, 0, 1), 0.0, 1.0), "polarisation"),
        (lambda: make_beam("a", LINE, (0, 0, 1), (1, 0, 0), 0.0, 1.0, linewidth_mhz=-1), "linewidth"),
        (lambda: intensity_of_power(-1.0, 1.0), "power"),
        (lambda: intensity_of_power(1.0, 0.0), "waist"),
        (lambda: intensity_of_saturation(RB87_D2, LINE, float("inf")), "saturation"),
        (lambda: make_scheme(RB87_D2, [beam(RB87_D2), beam(RB87_D2)], (0, 0, 0)), "beam"),
        (lambda: drive_of(make_scheme(RB87_D2, [], (0, 0, 0))), "beams"),
        (lambda: make_scheme(RB87_D2, [beam(RB87_D2)], (0, float("nan"), 0)), "field"),
    ],
)
def test_impossible_beams_name_their_parameter(make, parameter):
    """Negative powers, numbers that are not finite, longitudinal polarisations: each is refused by name."""
    with pytest.raises(OutsideValidity) as caught:
        make()
    assert caught.value.parameter == parameter
