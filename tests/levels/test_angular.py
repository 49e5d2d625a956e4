"""The exact algebra against a second implementation, printed tables and its own sum rules."""

from fractions import Fraction
from itertools import product

import numpy as np
import pytest
import sympy
from hypothesis import given
from hypothesis import strategies as st
from sympy import Rational, sqrt

from levels import angular
from levels.errors import OutsideValidity
from tests.full_dimension import spin, wig3jj, wig6jj

ROUNDING = 1e-13


@st.composite
def coupled(draw: st.DrawFn, largest: int = 24) -> tuple[int, int, int]:
    """Three doubled angular momenta that couple."""
    a, b = draw(st.integers(0, largest)), draw(st.integers(0, largest))
    return a, b, draw(st.sampled_from(range(abs(a - b), a + b + 1, 2)))


def projection(draw: st.DrawFn, twice_j: int) -> int:
    return draw(st.sampled_from(range(-twice_j, twice_j + 1, 2)))


def test_every_small_3j_equals_the_second_implementation() -> None:
    """All 3j symbols with j up to 3/2, allowed or not, are those of an independent library."""
    seen = 0
    for j1, j2, j3 in product(range(4), repeat=3):
        for m1, m2, m3 in product(*(range(-j, j + 1, 2) for j in (j1, j2, j3))):
            assert float(angular.three_j(j1, j2, j3, m1, m2, m3)) == pytest.approx(
                wig3jj(j1, j2, j3, m1, m2, m3), abs=ROUNDING
            )
            seen += 1
    assert seen == 1000


@given(st.data())
def test_large_3j_equal_the_second_implementation(data: st.DataObject) -> None:
    """3j symbols with j up to 24 are those of an independent library."""
    j1, j2, j3 = data.draw(coupled())
    m1, m2 = projection(data.draw, j1), projection(data.draw, j2)
    if abs(m1 + m2) > j3:
        assert angular.three_j(j1, j2, j3, m1, m2, -m1 - m2) == 0
    assert float(angular.three_j(j1, j2, j3, m1, m2, -m1 - m2)) == pytest.approx(
        wig3jj(j1, j2, j3, m1, m2, -m1 - m2), abs=ROUNDING
    )


def test_every_small_6j_equals_the_second_implementation() -> None:
    """All 6j symbols with j up to 3/2 in every place, allowed or not, are those of an independent library."""
    nonzero = 0
    for places in product(range(4), repeat=6):
        expected = wig6jj(*places)
        nonzero += expected != 0
        if expected or not angular.six_j_reason(*places):
            assert float(angular.six_j(*places)) == pytest.approx(expected, abs=ROUNDING)
    assert nonzero > 100


@given(st.lists(st.integers(0, 16), min_size=6, max_size=6))
def test_generated_6j_equal_the_second_implementation(places: list[int]) -> None:
    """Any 6j symbol, most of them forbidden, is that of an independent library."""
    assert float(angular.six_j(*places)) == pytest.approx(wig6jj(*places), abs=ROUNDING)


@given(coupled(12), coupled(12), st.data())
def test_coupled_6j_equal_the_second_implementation(
    first: tuple[int, int, int], second: tuple[int, int, int], data: st.DataObject
) -> None:
    """6j symbols whose triangles all hold are those of an independent library."""
    a, b, c = first
    d, e = second[0], second[1] + (second[0] + second[1] + c) % 2
    low, high = max(abs(a - e), abs(d - b)), min(a + e, d + b)
    f = data.draw(st.integers(low, max(low, high)))
    assert float(angular.six_j(a, b, c, d, e, f)) == pytest.approx(wig6jj(a, b, c, d, e, f), abs=ROUNDING)


@pytest.mark.parametrize(
    ("arguments", "expected"),
    [
        ((1, 1, 1, 1, 2, 2), sympy.Integer(1)),
        ((1, 1, 1, -1, 0, 0), sqrt(Rational(1, 2))),
        ((1, -1, 1, 1, 0, 0), -sqrt(Rational(1, 2))),
        ((2, 2, 1, -1, 3, 1), sqrt(Rational(1, 3))),
        ((2, 2, 1, -1, 1, 1), sqrt(Rational(2, 3))),
        ((2, 0, 1, 1, 1, 1), -sqrt(Rational(1, 3))),
        ((4, 4, 1, -1, 5, 3), sqrt(Rational(1, 5))),
        ((4, 2, 2, -2, 2, 0), sqrt(Rational(3, 10))),
        ((4, 0, 2, 0, 2, 0), -sqrt(Rational(2, 5))),
        ((2, 2, 2, -2, 0, 0), sqrt(Rational(1, 3))),
        ((2, 0, 2, 0, 0, 0), -sqrt(Rational(1, 3))),
        ((3, 3, 2, -2, 3, 1), sqrt(Rational(2, 5))),
        ((3, 1, 3, -1, 0, 0), -sqrt(Rational(1, 4))),
    ],
)
def test_printed_clebsch_gordan_coefficients(arguments: tuple[int, ...], expected: sympy.Expr) -> None:
    """Coefficients are those of the table in the Review of Particle Physics (section 45, 1/2x1/2 to 3/2x3/2)."""
    assert sympy.simplify(angular.clebsch_gordan(*arguments) - expected) == 0


@given(st.integers(0, 9), st.integers(0, 9), st.data())
def test_clebsch_gordan_are_orthonormal(j1: int, j2: int, data: st.DataObject) -> None:
    """The coefficients of any two coupled states add up to exactly one or zero."""
    totals = range(abs(j1 - j2), j1 + j2 + 1, 2)
    j, k = data.draw(st.sampled_from(totals)), data.draw(st.sampled_from(totals))
    m = projection(data.draw, min(j, k))
    overlap = sum(
        angular.clebsch_gordan(j1, m1, j2, m - m1, j, m) * angular.clebsch_gordan(j1, m1, j2, m - m1, k, m)
        for m1 in range(-j1, j1 + 1, 2)
        if abs(m - m1) <= j2
    )
    assert sympy.simplify(overlap) == (1 if j == k else 0)


@pytest.mark.parametrize(
    ("reason", "fragment"),
    [
        (angular.three_j_reason(2, 2, 2, 2, 2, -2), "do not sum to zero"),
        (angular.three_j_reason(2, 2, 8, 0, 0, 0), "triangle rule: 4 is not between |1 - 1| and 1 + 1"),
        (angular.three_j_reason(2, 2, 2, 0, 0, 0), "sum to an odd number"),
        (angular.three_j_reason(2, 4, 4, 4, -2, -2), "projection 2 is larger than 1"),
        (angular.six_j_reason(1, 2, 2, 2, 2, 2), "do not add up to an integer"),
        (angular.clebsch_gordan_reason(1, 1, 2, 2, 3, 1), "m = 1/2 is not m1 + m2 = 3/2"),
        (angular.triangle_reason(1, 3, 3), "do not add up to an integer"),
    ],
)
def test_a_zero_names_its_selection_rule(reason: str, fragment: str) -> None:
    """The reason of a forbidden coefficient names the rule and its numbers."""
    assert fragment in reason


def test_an_accidental_zero_has_no_reason() -> None:
    """The 6j {2 2 2; 3/2 3/2 3/2} and the 3j (3 3 2; 2 -2 0) vanish although every rule holds."""
    assert angular.six_j_reason(4, 4, 4, 3, 3, 3) == ""
    assert angular.six_j(4, 4, 4, 3, 3, 3) == 0
    assert angular.three_j_reason(6, 6, 4, 4, -4, 0) == ""
    assert angular.three_j(6, 6, 4, 4, -4, 0) == 0


@pytest.mark.parametrize(
    "call",
    [
        lambda: angular.three_j(-2, 2, 2, 0, 0, 0),
        lambda: angular.three_j(2, 2, 2, 1, -1, 0),
        lambda: angular.six_j(1, 1, 500, 1, 1, 1),
        lambda: angular.clebsch_gordan(2, 1, 2, -1, 2, 0),
        lambda: angular.lande_shares(1, 1, 1),
        lambda: angular.lande_shares(9, 2, 1),
        lambda: angular.hyperfine_shares(1, 1, 3),
    ],
)
def test_impossible_momenta_are_refused(call: object) -> None:
    """Negative, huge, half-integer L or uncoupled momenta and projections of the wrong kind raise OutsideValidity."""
    with pytest.raises(OutsideValidity):
        call()  # type: ignore[operator]


@given(st.integers(0, 16), st.integers(0, 9), st.integers(1, 3), st.data())
def test_line_strengths_from_one_F_sum_to_one(J: int, I: int, rank: int, data: st.DataObject) -> None:
    """The exact strengths S(F,F') of one F sum to 1 over F' whenever J, J' and the rank couple."""
    J_up = data.draw(st.sampled_from(range(abs(J - 2 * rank), J + 2 * rank + 1, 2)))
    F = data.draw(st.sampled_from(range(abs(J - I), J + I + 1, 2)))
    total = sum(
        angular.line_strength(J, J_up, I, F, F_up, rank) for F_up in range(abs(J_up - I), J_up + I + 1, 2)
    )
    assert total == Fraction(1)


@given(st.integers(0, 9), st.integers(0, 7), st.integers(1, 3), st.data())
def test_component_strengths_of_one_upper_sublevel_sum_to_one(
    J_up: int, I: int, rank: int, data: st.DataObject
) -> None:
    """The exact strengths of all decays of one upper sublevel sum to 1, rank 1 to 3."""
    J = data.draw(st.sampled_from(range(abs(J_up - 2 * rank), J_up + 2 * rank + 1, 2)))
    F_up = data.draw(st.sampled_from(range(abs(J_up - I), J_up + I + 1, 2)))
    m_up = projection(data.draw, F_up)
    total = sum(
        angular.component_strength(J, J_up, I, (F, m), (F_up, m_up), rank)
        for F in range(abs(J - I), J + I + 1, 2)
        for m in range(max(-F, m_up - 2 * rank), min(F, m_up + 2 * rank) + 1, 2)
    )
    assert total == 1


@given(st.integers(0, 6), st.integers(0, 6), st.data())
def test_component_strengths_add_up_to_the_line_strength(J: int, I: int, data: st.DataObject) -> None:
    """Over m' and all polarisations the components of one (F, m) add up to S(F,F') (2J'+1)/(2J+1)."""
    J_up = data.draw(st.sampled_from(range(abs(J - 2), J + 3, 2)))
    F = data.draw(st.sampled_from(range(abs(J - I), J + I + 1, 2)))
    F_up = data.draw(st.sampled_from(range(abs(J_up - I), J_up + I + 1, 2)))
    m = projection(data.draw, F)
    total = sum(
        angular.component_strength(J, J_up, I, (F, m), (F_up, m_up))
        for m_up in range(max(-F_up, m - 2), min(F_up, m + 2) + 1, 2)
    )
    assert total == angular.line_strength(J, J_up, I, F, F_up) * Fraction(J_up + 1, J + 1)


@given(st.integers(0, 9), st.integers(1, 3), st.data())
def test_multipole_elements_carry_the_signs_of_the_second_implementation(
    J_up: int, rank: int, data: st.DataObject
) -> None:
    """Every element is (-1)^(J'-m') sqrt(2J'+1) times the independent 3j symbol, sign included."""
    J = data.draw(st.sampled_from(range(abs(J_up - 2 * rank), J_up + 2 * rank + 1, 2)))
    for (m, m_up), element in angular.multipole_elements(J, J_up, rank).items():
        symbol = wig3jj(J_up, 2 * rank, J, -m_up, m_up - m, m)
        assert element == pytest.approx((-1) ** ((J_up - m_up) // 2) * np.sqrt(J_up + 1) * symbol, abs=ROUNDING)


@given(st.integers(0, 5), st.integers(0, 6), st.data())
def test_lande_shares_are_projections_of_the_vectors(L: int, S: int, data: st.DataObject) -> None:
    """g_L and g_S weigh in as <L_z> and <S_z> per M in the numerically coupled state of the largest M."""
    twice_L = 2 * L
    J = data.draw(st.sampled_from(range(abs(twice_L - S), twice_L + S + 1, 2)))
    if J == 0:
        assert angular.lande_shares(J, twice_L, S) == (0, 0)
        return
    ones = np.eye(twice_L + 1), np.eye(S + 1)
    total = [np.kron(a, ones[1]) + np.kron(ones[0], b) for a, b in zip(spin(twice_L), spin(S), strict=True)]
    square = total[0] @ total[0] + (total[1] @ total[2] + total[2] @ total[1]) / 2
    values, states = np.linalg.eigh(square + 1e-3 * total[0])  # J_z splits the m of one J
    at = np.argmin(np.abs(values - J / 2 * (J / 2 + 1) - 1e-3 * J / 2))
    state = states[:, at]
    expected = [
        float(state @ part @ state) / (J / 2)
        for part in (np.kron(spin(twice_L)[0], ones[1]), np.kron(ones[0], spin(S)[0]))
    ]
    assert [float(share) for share in angular.lande_shares(J, twice_L, S)] == pytest.approx(expected, abs=1e-9)


@pytest.mark.parametrize(
    ("shares", "expected"),
    [
        (angular.lande_shares(3, 2, 1), (Fraction(2, 3), Fraction(1, 3))),  # 2P3/2: g = 4/3
        (angular.lande_shares(1, 2, 1), (Fraction(4, 3), Fraction(-1, 3))),  # 2P1/2: g = 2/3
        (angular.lande_shares(2, 2, 2), (Fraction(1, 2), Fraction(1, 2))),  # 3P1: g = 3/2
        (angular.lande_shares(2, 4, 2), (Fraction(3, 2), Fraction(-1, 2))),  # 3D1: g = 1/2
        (angular.lande_shares(16, 12, 4), (Fraction(3, 4), Fraction(1, 4))),  # 5I8: g = 5/4
        (angular.hyperfine_shares(4, 1, 3), (Fraction(1, 4), Fraction(3, 4))),  # 87Rb 5S1/2 F = 2
        (angular.hyperfine_shares(2, 1, 3), (Fraction(-1, 4), Fraction(5, 4))),
        (angular.hyperfine_shares(3, 3, 0), (Fraction(1), Fraction(0))),  # I = 0: F is J
        (angular.hyperfine_shares(9, 0, 9), (Fraction(0), Fraction(1))),  # J = 0: F is I
        (angular.hyperfine_shares(0, 3, 3), (Fraction(0), Fraction(0))),
    ],
)
def test_textbook_shares(shares: tuple[Fraction, Fraction], expected: tuple[Fraction, Fraction]) -> None:
    """Lande and hyperfine weights of well-known levels, by the vector model as textbooks print it."""
    assert shares == expected
