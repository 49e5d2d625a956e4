"""The block operators against tensors built without their formulas."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from levels.blocks import block, block_ms, hyperfine_shift, hyperfine_weights
from tests.full_dimension import operators

RELATIVE = 1e-12
Js, Is = st.integers(0, 16), st.integers(0, 9)
KINDS = ("dipole", "quadrupole", "octupole", "J_z", "I_z")


@given(Js, Is)
def test_blocks_are_the_full_operators_cut_by_m(J: int, I: int) -> None:
    """Each of the five operators equals the tensor construction, element by element, for any J and I."""
    full = operators(J, I)
    total = np.rint(2 * np.diag(full.J_z + full.I_z))
    for twice_m in block_ms(J, I):
        part = block(J, I, twice_m)
        rows = np.nonzero(total == twice_m)[0][::-1]  # the full product states fall in m_J, the blocks rise
        for kind in KINDS:
            expected, actual = getattr(full, kind), getattr(part, kind)
            actual = np.diag(actual) if actual.ndim == 1 else actual
            scale = max(np.abs(expected).max(), 1e-300)
            assert np.abs(actual - expected[np.ix_(rows, rows)]).max() <= RELATIVE * scale


@given(Js, Is)
def test_blocks_hold_every_product_state_once(J: int, I: int) -> None:
    """The blocks' sizes add up to (2J+1)(2I+1), and so do their F labels, F by F."""
    parts = [block(J, I, m) for m in block_ms(J, I)]
    assert sum(part.size for part in parts) == (J + 1) * (I + 1)
    pairs = {pair for part in parts for pair in zip(part.twice_mJ, part.twice_mI, strict=True)}
    assert len(pairs) == (J + 1) * (I + 1)
    for F in range(abs(J - I), J + I + 1, 2):
        assert sum(F in part.twice_F for part in parts) == F + 1


@given(Js, Is)
def test_hyperfine_operators_have_no_trace(J: int, I: int) -> None:
    """Dipole, quadrupole and octupole leave the level's centroid where it is."""
    parts = [block(J, I, m) for m in block_ms(J, I)]
    for kind in ("dipole", "quadrupole", "octupole"):
        terms = [np.trace(getattr(part, kind)) for part in parts]
        size = sum(np.abs(np.diag(getattr(part, kind))).sum() for part in parts)
        assert abs(sum(terms)) <= RELATIVE * max(size, 1.0)


@given(st.integers(3, 16), st.integers(3, 9))
def test_stretched_state_carries_a_quarter_of_B_and_all_of_C(J: int, I: int) -> None:
    """In the stretched state the dipole is I J, the quadrupole 1/4 and the octupole 1."""
    assert hyperfine_weights(J, I, J + I) == pytest.approx((J * I / 4, 0.25, 1.0), rel=RELATIVE)


@pytest.mark.parametrize(("J", "I"), [(0, 5), (5, 0), (1, 9), (9, 1), (0, 0)])
def test_small_spins_have_no_quadrupole_or_octupole(J: int, I: int) -> None:
    """A spin of 0 or 1/2 has no quadrupole, so B and C do nothing there."""
    for F in range(abs(J - I), J + I + 1, 2):
        assert hyperfine_weights(J, I, F)[1:] == (0.0, 0.0)


def test_a_spin_of_one_has_no_octupole() -> None:
    """J = 1 or I = 1 has a quadrupole but no octupole."""
    assert hyperfine_weights(2, 9, 11)[1:] == (pytest.approx(0.25), 0.0)
    assert hyperfine_weights(9, 2, 11)[1:] == (pytest.approx(0.25), 0.0)


@given(Js, Is)
def test_hyperfine_shift_is_the_eigenvalue_of_the_full_operators(J: int, I: int) -> None:
    """Each F's dE/dA, dE/dB and dE/dC is the eigenvalue of the tensor construction, 2F+1 times each."""
    full = operators(J, I)
    for at, kind in enumerate(("dipole", "quadrupole", "octupole")):
        expected = np.linalg.eigvalsh(getattr(full, kind))
        labels = range(abs(J - I), J + I + 1, 2)
        actual = np.sort(np.concatenate([[hyperfine_weights(J, I, F)[at]] * (F + 1) for F in labels]))
        assert np.abs(actual - expected).max() <= RELATIVE * max(np.abs(expected).max(), 1.0)


def test_casimir_energies_of_rubidium() -> None:
    """87Rb 5p 2P3/2 splits by 72.22, 156.94 and 266.65 MHz with A = 84.7185, B = 12.4965 MHz.

    Steck, Rubidium 87 D Line Data, figure 2 (value from memory): 72.2180, 156.9470, 266.6500 MHz, to 20 kHz.
    """
    energies = [hyperfine_shift(3, 3, F, 84.7185, 12.4965) for F in (0, 2, 4, 6)]
    assert energies == pytest.approx([-302.07375, -229.85175, -72.91125, 193.74075], abs=1e-9)
    assert np.diff(energies) == pytest.approx([72.2180, 156.9470, 266.6500], abs=0.02)


def test_operators_are_read_only() -> None:
    """Cached operators cannot be changed by a caller."""
    with pytest.raises(ValueError, match="read-only"):
        block(3, 3, 0).dipole[0, 0] = 1.0
