"""Cooling figures against their definitions, each other and an atom followed in time."""

import math
from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.integrate import solve_ivp

from levels import forces
from levels.angular import component_strength
from levels.components import components
from levels.constants import HBAR, KB, MU_B_MHZ_PER_GAUSS, H
from levels.cooling import Cooling, cooling, cycling_component, force_curve, slower_profile
from levels.cooling_figures import FIGURES, Setting
from levels.errors import OutsideValidity, UnknownName
from levels.propagate import propagate
from levels.records import Atom, Isotope, Line
from tests.records_for_tests import RB87_D1, RB87_D2, level, line, quantity

MASS = quantity(86.909180529, 6e-9, "u")
WIDTH, WAVELENGTH = quantity(6.0666, 0.0018, "MHz"), quantity(780.241209686, 1e-9, "nm")


def dressed(of: Line, width: float = 6.0666, nm: float = 780.241209686, branching: float = 1.0) -> Line:
    upper = replace(of.upper, width=quantity(width, width * 3e-4, "MHz"))
    share = quantity(branching, 0.0)
    return replace(of, upper=upper, wavelength=quantity(nm, 1e-9, "nm"), branching=share)


def atom_of(of: Line, mass: float = 86.909180529, charge: int = 0) -> Atom:
    isotope = Isotope("87Rb", "Rb", charge, 37, 87, of.lower.twice_I, of.lower.name, quantity(mass, 6e-9, "u"))
    return Atom(isotope, (of.lower, of.upper), (of,))


def value(found: Cooling, name: str) -> float:
    number = found.figures[name].value
    assert number is not None, found.figures[name].reason
    return number


D2 = dressed(RB87_D2)
RB = atom_of(D2)
NARROW = dressed(
    line(level(0, 0, name="s"), level(2, 0, g_J=1.5, name="p", spread={"g_J": 1e-6}), multipole="E1"), 0.0075, 689.449
)
SR = atom_of(NARROW, 87.905612)


def test_recoil_is_a_photon_s_momentum() -> None:
    """Velocity, frequency, shift and both temperatures are one momentum told in five ways."""
    found = cooling(RB, D2)
    v, m = value(found, "recoil_velocity") * 1e-3, 86.909180529 * 1.66053906892e-27
    assert v == pytest.approx(H / (m * 780.241209686e-9), rel=1e-9)
    assert value(found, "recoil_frequency") * 1e3 == pytest.approx(m * v**2 / (2 * H), rel=1e-12)
    assert value(found, "recoil_shift") == pytest.approx(2 * value(found, "recoil_frequency"), rel=1e-14)
    assert value(found, "recoil_temperature") * 1e-6 == pytest.approx(m * v**2 / KB, rel=1e-12)
    assert value(found, "recoil_energy_temperature") == pytest.approx(value(found, "recoil_temperature") / 2, rel=1e-14)


def test_doppler_limit_is_the_least_temperature_of_the_molasses() -> None:
    """Over the detuning, hbar Gamma/8 (1 + 4 d^2)/d has its minimum hbar Gamma/2 at half a linewidth."""
    found = cooling(RB, D2)
    limit = value(found, "doppler_temperature")
    assert limit == pytest.approx(HBAR * 2 * math.pi * 6.0666e6 / (2 * KB) * 1e6, rel=1e-12)
    assert value(found, "molasses_temperature") == pytest.approx(limit, rel=1e-12)
    assert value(found, "doppler_detuning") == pytest.approx(-6.0666 / 2)
    for detuning in (-6.0, -3.3, -2.7, -0.5):
        assert value(cooling(RB, D2, Setting(detuning_mhz=detuning)), "molasses_temperature") > limit
    blue = cooling(RB, D2, Setting(detuning_mhz=1.0)).figures["molasses_temperature"]
    assert (blue.value, blue.reason) == (None, "only red detuning (below zero) cools here")


@pytest.mark.parametrize("of", [D2, dressed(RB87_D1, 5.75, 794.979)])
def test_saturation_intensities_follow_from_strengths(of: Line) -> None:
    """Isotropic and far-detuned values are the two-level one over averages of strengths, summed by hand."""
    low, up = (4, 4), (6, 6) if of is D2 else (4, 2)
    found = cooling(atom_of(of), of, component=(low, up))
    lower, upper = of.lower, of.upper
    two_level = value(found, "saturation_intensity") * float(
        component_strength(lower.twice_J, upper.twice_J, 3, low, up)
    )
    assert two_level == pytest.approx(
        math.pi
        * H
        * 299792458
        * 2
        * math.pi
        * of.upper.width.value
        * 1e6
        / (3 * (of.wavelength.value * 1e-9) ** 3)
        / 10,
        rel=1e-12,
    )
    every = [
        (m, m_up, component_strength(lower.twice_J, upper.twice_J, 3, (low[0], m), (up[0], m_up)))
        for m in range(-low[0], low[0] + 1, 2)
        for m_up in range(-up[0], up[0] + 1, 2)
        if abs(m - m_up) <= 2
    ]
    isotropic = sum(float(s) for _, _, s in every) / (3 * (low[0] + 1))
    assert value(found, "saturation_intensity_isotropic") == pytest.approx(two_level / isotropic, rel=1e-12)
    table = components(of, 0.0, 0)
    from_one = (table.lower_twice_F == 4) & (table.lower_twice_m == 2)
    assert value(found, "saturation_intensity_far_detuned") == pytest.approx(
        two_level / float(table.strength[0, from_one].sum()), rel=1e-12
    )


def test_what_leaks_saturates_later() -> None:
    """With half of the decays elsewhere the dipole is weaker: the saturation intensity doubles, its uncertainty too."""
    whole, half = cooling(RB, D2), cooling(atom_of(D2), dressed(RB87_D2, branching=0.5))
    one, two = (found.figures["saturation_intensity"] for found in (whole, half))
    assert two.value == pytest.approx(2 * one.value)
    assert one.uncertainty / one.value == pytest.approx(3e-4, rel=1e-6)
    rate = quantity(1.9e7, 1.9e5, "s-1")
    only_rate = replace(dressed(RB87_D2), branching=None, einstein_A=rate)
    third = cooling(atom_of(only_rate), only_rate).figures["saturation_intensity"]
    assert third.value == pytest.approx(one.value * 2 * math.pi * 6.0666e6 / 1.9e7, rel=1e-12)
    assert third.uncertainty / third.value == pytest.approx(math.hypot(2 * 3e-4, 1e-2), rel=1e-3)
    whole = replace(D2, branching=quantity(1.03, 0.05))  # a rate above the whole width is all of it
    assert cooling(RB, whole).figures["saturation_intensity"].value == pytest.approx(one.value)


@given(st.floats(-30, 30), st.floats(0.01, 50), st.floats(-60, 60))
def test_force_is_momentum_times_rate(detuning: float, intensity: float, velocity: float) -> None:
    """Force, rate and acceleration agree, and equal the two-level formula with the Doppler shift."""
    setting = Setting(detuning_mhz=detuning, intensity_mw_per_cm2=intensity, velocity_m_per_s=velocity)
    found = cooling(RB, D2, setting)
    rate = value(found, "scattering_rate")
    s = intensity / value(found, "saturation_intensity")
    seen = detuning - velocity / 780.241209686e-9 * 1e-6
    assert rate == pytest.approx(math.pi * 6.0666e6 * s / (1 + s + 4 * (seen / 6.0666) ** 2), rel=1e-10)
    assert value(found, "force") == pytest.approx(H / 780.241209686e-9 * rate, rel=1e-12)
    assert value(found, "acceleration") == pytest.approx(value(found, "recoil_velocity") * 1e-3 * rate, rel=1e-12)
    assert rate < value(found, "largest_scattering_rate")


def test_damping_and_spring_constants_are_slopes_of_the_force() -> None:
    """beta and kappa are the derivatives of the two beams' force by velocity and by place, in a field gradient."""
    setting = Setting(detuning_mhz=-9.0, intensity_mw_per_cm2=0.8, gradient_gauss_per_cm=12.0)
    found = cooling(RB, D2, setting)
    m, nm, width = 86.909180529 * 1.66053906892e-27, 780.241209686e-9, 6.0666e6
    s = value(found, "saturation_parameter")
    step = 1e-3
    pull = [forces.molasses_acceleration(m, nm, width, s, -9e6, v) for v in (-step, step)]
    beta = -m * (pull[1] - pull[0]) / (2 * step)
    assert value(found, "damping_constant") == pytest.approx(beta, rel=1e-6)
    assert value(found, "damping_rate") == pytest.approx(beta / m, rel=1e-6)
    place = 1e-6
    shift = value(found, "zeeman_slope") * 1e6 * 12.0 * 100 * place  # Hz at this place
    one = forces.acceleration(m, nm, width, s, -9e6 - shift, 0.0) - forces.acceleration(
        m, nm, width, s, -9e6 + shift, 0.0
    )
    assert value(found, "spring_constant") == pytest.approx(-m * one / place, rel=1e-5)
    assert value(found, "trap_frequency") == pytest.approx(math.sqrt(-one / place) / (2 * math.pi), rel=1e-5)
    assert value(found, "resonance_radius") == pytest.approx(
        9.0 / (value(found, "zeeman_slope") * 12.0) * 10, rel=1e-12
    )
    blue = cooling(RB, D2, replace(setting, detuning_mhz=9.0))
    assert value(blue, "damping_constant") == pytest.approx(-beta, rel=1e-6)
    assert value(blue, "trap_frequency") < 0


def test_slower_profile_keeps_an_atom_resonant() -> None:
    """An atom followed through the field of the slower, with the force of the beam, leaves at the asked speed."""
    setting = Setting(
        initial_speed_m_per_s=300.0, final_speed_m_per_s=40.0, slower_share=0.5, slower_detuning_mhz=-80.0
    )
    found = cooling(RB, D2, setting)
    profile = slower_profile(found, 401)
    assert profile is not None
    length = value(found, "slower_length")
    assert (profile.position_cm[0], profile.position_cm[-1]) == (0.0, pytest.approx(length))
    assert profile.speed_m_per_s[[0, -1]] == pytest.approx([300.0, 40.0])
    assert profile.field_gauss[0] - profile.field_gauss[-1] == pytest.approx(
        value(found, "slower_field_span"), rel=1e-12
    )
    assert profile.field_gauss[0] == pytest.approx(value(found, "slower_field_start"), rel=1e-12)
    assert profile.field_gauss[-1] == pytest.approx(value(found, "slower_field_end"), rel=1e-12)
    fine = slower_profile(found, 20001)
    assert fine is not None
    slope = np.abs(np.diff(fine.field_gauss) / np.diff(fine.position_cm)).max()
    assert slope == pytest.approx(value(found, "slower_largest_gradient"), rel=2e-3)
    m, nm, width, s = 86.909180529 * 1.66053906892e-27, 780.241209686e-9, 6.0666e6, 6.0
    gauss_slope = value(found, "zeeman_slope") * 1e6

    def moves(_: float, state: np.ndarray) -> list[float]:
        place, speed = state
        field = np.interp(place * 100, profile.position_cm, profile.field_gauss)
        seen = -80e6 + speed / nm - gauss_slope * field
        return [speed, -forces.acceleration(m, nm, width, s, seen, 0.0)]

    out = solve_ivp(moves, (0, 0.02), [0.0, 300.0], max_step=2e-6, events=[leaves(length)])
    assert out.t_events[0].size
    behind = 6.0666e6 * math.sqrt((s / 0.5 - 1 - s) / 4) * nm  # where the force is half of its largest value
    assert out.y_events[0][0][1] == pytest.approx(40.0 - behind, abs=1.5)


def leaves(length_cm: float):
    def event(_: float, state: np.ndarray) -> float:
        return float(state[0] * 100 - length_cm)

    event.terminal = True
    return event


def test_capture_velocity_is_what_the_distance_stops() -> None:
    """From the capture velocity the resonant force stops an atom within the asked distance."""
    found = cooling(RB, D2, Setting(distance_cm=1.0))
    v, a = value(found, "capture_velocity"), value(found, "largest_acceleration") / 2
    assert v**2 / (2 * a) == pytest.approx(0.01)
    again = cooling(RB, D2, Setting(initial_speed_m_per_s=v))
    assert value(again, "capture_distance") == pytest.approx(1.0)
    assert value(found, "molasses_velocity") == pytest.approx(6.0666e6 / 2 * 780.241209686e-9)


def test_narrow_lines_are_recognised() -> None:
    """Sr 689 nm (7.5 kHz, recoil 4.8 kHz) is narrow and says so; Rb 780 nm is broad and has no narrow-line figure."""
    narrow, broad = cooling(SR, NARROW), cooling(RB, D2)
    assert (narrow.regime, broad.regime) == ("narrow", "broad")
    assert "the Doppler limit lies below the recoil temperature" in narrow.notes[-1]
    assert value(narrow, "doppler_temperature") < value(narrow, "recoil_temperature")
    bright = cooling(SR, NARROW, Setting(intensity_mw_per_cm2=99 * value(narrow, "saturation_intensity")))
    assert value(bright, "narrow_line_temperature") == pytest.approx(
        10 * value(narrow, "doppler_temperature"), rel=1e-9
    )
    assert broad.figures["narrow_line_temperature"].reason == "the line is not narrow"
    assert value(narrow, "acceleration_to_gravity") == pytest.approx(15.8, abs=0.1)


def test_what_a_line_cannot_have_is_null_with_a_reason() -> None:
    """No cycling on J' = J; no trap for an ion; no saturation of a quadrupole line; nothing without a width."""
    d1 = dressed(RB87_D1, 5.75, 794.979)
    assert cycling_component(d1) is None
    found = cooling(atom_of(d1), d1)
    assert "no cycling component" in found.figures["saturation_intensity"].reason
    assert found.figures["saturation_intensity_far_detuned"].value is not None
    ion = cooling(atom_of(D2, charge=1), D2)
    assert ion.figures["trap_frequency"].reason == "an ion is held and slowed by electric fields"
    assert value(ion, "recoil_velocity") > value(cooling(RB, D2), "recoil_velocity")  # an electron lighter
    quadrupole = replace(NARROW, multipole="E2", rank=2, upper=replace(NARROW.upper, twice_J=4))
    found = cooling(atom_of(quadrupole), quadrupole)
    assert found.figures["saturation_intensity_far_detuned"].reason.startswith("defined here for electric-dipole")
    assert found.figures["recoil_velocity"].value is not None
    hollow = replace(D2, upper=replace(D2.upper, width=None))
    found = cooling(atom_of(hollow), hollow)
    assert found.figures["doppler_temperature"].reason == "the width of the upper level is not in the catalogue"
    assert force_curve(found, "velocity", np.zeros(2)) is None
    assert slower_profile(found, 3) is None
    for figure in found.figures.values():
        assert (figure.value is None) <= bool(figure.reason)
    resonant = cooling(RB, D2, Setting(detuning_mhz=-1e-200))
    assert resonant.figures["molasses_temperature"].value is None


def test_nominal_wavelength_is_owned_up() -> None:
    """A line without a published frequency is answered from its nominal wavelength, with a note and no uncertainty."""
    rough = replace(D2, wavelength=None, nominal_nm=780.2)
    found = cooling(atom_of(rough), rough)
    assert found.notes == ("the frequency of 780 is not in the catalogue: its nominal wavelength is used",)
    assert found.figures["recoil_velocity"].uncertainty is None
    assert "wavelength" in found.figures["recoil_velocity"].reason


def test_slope_counts_a_shared_g_I_once() -> None:
    """Of the stretched component g_I cancels: slope 3/2 g_J' - 1/2 g_J, uncertainty that of both g_J."""
    found = cooling(RB, D2).figures["zeeman_slope"]
    assert found.value == pytest.approx(MU_B_MHZ_PER_GAUSS * (1.5 * 1.3362 - 0.5 * 2.00233113), rel=1e-12)
    assert found.uncertainty == pytest.approx(MU_B_MHZ_PER_GAUSS * math.hypot(1.5 * 0.0013, 0.5 * 2e-8), rel=1e-6)


def test_curves_are_the_figures_along_the_way() -> None:
    """At the setting's own place a curve has the figures' rate and acceleration; two beams cancel at rest."""
    setting = Setting(detuning_mhz=-5.0, intensity_mw_per_cm2=2.0, velocity_m_per_s=3.0)
    found = cooling(RB, D2, setting)
    for against, at in (("velocity", 3.0), ("detuning", -5.0), ("intensity", 2.0)):
        curve = force_curve(found, against, np.array([at]))
        assert curve is not None
        assert curve.scattering_rate_per_s[0] == pytest.approx(value(found, "scattering_rate"), rel=1e-12)
        assert curve.acceleration_m_per_s2[0] == pytest.approx(value(found, "acceleration"), rel=1e-12)
    curve = force_curve(found, "velocity", np.array([-4.0, 0.0, 4.0]))
    assert curve is not None
    assert curve.molasses_acceleration_m_per_s2[1] == 0.0
    assert curve.molasses_acceleration_m_per_s2[0] == -curve.molasses_acceleration_m_per_s2[2] > 0


def test_bad_components_are_refused() -> None:
    """A sublevel that the level does not have, or an m that light does not reach, is refused."""
    with pytest.raises(UnknownName, match="no such sublevel"):
        cooling(RB, D2, component=((8, 0), (6, 0)))
    with pytest.raises(UnknownName, match="no such F"):
        cooling(RB, D2, component=((3, 1), (6, 2)))
    with pytest.raises(OutsideValidity, match="changes m by at most 1"):
        cooling(RB, D2, component=((4, 0), (6, 4)))
    closed = cooling(RB, D2, component=((4, 0), (4, 0)))
    assert closed.figures["saturation_intensity"].reason == "this component has no strength at zero field"


def test_rows_are_documented() -> None:
    """Every row says its formula, where it holds and where the formula stands; names are unique."""
    assert len({row.name for row in FIGURES}) == len(FIGURES)
    for row in FIGURES:
        assert row.name.isidentifier()
        assert row.formula
        assert row.validity
        assert row.source


def test_propagation_is_linear_and_names_what_lacks() -> None:
    """Products add relative uncertainties in quadrature; a constant without one is named only where it matters."""
    inputs = {"a": quantity(3.0, 0.3), "b": quantity(5.0, 0.1), "c": quantity(7.0)}
    found = propagate(lambda x: x["a"] * x["b"] ** 2, inputs)
    assert found.uncertainty == pytest.approx(75 * math.hypot(0.1, 2 * 0.02), rel=1e-12)
    assert found.lacking == ()
    found = propagate(lambda x: x["a"] / x["c"], inputs)
    assert (found.uncertainty, found.lacking) == (None, ("c",))
