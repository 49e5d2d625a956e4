"""Which model is used, optical pumping figures, remedies, purity and cycling checks."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from levels.beams import intensity_of_saturation, make_scheme, offset_of_component, offset_of_hyperfine, with_field
from levels.constants import KB, C, H, U
from levels.cycling import photons_before_leaving
from levels.errors import OutsideValidity
from levels.pumping import best_target, evolve, populations_in, prepare, pump, solve
from levels.purity import purity_against, tilted, with_impurity
from levels.remedies import modulated_scattering, orthogonal, plane_of, scan_field, second_frequency
from tests.levels.pumping_records import CA40, RB87_D1, RB87_D2, SR88, beam, simple_atom
from tests.levels.test_decays import with_lines
from tests.levels.test_steady import DIRECTIONS, GAMMA, JONES
from tests.records_for_tests import quantity

D1, D2 = RB87_D1.lines[0], RB87_D2.lines[0]


def pumping_scheme(field=(0, 0, 1.0), **more):
    """87Rb D1 sigma+ on F = 2 - 2 with repump on 1 - 2, both along the field."""
    beams = [beam(RB87_D1, offset_mhz=offset_of_hyperfine(D1, 4, 4), intensity=0.5, name="pump", **more),
             beam(RB87_D1, offset_mhz=offset_of_hyperfine(D1, 2, 4), intensity=0.5, name="repump", **more)]  # fmt: skip
    return make_scheme(RB87_D1, beams, field)


def ion_scheme(field, angle=0.0, atom=CA40):
    beams = [
        beam(atom, "blue", offset_mhz=-15.0, intensity=30.0, direction=(1, 0, 0), light=angle, name="blue"),
        beam(atom, "red", offset_mhz=10.0, intensity=200.0, direction=(1, 0, 0), light=angle, name="red"),
    ]
    return make_scheme(atom, beams, field)


def test_model_and_reason():
    """One frame: Bloch; two frequencies on one component: rate equations with a beam named; asking for Bloch there is
    refused with the same reason."""
    assert prepare(pumping_scheme()).model == "bloch"
    cool = offset_of_hyperfine(D2, 4, 6)
    beams = [beam(RB87_D2, offset_mhz=cool), beam(RB87_D2, offset_mhz=cool - 10.0, name="second")]
    scheme = make_scheme(RB87_D2, beams, (0, 0, 1.0))
    light = prepare(scheme)
    assert light.model == "rate"
    assert "second" in light.reason or "a" in light.reason
    with pytest.raises(OutsideValidity, match="does not stand still"):
        prepare(scheme, "bloch")
    with pytest.raises(OutsideValidity):
        prepare(scheme, "guess")


def test_rate_equations_would_mislead():
    """In a dark superposition (J = 1 - 1, no field) rate equations still scatter; the Bloch answer warns of it, and the
    rate answer says what it leaves out."""
    atom = simple_atom(2, 2)
    scheme = make_scheme(atom, [beam(atom, light=30.0, direction=(1, 1, 0))], (0, 0, 0.0))
    dark = solve(prepare(scheme))
    assert dark.scattering_per_s == pytest.approx(0.0, abs=1e-3)
    assert dark.rate_scattering_per_s > 1e5
    assert any("would mislead" in text for text in dark.warnings)
    blind = solve(prepare(scheme, "rate"))
    assert any("dark superpositions of g J=1" in text for text in blind.warnings)


def test_rate_equations_hold_in_a_large_field():
    """Where the Larmor precession beats the pumping, Bloch and rate equations agree on the scattering."""
    atom = simple_atom(2, 2)
    scheme = make_scheme(atom, [beam(atom, light=30.0, intensity=0.01, direction=(1, 1, 0))], (0, 0, 0.3))
    outcome = solve(prepare(scheme))
    assert outcome.rate_scattering_per_s == pytest.approx(outcome.scattering_per_s, rel=0.05)
    assert not any("would mislead" in text for text in outcome.warnings)


def test_d1_pumping_ends_in_the_stretched_state():
    """sigma+ on D1 with repump pumps 87Rb into |2,2> and goes dark (figure caption in NeuroImage 199, 598 (2019))."""
    light = prepare(pumping_scheme())
    result = pump(light)
    assert result.target == light.structure.position(D1.lower, (4, 4))
    assert result.purity == pytest.approx(1.0, abs=1e-6)
    assert result.outcome.scattering_per_s < 1.0
    assert 2.0 < result.photons < 12.0
    assert result.slowest_us >= result.mean_time_us > 0


def test_pumping_cost_of_a_stretched_state():
    """Pumping an unpolarised J to |J,J> costs about 2J spontaneous decays (Rochester et al., Phys. Rev. A 94, 043416
    (2016), an order of magnitude): from 0.5 to 2 times that on J -> J."""
    for twice_J in (1, 2, 4, 8):
        atom = simple_atom(twice_J, twice_J, g_low=0.0, g_up=0.0)
        scheme = make_scheme(atom, [beam(atom, intensity=0.01)], (0, 0, 1.0))
        result = pump(prepare(scheme))
        assert 0.5 * twice_J < result.photons < 2.0 * twice_J


def test_heating_is_two_recoils_per_photon():
    """Each photon gives a recoil at absorption and one at emission; as a temperature two thirds of that over kB."""
    result = pump(prepare(pumping_scheme()))
    assert result.recoil_energies == pytest.approx(2 * result.photons)
    recoil = (H / (C / (D1.centroid.value * 1e6))) ** 2 / (2 * 86.909180531 * U)
    assert result.heating_uk == pytest.approx(2e6 / 3 * result.recoil_energies * recoil / KB, rel=1e-9)


def test_time_constants_of_a_single_exponential():
    """Where one rate governs (J = 1/2 - 1/2, weak light) mean time and slowest time are that rate's inverse."""
    atom = simple_atom(1, 1, g_low=0.0, g_up=0.0)
    s = 1e-4
    light = beam(atom, intensity=intensity_of_saturation(atom, atom.lines[0], s))
    result = pump(prepare(make_scheme(atom, [light], (0, 0, 1.0))))
    expected = 1 / (2 / 9 * GAMMA * s / 2)
    assert result.mean_time_us == pytest.approx(expected, rel=1e-3)
    assert result.slowest_us == pytest.approx(expected, rel=1e-3)


def test_both_models_pump_alike_with_pure_light():
    """With light pure along the field rate equations give the pumping figures of the Bloch equations within a few
    percent at low intensity."""
    bloch, rate = (pump(prepare(pumping_scheme(), model)) for model in ("bloch", "rate"))
    assert rate.purity == pytest.approx(bloch.purity, abs=1e-6)
    assert rate.photons == pytest.approx(bloch.photons, rel=0.05)


def test_impurity_and_misalignment_spoil_the_purity():
    """Purity is 1 for clean light and falls with the impurity and with the square of the misalignment."""
    scheme = pumping_scheme(linewidth_mhz=1.0)
    result = purity_against(scheme, D1.lower, (4, 4), [0.0, 0.01, 0.02], [0.0, 2.0, 4.0])
    assert result.purity[0, 0] == pytest.approx(1.0, abs=1e-6)
    loss = 1.0 - result.purity
    assert loss[2, 0] == pytest.approx(2 * loss[1, 0], rel=0.02)
    assert loss[0, 2] == pytest.approx(4 * loss[0, 1], rel=0.02)
    assert result.scattering_per_s[1, 0] > result.scattering_per_s[0, 0]


def test_coherent_pump_and_repump_trap_atoms_between_the_hyperfine_levels():
    """Two perfectly coherent lasers on 1 - 2 and 2 - 2 are in two-photon resonance for m = 0: with a trace of impurity
    atoms gather in that dark superposition, which lasers of some width would not allow."""
    clean, wide = (
        purity_against(pumping_scheme(linewidth_mhz=w), D1.lower, (4, 4), [0.003], [0.0]).purity[0, 0] for w in (0, 1.0)
    )
    assert clean < 0.85
    assert wide > 0.99


@given(JONES, DIRECTIONS, st.floats(0.0, 1.0))
def test_orthogonal_polarisation(jones, direction, impurity):
    """The orthogonal polarisation is across the beam and orthogonal; mixing it in keeps the norm."""
    light = beam(RB87_D2, direction=direction, light=jones)
    other = orthogonal(light)
    assert abs(np.vdot(other, light.polarisation)) < 1e-9
    assert abs(other @ light.direction) < 1e-9
    assert np.linalg.norm(with_impurity(light, impurity).polarisation) == pytest.approx(1.0)


def test_tilted_field_keeps_its_size():
    """A tilt turns the field by the angle without changing its magnitude."""
    field = tilted((0.0, 0.0, 2.0), 8.7)
    assert np.linalg.norm(field) == pytest.approx(2.0)
    assert np.degrees(np.arccos(field[2] / 2.0)) == pytest.approx(8.7)


def test_field_scan_of_an_ion():
    """Linear light along the field leaves m_J = +-3/2 of D3/2 dark; an angle brings the light back; too little field
    does not destabilise the dark states and too much detunes the light, so there is a best field between (Berkeland and
    Boshier, Phys. Rev. A 65, 033413 (2002))."""
    scan = scan_field(ion_scheme((0, 0, 1.0)), [0.01, 0.3, 1.0, 2.0, 5.0, 30.0], [0.0, 30.0, 60.0, 90.0])
    bright = scan.scattering_per_s
    assert bright[:, 0].max() < 1e-3 * bright.max()
    magnitude, angle, rate = scan.best
    assert magnitude in (1.0, 2.0, 5.0)
    assert angle > 0.0
    assert bright[0, 2] < 0.1 * rate
    assert bright[-1, 2] < rate


def test_scan_matches_single_solutions():
    """Each point of the scan is the outcome of the scheme in that field."""
    scheme = ion_scheme((0, 0, 1.0), 20.0)
    plane = plane_of(scheme.beams[0])
    assert plane[0] == pytest.approx([0, -np.sin(np.radians(20.0)), np.cos(np.radians(20.0))])
    scan = scan_field(scheme, [2.0], [50.0])
    a = np.radians(50.0)
    single = solve(prepare(with_field(scheme, 2.0 * (np.cos(a) * plane[0] + np.sin(a) * plane[1]))))
    assert scan.scattering_per_s[0, 0] == pytest.approx(single.scattering_per_s)


def test_modulated_polarisation_brings_light_back():
    """Switching the linear polarisation between two axes at a few MHz defeats the dark states of D3/2 without a field;
    slow switching follows the average of two dark situations."""
    first, second = ion_scheme((0, 0, 0.0), 0.0), ion_scheme((0, 0, 0.0), 90.0)
    slow, good = (modulated_scattering(first, second, rate) for rate in (0.001, 3.0))
    assert good > 4e6
    assert slow < 0.05 * good
    assert solve(prepare(first)).scattering_per_s < 1e-4 * good


def test_modulation_between_equal_schemes_is_the_steady_state():
    """Switching between two equal schemes changes nothing."""
    scheme = ion_scheme((0, 1.0, 2.0), 30.0)
    assert modulated_scattering(scheme, scheme, 1.0) == pytest.approx(solve(prepare(scheme)).scattering_per_s, rel=1e-6)


def test_second_frequency_is_predicted_by_rates():
    """A second polarisation at another frequency empties the dark states as well."""
    scheme = ion_scheme((0, 0, 0.0))
    assert second_frequency(scheme, "red", 5.0) > 1e6
    with pytest.raises(OutsideValidity, match="blue, red"):
        second_frequency(scheme, "green", 5.0)


def test_photons_before_shelving():
    """397 nm alone: an atom scatters 1/(1 - 0.9453) photons of 88Sr+ before it is in D3/2, whatever the light does
    (branching: Likforman et al., Phys. Rev. A 93, 052507 (2016))."""
    for model in ("bloch", "rate"):
        scheme = make_scheme(SR88, [beam(SR88, "blue", offset_mhz=-8.0, intensity=20.0, light=20.0)], (0.5, 0, 1.0))
        result = photons_before_leaving(scheme, model=model)
        assert result.photons == pytest.approx(1 / (1 - 0.9453), rel=1e-6)
        assert [e.name for e in result.exits] == ["D3/2 J=3/2"]


def test_closed_cycle_has_no_end():
    """A J = 0 - 1 line without leaks never loses its atom."""
    atom = simple_atom(0, 2)
    result = photons_before_leaving(make_scheme(atom, [beam(atom)], (0, 0, 1.0)))
    assert result.photons is None
    assert "closed" in result.reason


def test_off_resonant_leak_of_a_cooling_beam():
    """87Rb D2 cooling light of linear polarisation leaks to F = 1 through F' = 2 and 1: photons before leaving are
    those scattered per atom that has arrived in F = 1, as the time evolution counts them."""
    offset = offset_of_hyperfine(D2, 4, 6, -6.0)
    scheme = make_scheme(RB87_D2, [beam(RB87_D2, offset_mhz=offset, intensity=3.0, light=0.0)], (1.0, 0, 0.5))
    result = photons_before_leaving(scheme)
    assert [e.name for e in result.exits] == ["s_2S1/2 F=1"]
    light = prepare(scheme)
    start = populations_in(light.structure)
    start[:3], start[3:8] = 0.0, 0.2
    times = np.linspace(0.0, 60.0, 1500)
    path = evolve(light, times, start)
    photons = np.trapezoid(path.populations[:, 8:].sum(axis=1) * GAMMA, times)
    assert result.photons == pytest.approx(photons / path.populations[-1, :3].sum(), rel=0.03)
    assert 1e3 < result.photons < 1e5


def test_sigma_light_on_the_cycling_line_leaks_by_its_impurity():
    """Started in |2,2>, sigma+ light leaves only by its impurity: half the impurity, twice the photons."""
    offset = offset_of_component(D2, (4, 4), (6, 6), 1.0, -3.0)
    found = []
    for impurity in (0.02, 0.01):
        light = with_impurity(beam(RB87_D2, offset_mhz=offset, intensity=1.0), impurity)
        scheme = make_scheme(RB87_D2, [light], (0, 0, 1.0))
        start = populations_in(prepare(scheme).structure, D2.lower, (4, 4))
        found.append(photons_before_leaving(scheme, start=start).photons)
    assert found[1] == pytest.approx(2 * found[0], rel=0.1)


def test_dark_atoms_never_leave_the_cycle():
    """With a dark sublevel in the cycle no number exists, and the reason says so."""
    atom = with_lines(simple_atom(1, 1), **{"780": {"branching": quantity(0.9)}})
    result = photons_before_leaving(make_scheme(atom, [beam(atom)], (0, 0, 1.0)))
    assert result.photons is None
    assert "dark" in result.reason


def test_populations_are_checked():
    """Start populations are one number per sublevel, not negative, with sum 1."""
    light = prepare(pumping_scheme())
    for wrong in ([1.0], np.full(light.structure.size, 1.0), -populations_in(light.structure)):
        with pytest.raises(OutsideValidity) as caught:
            solve(light, wrong)
        assert caught.value.parameter == "populations"
    assert best_target(solve(light)) == light.structure.position(D1.lower, (4, 4))


def test_metastable_ion_without_repump_ends_in_d():
    """397 nm alone pumps nearly all atoms into D3/2, whose decay over 1.2 s is the only way back."""
    outcome = solve(prepare(make_scheme(CA40, [beam(CA40, "blue", intensity=30.0, light=10.0)], (0.2, 0, 1.0))))
    D = outcome.light.structure.slice_of(CA40.levels[1])
    assert outcome.populations[D].sum() == pytest.approx(1.0, abs=1e-5)
    assert outcome.by_line["E2"] == pytest.approx(1 / 1.1998, rel=1e-4)
