"""Rate equations, time evolution and time integrals: closed forms, the library, and each against the others."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from levels.beams import intensity_of_saturation, make_scheme
from levels.driven import drive_of
from levels.errors import OutsideValidity
from levels.evolution import evolve_bloch, evolve_rates
from levels.rates import rates_of, steady_populations
from levels.steady import steady_state
from levels.transients import residence, residence_of_rates, settling, settling_of_rates
from tests.levels import quantum_library
from tests.levels.pumping_records import CA40, beam, simple_atom
from tests.levels.test_decays import with_lines
from tests.levels.test_steady import DIRECTIONS, GAMMA, JONES, equations
from tests.records_for_tests import quantity


def start(size, *positions):
    populations = np.zeros(size)
    populations[list(positions)] = 1 / len(positions)
    return populations


def rates(atom, beams, field):
    return rates_of(drive_of(make_scheme(atom, beams, field)))


@given(st.floats(0.01, 100.0), st.floats(-30.0, 30.0))
def test_two_levels_agree_with_bloch(saturation, detuning):
    """For two levels the rate equations have the steady state of the Bloch equations."""
    atom = simple_atom(0, 2)
    light = beam(atom, offset_mhz=detuning, intensity=intensity_of_saturation(atom, atom.lines[0], saturation))
    populations, unique = steady_populations(rates(atom, [light], (0, 0, 0)), start(4, 0))
    assert unique
    assert populations == pytest.approx(
        steady_state(equations(atom, [light], (0, 0, 0)), start(4, 0)).populations, abs=1e-9
    )


@given(JONES, DIRECTIONS, st.floats(-30, 30), st.floats(0.0, 50.0))
def test_rates_conserve_atoms(jones, k, detuning, field):
    """Columns of the rate matrix sum to zero, off-diagonal elements are not negative: populations stay populations."""
    matrix = rates(simple_atom(2, 4), [beam(simple_atom(2, 4), offset_mhz=detuning, direction=k, light=jones)],
                   (0, 0, field)).matrix  # fmt: skip
    assert matrix.sum(axis=0) == pytest.approx(0.0, abs=1e-9)
    assert np.all(matrix - np.diag(np.diag(matrix)) >= 0)


def test_detailed_balance_of_the_light():
    """Without spontaneous emission each component is balanced by its reverse: very strong light equalises all that it
    joins."""
    atom = simple_atom(1, 3)
    light = beam(atom, intensity=1e9, direction=(1, 2, 3), light=25.0)
    equations_here = rates(atom, [light], (0, 0, 1.0))
    pumped = equations_here.matrix - equations_here.emission
    np.fill_diagonal(pumped, 0.0)
    assert pumped == pytest.approx(pumped.T)
    populations, _ = steady_populations(equations_here, start(6, 0))
    assert populations == pytest.approx(1 / 6, rel=1e-3)


def test_four_level_optical_pumping():
    """J = 1/2 - 1/2 with weak sigma+ light: absorption from m = -1/2 leads to m = 1/2 in one of three decays, so the
    population there falls as exp(-R t/3), an unpolarised atom costs 3/2 photons (Happer, Rev. Mod. Phys. 44, 169
    (1972), depopulation pumping on D1 without buffer gas), and all end in m = 1/2."""
    atom = simple_atom(1, 1, g_low=0.0, g_up=0.0)
    s = 1e-4
    light = beam(atom, intensity=intensity_of_saturation(atom, atom.lines[0], s))
    bloch, here = equations(atom, [light], (0, 0, 1.0)), rates(atom, [light], (0, 0, 1.0))
    even = start(4, 0, 1)
    final = steady_state(bloch, even)
    assert final.populations[1] == pytest.approx(1.0)
    absorb = 2 / 3 * GAMMA * s / 2
    times = np.array([0.0, 1.0, 3.0, 10.0]) / (absorb / 3)
    expected = 0.5 * np.exp(-times * absorb / 3)
    assert evolve_rates(here, even, times).populations[:, 0] == pytest.approx(expected, abs=1e-4)
    assert evolve_bloch(bloch, even, times).populations[:, 0] == pytest.approx(expected, abs=1e-4)
    for integral in (settling(bloch, even, final.rho), settling_of_rates(here, even, final.populations)):
        assert GAMMA * integral[2:].sum() == pytest.approx(1.5, rel=1e-3)


@pytest.mark.parametrize("times", [[0.01, 0.02, 0.05, 0.3, 1.1, 4.0, 20.0], [0.1, 0.2, 0.3]])
def test_evolution_agrees_with_the_library(times):
    """Populations in time, by eigenvectors or matrix exponential, are those of the library's integrator."""
    beams = [
        beam(CA40, "blue", offset_mhz=-10.0, intensity=100.0, direction=(1, 0, 0), light=40.0),
        beam(CA40, "red", offset_mhz=-3.0, intensity=200.0, direction=(1, 0, 0), light=50.0, name="r"),
    ]
    bloch = equations(CA40, beams, (0, 0, 3.0))
    ours = evolve_bloch(bloch, start(8, 0), times)
    library = quantum_library.evolved(bloch, np.diag(start(8, 0) + 0j), [0.0, *times])[1:]
    assert ours.populations == pytest.approx(np.array([np.diag(rho).real for rho in library]), abs=1e-6)
    assert ours.lost == pytest.approx(0.0, abs=1e-9)


@pytest.mark.parametrize("twice_J_up", [2, 4])
def test_settling_is_the_time_integral(twice_J_up):
    """The settling integral is that of the evolution, also where the final state depends on the start (J = 2 - 1)."""
    atom = simple_atom(4, twice_J_up)
    light = beam(atom, intensity=1.0, direction=(1, 0, 1), light=20.0)
    bloch = equations(atom, [light], (0, 0, 0.0 if twice_J_up == 2 else 0.5))
    begin = start(bloch.size, 0, 1)
    final = steady_state(bloch, begin)
    assert final.unique is (twice_J_up == 4)
    times = np.concatenate([np.linspace(0.0, 3.0, 1000), np.linspace(3.1, 400.0, 900)])
    departure = evolve_bloch(bloch, begin, times).populations - final.populations
    assert abs(departure[-1]).max() < 1e-5
    numeric = np.trapezoid(departure, times, axis=0)
    assert settling(bloch, begin, final.rho) == pytest.approx(numeric, abs=5e-3 * np.abs(numeric).max())


def test_photons_before_a_leak():
    """An atom that loses one decay in a thousand scatters a thousand photons on average, by both models."""
    atom = with_lines(simple_atom(0, 2), **{"780": {"branching": quantity(0.998)}})
    light = [beam(atom, intensity=1.0)]
    for found in (
        residence(equations(atom, light, (0, 0, 0)), start(4, 0)),
        residence_of_rates(rates(atom, light, (0, 0, 0)), start(4, 0)),
    ):
        assert GAMMA * found[1:].sum() == pytest.approx(500.0, rel=1e-6)


def test_atoms_that_go_dark_never_leave():
    """With a dark sublevel the residence is endless, which is said by None."""
    atom = with_lines(simple_atom(1, 1), **{"780": {"branching": quantity(0.9)}})
    assert residence(equations(atom, [beam(atom)], (0, 0, 1.0)), start(4, 0)) is None


def test_lost_atoms_are_counted():
    """Populations and lost share sum to one at all times."""
    atom = with_lines(simple_atom(0, 2), **{"780": {"branching": quantity(0.9)}})
    result = evolve_bloch(
        equations(atom, [beam(atom, intensity=10.0)], (0, 0, 0)), start(4, 0), [0.0, 1.0, 10.0, 300.0]
    )
    assert result.lost[0] == pytest.approx(0.0, abs=1e-12)
    assert result.lost[-1] == pytest.approx(1.0, abs=1e-6)
    assert np.all(np.diff(result.lost) > 0)


@pytest.mark.parametrize("times", [[], [-1.0], [1.0, 1.0], [2.0, 1.0], [float("nan")]])
def test_impossible_times_are_refused(times):
    """Times rise from zero on."""
    atom = simple_atom(0, 2)
    with pytest.raises(OutsideValidity) as caught:
        evolve_rates(rates(atom, [beam(atom)], (0, 0, 0)), start(4, 0), times)
    assert caught.value.parameter == "times"
