"""Long-time populations of rate equations: against linear algebra, and where that runs out of digits."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from hypothesis.extra.numpy import arrays

from levels.markov import long_time, stationary

RATES = st.integers(2, 7).flatmap(lambda n: arrays(np.float64, (n, n), elements=st.floats(0.01, 10.0)))


def generator(rates):
    moves = rates - np.diag(np.diag(rates))
    return moves - np.diag(moves.sum(axis=0))


@given(RATES)
def test_stationary_populations(rates):
    """The stationary populations are the null vector of the generator, with sum 1."""
    populations = stationary(rates)
    assert generator(rates) @ populations == pytest.approx(0.0, abs=1e-10)
    assert populations.sum() == pytest.approx(1.0)


@given(st.floats(1e-300, 1.0))
def test_two_states_of_any_ratio(slow):
    """Two states exchange at rates a and b: populations b/(a+b) and a/(a+b), however small one rate is."""
    populations, unique = long_time(np.array([[0.0, 1.0], [slow, 0.0]]), np.array([1.0, 0.0]))
    assert unique
    assert populations[1] == pytest.approx(slow / (1.0 + slow), rel=1e-12)


def test_slow_shelf_beside_fast_light():
    """A shelf filled by 1e-12 of fast decays and emptied at 1e-9 keeps all its digits: p = 1e-12 Gamma p_e/1e-9."""
    pump, decay, branch, slow = 10.0, 100.0, 1e-12, 1e-9
    moves = np.zeros((3, 3))  # ground, excited, shelf
    moves[1, 0], moves[0, 1] = pump, pump + decay * (1 - branch)
    moves[2, 1], moves[0, 2] = decay * branch, slow
    populations, _ = long_time(moves, np.array([1.0, 0.0, 0.0]))
    ratio = populations[2] / populations[1]
    assert ratio == pytest.approx(decay * branch / slow, rel=1e-12)


def test_several_closed_classes_share_the_start():
    """From a state that leaks to two ends at 3 : 1, three quarters arrive at the first; an end keeps its start."""
    moves = np.zeros((4, 4))
    moves[1, 0], moves[2, 0], moves[0, 3] = 3.0, 1.0, 5.0
    for start in ([1, 0, 0, 0], [0, 0, 0, 1]):
        populations, unique = long_time(moves, np.array(start, float))
        assert not unique
        assert populations == pytest.approx([0, 0.75, 0.25, 0])
    assert long_time(moves, np.array([0, 0, 1.0, 0]))[0] == pytest.approx([0, 0, 1, 0])


def test_transient_states_pass_their_start_on():
    """Chains of transient states, in any order, end with all atoms in the one closed class."""
    moves = np.zeros((4, 4))
    moves[0, 3], moves[3, 1], moves[2, 0] = 1.0, 2.0, 0.5
    populations, unique = long_time(moves, np.full(4, 0.25))
    assert unique
    assert populations == pytest.approx([0, 0, 1, 0])
