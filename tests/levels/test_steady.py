"""Optical Bloch steady states: closed forms, a general quantum library, and the properties every state must have."""

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from levels.beams import intensity_of_saturation, make_scheme, offset_of_hyperfine
from levels.bloch import Bloch, Jump, bloch_of, generator, index_table, reachable, to_complex, to_real
from levels.driven import drive_of
from levels.elimination import two_sets
from levels.frames import frame_of
from levels.jones import elliptical
from levels.steady import steady_state
from tests.levels import quantum_library
from tests.levels.pumping_records import CA40, CS133_D2, RB87_D1, RB87_D2, SR88, beam, simple_atom
from tests.levels.test_decays import with_lines
from tests.records_for_tests import quantity

GAMMA = 1 / 26.2348e-3  # per us
WIDTH = GAMMA / (2 * np.pi)  # MHz
JONES = st.builds(elliptical, st.floats(-45.0, 45.0), st.floats(0.0, 180.0))
DIRECTIONS = st.sampled_from([(0, 0, 1), (1, 0, 0), (1, 2, 3), (-1, 0.2, 0.4)])


def equations(atom, beams, field):
    drive = drive_of(make_scheme(atom, beams, field))
    frame = frame_of(drive)
    assert frame.reason == ""
    return bloch_of(drive, frame)


def solved(bloch, initial=None):
    return steady_state(bloch, np.full(bloch.size, 1 / bloch.size) if initial is None else np.array(initial))


def hand_made(energy, coupling, jumps):
    """Equations written level by level: jumps are (end, start, rate)."""
    N = len(energy)
    decay = np.zeros(N)
    for _, start, rate in jumps:
        decay[start] += rate
    operators = tuple(Jump(np.array([e]), np.array([s]), np.array([np.sqrt(r)])) for e, s, r in jumps)
    none = (np.zeros(0, int), np.zeros(0, int), np.zeros(0))
    H = np.array(coupling, dtype=complex)
    coherence = (decay[:, None] + decay[None, :]) / 2
    return Bloch(np.array(energy, float), H + H.conj().T, decay, coherence, operators, none, np.zeros(N), np.arange(N))


@given(st.floats(0.01, 100.0), st.floats(-30.0, 30.0))
def test_two_level_saturation(saturation, detuning):
    """rho_ee = (s/2)/(1 + s + (2 Delta/Gamma)^2) with s = I/I_sat (Steck, Rubidium 87 D Line Data)."""
    atom = simple_atom(0, 2)
    light = beam(atom, offset_mhz=detuning, intensity=intensity_of_saturation(atom, atom.lines[0], saturation))
    state = solved(equations(atom, [light], (0, 0, 0.0)))
    expected = saturation / 2 / (1 + saturation + (2 * detuning / WIDTH) ** 2)
    assert state.populations[3] == pytest.approx(expected, rel=1e-9)
    assert state.unique


@given(st.floats(0.1, 20.0), st.floats(0.1, 20.0), st.floats(-40.0, 40.0))
def test_lambda_dark_resonance(first, second, detuning):
    """On two-photon resonance a three-level Lambda system ends in (O2|1> - O1|2>)/norm and scatters nothing
    (Arimondo, Progress in Optics 35, 257 (1996))."""
    H = np.zeros((3, 3))
    H[2, 0], H[2, 1] = first / 2, second / 2
    state = solved(hand_made([0, 0, -detuning], H, [(0, 2, 30.0), (1, 2, 8.0)]))
    total = first**2 + second**2
    assert state.populations == pytest.approx([second**2 / total, first**2 / total, 0.0], abs=1e-9)
    assert state.rho[0, 1] == pytest.approx(-first * second / total, abs=1e-9)


@given(st.floats(0.0, 20.0))
def test_excited_state_hanle_effect(field):
    """J = 0 - 1, weak resonant light polarised across the field: each damped dipole lags by theta with
    tan(theta) = 2 omega_L/Gamma, one ahead and one behind, so rho_+-/sqrt(rho_++ rho_--) = -exp(+-2 i theta)."""
    atom = simple_atom(0, 2, g_up=1.5)
    light = beam(atom, intensity=intensity_of_saturation(atom, atom.lines[0], 1e-6), light=0.0)
    state = solved(equations(atom, [light], (0, 0, field)))
    ratio = state.rho[3, 1] / np.sqrt(state.rho[3, 3].real * state.rho[1, 1].real)
    larmor = 1.5 * 1.39962449171 * field
    assert ratio.real == pytest.approx(-np.cos(2 * np.arctan2(2 * larmor, WIDTH)), abs=1e-4)
    assert abs(ratio) == pytest.approx(1.0, abs=1e-4)


def test_ground_state_hanle_width():
    """J = 1 - 0 is dark without a field; a field brings the light back once the Larmor precession beats the pumping,
    and more field changes nothing until it detunes the light."""
    atom = simple_atom(2, 0)
    rates = []
    for field in (0.0, 0.002, 0.02, 0.2):
        beams = [beam(atom, intensity=0.02, direction=(1, 0, 0), light=54.7356)]
        rates.append(solved(equations(atom, beams, (0, 0, field))).populations[3])
    assert rates[0] == pytest.approx(0.0, abs=1e-12)
    assert rates[0] < rates[1] < rates[2]
    assert rates[3] == pytest.approx(rates[2], rel=0.05)


@pytest.mark.parametrize("pure", [True, False])
@pytest.mark.parametrize(("atom", "F"), [(RB87_D2, 2), (CS133_D2, 4)])
def test_alkali_with_repump_agrees_with_the_library(atom, F, pure):
    """Cooling and repump light on a D2 line, all coherences: the density matrix is that of the library."""
    cool, repump = (
        offset_of_hyperfine(atom.lines[0], 2 * F, 2 * F + 2, -6),
        offset_of_hyperfine(atom.lines[0], 2 * F - 2, 2 * F),
    )
    shapes = [{}, {}] if pure else [{"direction": (0.3, 0.2, 0.5), "light": elliptical(20, 30)},
                                    {"direction": (1, 0.2, 0.1), "light": 20.0}]  # fmt: skip
    beams = [beam(atom, offset_mhz=cool, intensity=2.0, **shapes[0]),
             beam(atom, offset_mhz=repump, intensity=0.5, name="b", **shapes[1])]  # fmt: skip
    bloch = equations(atom, beams, (0, 0, 1.0))
    state = solved(bloch)
    assert state.rho == pytest.approx(quantum_library.steady_matrix(bloch), abs=1e-11)
    assert (state.unknowns < 0.12 * bloch.size**2) is pure


@pytest.mark.parametrize("atom", [CA40, SR88])
@pytest.mark.parametrize("angle", [0.0, 35.0, 90.0])
def test_ion_agrees_with_the_library(atom, angle):
    """S1/2 - P1/2 - D3/2 with two lasers, eight sublevels: the density matrix is that of the library."""
    beams = [
        beam(atom, "blue", offset_mhz=-10.0, intensity=30.0, direction=(1, 0, 0), light=angle),
        beam(atom, "red", offset_mhz=15.0, intensity=60.0, direction=(1, 0, 0), light=angle, name="r"),
    ]
    bloch = equations(atom, beams, (0, 0, 3.0))
    state = solved(bloch)
    if state.unique:
        assert state.rho == pytest.approx(quantum_library.steady_matrix(bloch), abs=1e-9)
    assert angle == 0.0 or state.populations[-2:].sum() > 1e-3


@given(JONES, JONES, DIRECTIONS, DIRECTIONS, st.floats(-30, 30), st.floats(-30, 30), st.floats(0.01, 50.0))
def test_every_state_is_a_state(first, second, k1, k2, d1, d2, field):
    """Trace 1, hermitian, no negative eigenvalue, stationary under the whole generator."""
    beams = [beam(CA40, "blue", offset_mhz=d1, intensity=50.0, direction=k1, light=first),
             beam(CA40, "red", offset_mhz=d2, intensity=50.0, direction=k2, light=second, name="r")]  # fmt: skip
    bloch = equations(CA40, beams, (0, 0, field))
    state = solved(bloch)
    assert np.trace(state.rho).real == pytest.approx(1.0, abs=1e-9)
    assert state.rho == pytest.approx(state.rho.conj().T, abs=1e-12)
    assert np.linalg.eigvalsh(state.rho).min() > -1e-8
    table = index_table(np.ones((8, 8), dtype=bool))
    assert generator(bloch, table) @ to_real(state.rho, table) == pytest.approx(0.0, abs=1e-6)


@given(JONES, DIRECTIONS, st.floats(-30, 30), st.floats(0.0, 5.0))
def test_reflection_changes_no_population(jones, k, detuning, field):
    """Mirrored light in the mirrored field (an axial vector) leaves the populations along the field as they were."""
    atom = simple_atom(2, 4, g_low=0.5, g_up=0.67)
    one = beam(atom, offset_mhz=detuning, intensity=3.0, direction=k, light=jones)
    mirror = np.diag([-1.0, 1.0, 1.0])
    other = replace(one, direction=mirror @ one.direction, polarisation=mirror @ one.polarisation)
    here = solved(equations(atom, [one], (0.3 * field, 0.2, field)))
    there = solved(equations(atom, [other], (0.3 * field, -0.2, -field)))
    assert there.populations == pytest.approx(here.populations, abs=1e-9)


def test_several_steady_states_keep_their_start():
    """J = 2 - 1 with sigma+ light has two dark sublevels: each start keeps what it pumps there, as in the library's
    time evolution."""
    atom = simple_atom(4, 2)
    bloch = equations(atom, [beam(atom, intensity=5.0)], (0, 0, 0.1))
    start = np.zeros(8)
    start[0] = 1.0
    state = solved(bloch, start)
    assert not state.unique
    assert state.populations.sum() == pytest.approx(1.0)
    assert state.populations[3:5].sum() == pytest.approx(1.0)
    (late,) = quantum_library.evolved(bloch, np.diag(start + 0j), [0.0, 300.0])[1:]
    assert state.rho == pytest.approx(late, abs=1e-6)


def test_leaks_are_closed_and_counted():
    """With 1 % of the decays lost, the state of the survivors is the closed one and the loss 1 % of the scattering."""
    atom = simple_atom(0, 2)
    leaky = with_lines(atom, **{"780": {"branching": quantity(0.99)}})
    s = intensity_of_saturation(atom, atom.lines[0], 1.0)
    state = solved(equations(leaky, [beam(leaky, intensity=s / 0.99)], (0, 0, 0)))
    assert state.populations[3] == pytest.approx(0.25, rel=1e-9)
    assert state.lost_per_us == pytest.approx(0.01 * GAMMA * 0.25, rel=1e-9)


def test_laser_linewidth_broadens():
    """A laser of width w adds w/2 to the decay of the optical coherence: rho_ee = (s/2)(1 + w/Gamma)/... on resonance,
    here through R = Omega^2/(Gamma + w), rho_ee = R/(2R + Gamma)."""
    atom = simple_atom(0, 2)
    light = beam(atom, intensity=intensity_of_saturation(atom, atom.lines[0], 2.0), linewidth_mhz=3.0)
    state = solved(equations(atom, [light], (0, 0, 0)))
    rate = GAMMA**2 / (GAMMA + 3.0 * 2 * np.pi)
    assert state.populations[3] == pytest.approx(rate / (2 * rate + GAMMA), rel=1e-9)


def test_triangle_of_lines_is_solved_whole():
    """397, 866 and 732 nm together join no two sets of levels; the state still agrees with the library."""
    offsets = {"blue": -10.0, "red": -5.0, "E2": -5.0}
    beams = [beam(CA40, name, offset_mhz=offset, intensity=1e7 if name == "E2" else 20.0, direction=(1, 0, 1),
                  light=30.0, name=name) for name, offset in offsets.items()]  # fmt: skip
    bloch = equations(CA40, beams, (0, 0, 2.0))
    assert two_sets(bloch) is None
    assert solved(bloch).rho == pytest.approx(quantum_library.steady_matrix(bloch), abs=1e-8)


def test_unreachable_coherences_are_left_out():
    """Pure sigma+ light on D1 with repump keeps only coherences of equal m between the two ground levels."""
    line = RB87_D1.lines[0]
    beams = [beam(RB87_D1, offset_mhz=offset_of_hyperfine(line, 4, 4), intensity=1.0),
             beam(RB87_D1, offset_mhz=offset_of_hyperfine(line, 2, 4), intensity=1.0, name="b")]  # fmt: skip
    drive = drive_of(make_scheme(RB87_D1, beams, (0, 0, 1.0)))
    pattern = reachable(bloch_of(drive, frame_of(drive)))
    m = drive.structure.twice_m
    ground = slice(0, 8)
    assert np.all((m[ground][:, None] == m[ground][None, :])[pattern[ground, ground]])
    assert pattern[ground, ground].sum() == 8 + 6


def test_real_unknowns_round_trip():
    """A density matrix goes into its real unknowns and back."""
    rng = np.random.default_rng(1)
    matrix = rng.normal(size=(5, 5)) + 1j * rng.normal(size=(5, 5))
    rho = matrix @ matrix.conj().T
    table = index_table(np.ones((5, 5), dtype=bool))
    assert to_complex(to_real(rho, table), table) == pytest.approx(rho)
