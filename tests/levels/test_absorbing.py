"""Absorbing chains: against linear algebra, against walks, and where they are nearly closed."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from numpy.typing import NDArray

from levels import absorbing

Array = NDArray[np.float64]


def random_chain(seed: int, size: int, loss: float) -> tuple[Array, Array]:
    """Moves between all states with a chance of loss from each."""
    rng = np.random.default_rng(seed)
    moves = rng.random((size, size)) * (rng.random((size, size)) < 0.6)
    moves[np.arange(1, size), np.arange(size - 1)] += 0.1  # a way back to the start
    lost = loss * rng.random(size)
    whole = moves.sum(axis=1) + lost
    return moves / whole[:, None], lost / whole


@given(st.integers(0, 10**6), st.integers(2, 9))
def test_visits_and_values_solve_the_linear_equations(seed: int, size: int) -> None:
    """Visits are the first row of (1 - P)^-1 and values its product with the rewards."""
    moves, loss = random_chain(seed, size, 0.3)
    chain = absorbing.reduce(moves[None], loss[None])
    inverse = np.linalg.inv(np.eye(size) - moves)
    assert absorbing.visits(chain)[0] == pytest.approx(inverse[0], rel=1e-9)
    reward = np.random.default_rng(seed).random(size)
    assert absorbing.values(chain, reward)[0] == pytest.approx(inverse @ reward, rel=1e-9)


def test_nearly_closed_chain_keeps_its_digits() -> None:
    """A cycle that loses one in 1e14 lasts 1e14 rounds to ten digits, where plain elimination has lost them."""
    share = 0.3e-14
    moves = np.array([[0.0, 1.0, 0.0], [0.7, 0.0, 0.3], [1.0, 0.0, 0.0]])
    loss = np.array([0.0, 0.0, share / 0.3])
    visits = absorbing.visits(absorbing.reduce(moves[None], loss[None]))[0]
    assert visits[0] == pytest.approx(1 / share * (1 + share / 0.3 * 1), rel=1e-10)


def test_visits_agree_with_walks() -> None:
    """Expected visits agree with 20,000 seeded random walks within four standard errors."""
    moves, loss = random_chain(7, 5, 0.4)
    expected = absorbing.visits(absorbing.reduce(moves[None], loss[None]))[0]
    rng = np.random.default_rng(11)
    table = np.cumsum(np.column_stack([moves, loss]), axis=1)
    counts = np.zeros((20_000, 5))
    for walk in counts:
        state = 0
        while state < 5:
            walk[state] += 1
            state = int(np.searchsorted(table[state], rng.random() * table[state, -1]))
    error = counts.std(axis=0) / np.sqrt(len(counts))
    assert np.all(np.abs(counts.mean(axis=0) - expected) < 4 * error)


def test_trapped_states_are_lost() -> None:
    """What leads to states without a way back to the start counts as loss; an endless cycle is endless."""
    moves = np.array([[[0.0, 0.9, 0.1, 0.0], [1.0, 0.0, 0.0, 0.0], [0.0, 0.0, 0.0, 1.0], [0.0, 0.0, 1.0, 0.0]]])
    assert absorbing.trapped(moves).tolist() == [[False, False, True, True]]
    kept, loss = absorbing.closed_off(moves, np.zeros((1, 4)))
    assert loss[0].tolist() == pytest.approx([0.1, 0.0, 1.0, 1.0])
    assert absorbing.visits(absorbing.reduce(kept, loss))[0, 0] == pytest.approx(10.0)
    closed = absorbing.reduce(np.array([[[0.0, 1.0], [1.0, 0.0]]]), np.zeros((1, 2)))
    assert absorbing.visits(closed)[0, 0] > absorbing.ENDLESS


def test_batches_do_not_mix() -> None:
    """Solving several chains at once gives what each gives alone."""
    some = [random_chain(seed, 6, 0.2) for seed in range(4)]
    moves, loss = np.array([one[0] for one in some]), np.array([one[1] for one in some])
    together = absorbing.visits(absorbing.reduce(moves, loss))
    alone = [absorbing.visits(absorbing.reduce(one[None], two[None]))[0] for one, two in some]
    assert together == pytest.approx(np.array(alone), rel=1e-13)
