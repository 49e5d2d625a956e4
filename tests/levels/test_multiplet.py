"""Fine-structure mixing against the full space of L and S."""

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from levels.constants import G_S, MHZ_PER_WAVENUMBER, MU_B_MHZ_PER_GAUSS
from levels.multiplet import caution, mixing, second_order, spin_element_squared
from levels.sublevels import sublevels
from tests.full_dimension import spin, term_states
from tests.records_for_tests import level

LETTERS = "SPDFGHIKLMNOQ"


@given(st.integers(0, 6), st.integers(0, 8), st.data())
def test_spin_elements_are_those_of_the_product_space(L: int, S: int, data: st.DataObject) -> None:
    """<J M|S_z|J+1 M>^2 is that between numerically coupled states, for any L, S, J, M; beyond the term it is zero."""
    S_z, states = term_states(2 * L, S)
    J = data.draw(st.sampled_from(range(abs(2 * L - S), 2 * L + S + 1, 2)))
    M = data.draw(st.sampled_from(range(-J, J + 1, 2)))
    upper = states.get((J + 2, M))
    expected = 0.0 if upper is None else float(upper @ S_z @ states[J, M]) ** 2
    assert spin_element_squared(2 * L, S, J, M) == pytest.approx(expected, abs=1e-11)


@given(st.integers(1, 5), st.integers(1, 6), st.floats(-6.0, 6.0), st.data())
def test_second_order_is_the_small_field_limit_of_the_whole_term(
    L: int, S: int, tilt: float, data: st.DataObject
) -> None:
    """Exact diagonalisation of a term in a weak field departs from g_J muB M B by the second-order shift.

    The term has levels E_J at random distances; what is left over is of the third order in (Zeeman / gap).
    """
    Js = list(range(abs(2 * L - S), 2 * L + S + 1, 2))
    energy = {J: 1e6 * k + 1e5 * np.sin(tilt * k) for k, J in enumerate(Js)}
    J = data.draw(st.sampled_from(Js))
    S_z, states = term_states(2 * L, S)
    zeeman = MU_B_MHZ_PER_GAUSS * (np.kron(spin(2 * L)[0], np.eye(S + 1)) + G_S * S_z)
    fine = sum(e * sum(np.outer(v, v) for (J_, _), v in states.items() if j == J_) for j, e in energy.items())
    neighbours = tuple((j, energy[j] - energy[J]) for j in (J - 2, J + 2) if j in energy)
    shifts = second_order(J, f"{S + 1}{LETTERS[L]}", neighbours)
    field = 100.0
    for M, shift in zip(range(-J, J + 1, 2), shifts, strict=True):
        block = [vector for (_, m), vector in states.items() if m == M]
        basis = np.array(block).T
        matrix = basis.T @ (fine + field * zeeman) @ basis
        first = float(states[J, M] @ zeeman @ states[J, M]) * field
        exact = np.linalg.eigvalsh(matrix)
        nearest = exact[np.argmin(np.abs(exact - energy[J] - first))]
        assert nearest - energy[J] - first == pytest.approx(shift * field**2, abs=2e-5, rel=3e-3)


def test_strontium_clock_state_in_closed_form() -> None:
    """88Sr 5s5p 3P0 with 3P1 186.826 cm-1 above: -(2/3)(g_S-1)^2 (muB/h)^2 / gap = -23.43 MHz/T2 = -0.2343 Hz/G2.

    Formula of Taichenachev et al., PRL 96, 083001 (2006); -23.38(5) MHz/T2 calculated by Lu et al., Chin. Phys. B 31,
    043101 (2022): the LS model is 0.2 % off.
    """
    gap = 186.826 * MHZ_PER_WAVENUMBER
    of = level(0, 0, term="3P", neighbours=((2, gap),))
    expected = -2 / 3 * ((G_S - 1) * MU_B_MHZ_PER_GAUSS) ** 2 / gap * 1e6
    solved = sublevels(of, [0.0, 20.0])
    assert solved.quadratic_hz_per_gauss2[:, 0] == pytest.approx([expected] * 2, rel=1e-12)
    assert solved.shift_mhz[1, 0] == pytest.approx(expected * 400 * 1e-6, rel=1e-12)
    assert solved.slope_mhz_per_gauss[1, 0] == pytest.approx(expected * 40 * 1e-6, rel=1e-12)
    assert expected == pytest.approx(-0.2338, rel=3e-3)


def test_neighbours_of_a_doublet_repel_each_other_equally() -> None:
    """2P1/2 and 2P3/2 of one term shift oppositely for m_J = +-1/2, and the m_J = +-3/2 not at all."""
    lower, upper = level(1, 0, g_J=0.67, term="2P", neighbours=((3, 3e4),)), second_order(3, "2P", ((1, -3e4),))
    below = second_order(1, "2P", lower.neighbours)
    assert below == pytest.approx([-upper[1], -upper[2]])
    assert (upper[0], upper[3]) == (0.0, 0.0)


def test_mixing_of_lithium_speaks_up() -> None:
    """The 10 GHz fine structure of lithium 2p mixes by more than 1 % from some 150 G on, and says so."""
    of = level(1, 0, g_J=0.67, name="2p_2P1/2", term="2P", neighbours=((3, 10053.0),))
    assert caution(of, 100.0) == ()
    (said,) = caution(of, [0.0, -500.0])
    assert "mixes 2p_2P1/2 with J = 3/2 of its term by an amplitude of 0.033" in said
    found = mixing(of, 500.0)
    assert found is not None
    expected = (G_S - 1) * MU_B_MHZ_PER_GAUSS * 500.0 * np.sqrt(2) / 3
    assert found.amplitude == pytest.approx(expected / 10053.0, rel=1e-12)
    assert found.shift_mhz == pytest.approx(expected**2 / 10053.0, rel=1e-12)


def test_a_lone_level_has_no_mixing() -> None:
    """Without known neighbours there is no shift, no estimate and no warning."""
    of = level(3, 3, 84.7, 12.5, g_J=1.336, g_I=-0.001, term="2P")
    assert mixing(of, 1e4) is None
    assert caution(of, 1e4) == ()
    assert second_order(3, "2P", ()) == ()
    same = replace(of, neighbours=((1, -7e6),))
    assert sublevels(same, 1e3).energy_mhz != pytest.approx(sublevels(of, 1e3).energy_mhz, abs=1e-3)
