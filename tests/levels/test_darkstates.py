"""Dark states: textbook counts and vectors, what turns them, and two-photon resonances."""

import numpy as np
import pytest
from hypothesis import assume, given
from hypothesis import strategies as st

from levels.beams import make_scheme, offset_of_hyperfine
from levels.darkstates import lower_manifolds, raman_pairs, stationary_dark
from levels.driven import drive_of
from levels.frames import frame_of
from levels.jones import ellipse_of, elliptical
from levels.steady import steady_state
from tests.levels.pumping_records import CA40, RB87_D1, RB87_D2, beam, simple_atom
from tests.levels.test_steady import DIRECTIONS, JONES, equations


def manifolds(atom, *beams, field=(0, 0, 0.0)):
    return lower_manifolds(drive_of(make_scheme(atom, beams, field)))


def count(atom, jones, direction=(0, 0, 1)):
    (manifold,) = manifolds(atom, beam(atom, direction=direction, light=jones))
    return len(manifold.dark)


@given(st.integers(1, 9), st.integers(-1, 1), JONES, DIRECTIONS)
def test_counts_of_dark_states(twice_J, step, jones, direction):
    """J -> J-1: two; J -> J: one for integer J, none for half-integer J unless the light is circular; J -> J+1: none;
    for every polarisation (Berkeland and Boshier, Phys. Rev. A 65, 033413 (2002))."""
    assume(twice_J + 2 * step >= 0)
    circular = abs(ellipse_of(jones).ellipticity_deg) > 44.999
    assume(circular or abs(ellipse_of(jones).ellipticity_deg) < 44.0)
    expected = {-1: 2, 0: 1 if twice_J % 2 == 0 or circular else 0, 1: 0}[step]
    assert count(simple_atom(twice_J, twice_J + 2 * step), jones, direction) == expected


@pytest.mark.parametrize(("twice_J", "twice_J_up", "expected"), [(1, 1, 1), (3, 1, 2), (3, 3, 1), (2, 2, 1), (3, 5, 0)])
@pytest.mark.parametrize("hand", ["right", "left"])
def test_circular_light(twice_J, twice_J_up, expected, hand):
    """Circular light leaves outermost sublevels dark: m = J for J -> J, J and J - 1 for J -> J - 1 (same source)."""
    (manifold,) = manifolds(simple_atom(twice_J, twice_J_up), beam(simple_atom(twice_J, twice_J_up), light=hand))
    assert len(manifold.dark) == expected
    sign = 1 if hand == "right" else -1
    outermost = {sign * twice_J, sign * (twice_J - 2)} if twice_J_up < twice_J else {sign * twice_J}
    found = {
        m for state in manifold.dark for (_, m), a in zip(state.labels, state.vector, strict=True) if abs(a) > 1e-9
    }
    assert found == (outermost if expected else set())


@pytest.mark.parametrize(("twice_J", "twice_J_up", "expected"), [(2, 2, {0}), (3, 1, {3, -3}), (4, 2, {4, -4})])
def test_pi_light(twice_J, twice_J_up, expected):
    """Pi light: m = 0 is dark for integer J -> J, m = +-J for J -> J - 1 (same source)."""
    atom = simple_atom(twice_J, twice_J_up)
    (manifold,) = manifolds(atom, beam(atom, direction=(1, 0, 0), light=0.0))
    found = {
        m for state in manifold.dark for (_, m), a in zip(state.labels, state.vector, strict=True) if abs(a) > 1e-9
    }
    assert found == expected


def test_lambda_state_of_one_to_one():
    """J = 1 -> 1 with light polarised across the axis: (|1> + |-1>)/sqrt2, the relative sign by the light's angle."""
    atom = simple_atom(2, 2)
    (manifold,) = manifolds(atom, beam(atom, light=0.0))
    (state,) = manifold.dark
    assert np.abs(state.vector) == pytest.approx([np.sqrt(0.5), 0, np.sqrt(0.5)])
    assert state.is_stationary
    assert "0.7071 |1,-1>" in state.text()


def test_field_turns_a_coherent_dark_state():
    """A superposition of m = +1 and m = -1 leaves the dark subspace at the Zeeman splitting: sqrt<(H - <H>)^2> is
    g muB B."""
    atom = simple_atom(2, 2, g_low=0.5)
    ((state,),) = [m.dark for m in manifolds(atom, beam(atom, light=0.0), field=(0, 0, 2.0))]
    assert state.mixing_mhz == pytest.approx(0.5 * 1.39962449 * 2.0)
    assert not state.is_stationary


def test_single_sublevels_stay_dark_in_the_field_along_them():
    """Dark states that are single sublevels do not move in a field along the axis."""
    atom = simple_atom(3, 1)
    for state in manifolds(atom, beam(atom), field=(0, 0, 5.0))[0].dark:
        assert state.is_stationary


def test_d1_stretched_state_is_dark_and_d2_bright():
    """87Rb: sigma+ light on D1 F = 2 - 2 leaves |2,2> dark; on D2 F = 2 - 3 nothing is dark (D1: figure caption in
    NeuroImage 199, 598 (2019), PMC6988110; D2: common practice, the cycling transition)."""
    for atom, F_up, expected in ((RB87_D1, 4, {4}), (RB87_D2, 6, set())):
        light = beam(atom, offset_mhz=offset_of_hyperfine(atom.lines[0], 4, F_up))
        lit = next(m for m in manifolds(atom, light, field=(0, 0, 0.5)) if m.twice_F == 4)
        states = [{m for (_, m), a in zip(s.labels, s.vector, strict=True) if abs(a) > 1e-6} for s in lit.dark]
        assert set().union(*states) == expected
        assert all(s.residual_per_us < 1e-12 for s in lit.dark)


def test_other_hyperfine_levels_spoil_a_dark_state():
    """87Rb D2 F = 2 - 2 has a dark m = 2 in sigma+ light, but F' = 3, 267 MHz away, excites it at
    Omega^2 Gamma/4 Delta^2."""
    line = RB87_D2.lines[0]
    light = beam(RB87_D2, offset_mhz=offset_of_hyperfine(line, 4, 4), intensity=1.0)
    lit = next(m for m in manifolds(RB87_D2, light) if m.twice_F == 4)
    (state,) = lit.dark
    coupling = drive_of(make_scheme(RB87_D2, [light], (0, 0, 0))).couplings[0]
    width, rabi = coupling.width_mhz[0, 0], np.abs(coupling.rabi_mhz).max()
    expected = 2 * np.pi * rabi**2 * width / (4 * 266.65**2)
    assert state.residual_per_us == pytest.approx(expected, rel=2e-3)


def test_unlit_manifold_is_not_called_dark():
    """Without a repump F = 1 is unlit: no beam within ten widths, no dark vectors, pump rate zero."""
    light = beam(RB87_D2, offset_mhz=offset_of_hyperfine(RB87_D2.lines[0], 4, 6))
    one = next(m for m in manifolds(RB87_D2, light) if m.twice_F == 2)
    assert one.names == ()
    assert one.pump_per_us == 0.0
    assert one.dark == ()


@given(JONES, DIRECTIONS)
def test_dark_states_do_not_absorb(jones, direction):
    """The coupling annihilates each dark vector, and the vectors are orthonormal."""
    atom = simple_atom(5, 3)
    scheme = make_scheme(atom, [beam(atom, direction=direction, light=jones)], (0, 0, 0))
    drive = drive_of(scheme)
    (manifold,) = lower_manifolds(drive)
    vectors = np.array([state.vector for state in manifold.dark])
    assert vectors.conj() @ vectors.T == pytest.approx(np.eye(2), abs=1e-9)
    assert drive.couplings[0].rabi_mhz @ vectors.T == pytest.approx(0.0, abs=1e-9)


def ion(detunings, field, light=30.0):
    blue = beam(CA40, "blue", offset_mhz=detunings[0], intensity=30.0, direction=(1, 0, 0), light=light)
    red = beam(CA40, "red", offset_mhz=detunings[1], intensity=60.0, direction=(1, 0, 0), light=light, name="r")
    return [blue, red], field


def test_shared_dark_states_of_an_ion():
    """40Ca+ 397 and 866 nm at equal detunings and no field: six lower sublevels, two upper, so four stationary dark
    states; off the two-photon resonance only the two of D3/2 remain."""
    for detunings, expected in (((-10.0, -10.0), 4), ((-10.0, 5.0), 2)):
        beams, field = ion(detunings, (0, 0, 0.0))
        drive = drive_of(make_scheme(CA40, beams, field))
        assert len(stationary_dark(drive, frame_of(drive))) == expected


def test_stationary_dark_states_do_not_scatter():
    """Where stationary dark states exist they hold all atoms, but for the 1.2 s decay of D3/2; a field that leaves none
    brings the light back."""
    beams, _ = ion((-10.0, 5.0), None)
    even = np.full(8, 1 / 8)
    assert steady_state(equations(CA40, beams, (0, 0, 0.0)), even).populations[6:].sum() == pytest.approx(0.0, abs=1e-6)
    bright = make_scheme(CA40, beams, (0, 0, 3.0))
    assert stationary_dark(drive_of(bright), frame_of(drive_of(bright))) == []
    assert steady_state(equations(CA40, beams, (0, 0, 3.0)), even).populations[6:].sum() > 0.01


def test_two_photon_resonances_are_listed():
    """At equal detunings S and D sublevels pair up within their Zeeman shifts; far from there none is near."""
    beams, field = ion((-10.0, -10.0), (0, 0, 1.0))
    drive = drive_of(make_scheme(CA40, beams, field))
    pairs = raman_pairs(drive, frame_of(drive), 5.0)
    assert pairs
    nearest = pairs[0]
    shift = [drive.structure.energy_mhz[k] for k in (nearest.first, nearest.second)]
    assert nearest.detuning_mhz == pytest.approx(shift[0] - shift[1])
    assert nearest.width_mhz > 0
    beams, field = ion((-10.0, 40.0), (0, 0, 1.0))
    drive = drive_of(make_scheme(CA40, beams, field))
    assert raman_pairs(drive, frame_of(drive), 5.0) == []


def test_ellipse_makes_no_difference_to_counts():
    """Elliptical light on a half-integer J -> J leaves no dark state at all."""
    assert count(simple_atom(3, 3), elliptical(20.0, 10.0)) == 0
