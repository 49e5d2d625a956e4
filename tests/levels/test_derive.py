"""Constants that follow from published ones."""

import math
from itertools import pairwise

import pytest
from hypothesis import given
from hypothesis import strategies as st

from levels.blocks import hyperfine_shift
from levels.derive import (
    branching_of_rate,
    constants_of_intervals,
    dipole_of_rate,
    g_I_of_moment,
    lande,
    lifetime_of_rate,
    rate_of_branching,
    rate_of_dipole,
    rate_of_oscillator_strength,
)
from levels.quantity import Quantity, read


def checked(text: str, dimension: str) -> Quantity:
    """A checked value, as the data files give it."""
    return read(text, source="x", evidence="checked", dimension=dimension)


@pytest.mark.parametrize(
    ("name", "term", "coupling", "twice_J", "expected", "within"),
    [
        ("5s_2S1/2", "2S", "LS", 1, 2.00231930436, 1e-10),  # the free electron
        ("5p_2P1/2", "2P", "LS", 1, 2 / 3, 8e-4),  # textbook 2/3, up to g_S - 2
        ("5p_2P3/2", "2P", "LS", 3, 4 / 3, 8e-4),
        ("5s.5p_3P1", "3P", "LS", 2, 1.5, 1.2e-3),
        ("5s.4d_1D2", "1D", "LS", 4, 1.0, 1e-12),
        # 3P2 and 3D3 of a p5 s and p5 p configuration are single, so J1-L2 coupling must give the LS factor
        ("5p5.(2P3/2)6s_2[3/2]2", "2[3/2]", "JK", 4, 1.501160, 1e-6),
        ("5p5.(2P3/2)6p_2[5/2]3", "2[5/2]", "JK", 6, 1.334106, 1e-6),
        # Dy 421 nm: measured 1.22 (Martin, Zalubas, Hagan, NSRDS-NBS 60, 1978); 8/9 g(5I8) + 1/9 g(1P1 or 3P1) by hand
        ("4f10.(5I8).6s.6p.(1P1)_(8,1)9", "(8,1)", "JJ", 18, 1.222, 2e-3),
        ("4f10.(5I8).6s.6p.(3P1)_(8,1)9", "(8,1)", "JJ", 18, 1.278, 2e-3),
    ],
)
def test_lande_factors(name: str, term: str, coupling: str, twice_J: int, expected: float, within: float) -> None:
    """LS, J1-L2 and J1-J2 coupling give the known factors, as computed values without uncertainty."""
    factor = lande(name, term, coupling, twice_J)
    assert factor is not None
    assert factor.value == pytest.approx(expected, abs=within)
    assert (factor.evidence, factor.uncertainty) == ("computed", None)


@pytest.mark.parametrize(
    ("name", "term", "coupling", "twice_J"),
    [
        ("5s2_1S0", "1S", "LS", 0),
        ("4f13.5d.6s_3[3/2]1/2", "3[3/2]", "none", 1),
        ("4f13.5d.6s_3[3/2]1/2", "3[3/2]", "JK", 1),  # the core is not named
        ("4f10.6s.6p_(8,1)9", "(8,1)", "JJ", 18),
        ("5p_2P7/2", "2P", "LS", 7),
    ],
)
def test_no_lande_factor_is_guessed(name: str, term: str, coupling: str, twice_J: int) -> None:
    """J = 0, unknown coupling, unnamed cores and impossible J have none."""
    assert lande(name, term, coupling, twice_J) is None


def test_g_I_of_rubidium_from_its_moment_shows_the_shielding() -> None:
    """-mu/I m_e/m_p of 87Rb is 0.38 % beyond the atomic -0.0009951414 of Arimondo et al. 1977: shielding."""
    g_I = g_I_of_moment(checked("2.75129(8) muN", "moment"), 3)
    assert g_I.value / -0.0009951414 == pytest.approx(1.0038, abs=1e-4)
    assert (g_I.uncertainty, g_I.evidence) == (None, "computed")
    assert "shielding" in g_I.note


def test_one_interval_is_a_division_that_keeps_its_source() -> None:
    """87Rb: half of 6834.682610904290(90) MHz (Bize et al. 1999) is A, still checked and still of that paper."""
    A = constants_of_intervals(1, 3, [(2, 4, checked("6834.682610904290(90) MHz", "frequency"))], {})["A"]
    assert A.value == pytest.approx(3417.341305452145, abs=1e-12)
    assert A.uncertainty == pytest.approx(45e-12, rel=1e-6)
    assert (A.evidence, A.source) == ("checked", "x")
    assert "6834.682610904290(90)" in A.note


def test_cesium_intervals_give_the_published_constants() -> None:
    """133Cs 6P3/2: the intervals of Gerginov, Derevianko, Tanner, PRL 91, 072501 (2003) give their A, B and C."""
    measured = {(2, 3): "151.2247(16)", (3, 4): "201.2871(11)", (4, 5): "251.0916(20)"}
    intervals = [(2 * low, 2 * high, checked(f"{text} MHz", "frequency")) for (low, high), text in measured.items()]
    found = constants_of_intervals(3, 7, intervals, {})
    assert found["A"].value == pytest.approx(50.28827, abs=23e-5)
    assert found["B"].value == pytest.approx(-0.4934, abs=17e-4)
    assert found["C"].value == pytest.approx(0.56e-3, abs=7e-5)
    assert found["A"].evidence == "computed"


constant = st.floats(-500, 500)


@given(constant, constant, st.floats(-1, 1), st.integers(3, 9), st.integers(3, 9))
def test_intervals_of_any_constants_give_them_back(A: float, B: float, C: float, twice_J: int, twice_I: int) -> None:
    """Solving the Casimir formula inverts it for any J and I."""
    numbers = list(range(abs(twice_J - twice_I), twice_J + twice_I + 1, 2))
    energy = {F: hyperfine_shift(twice_J, twice_I, F, A, B, C) for F in numbers}
    intervals = [
        (low, high, Quantity(energy[high] - energy[low], 1e-3, "MHz", "-", "x", "checked"))
        for low, high in pairwise(numbers)
    ]
    found = constants_of_intervals(twice_J, twice_I, intervals, {})
    assert [found[name].value for name in "ABC"] == pytest.approx([A, B, C], abs=1e-7)


def test_a_constant_that_intervals_do_not_determine_is_not_guessed() -> None:
    """One interval of a level that has A and B gives neither, but gives A where B is published."""
    interval = [(4, 6, checked("267.0(1) MHz", "frequency"))]
    assert constants_of_intervals(3, 3, interval, {}) == {}
    B = checked("12.5(1) MHz", "frequency")
    found = constants_of_intervals(3, 3, interval, {"B": B})
    assert found["A"].value == pytest.approx((267.0 - 12.5) / 3, abs=1e-9)


def test_inverted_and_forward_intervals_mean_the_same() -> None:
    """E(F2) - E(F1) is signed: turning both round changes nothing."""
    forward = constants_of_intervals(1, 7, [(6, 8, checked("100(1) MHz", "frequency"))], {})["A"]
    backward = constants_of_intervals(1, 7, [(8, 6, checked("-100(1) MHz", "frequency"))], {})["A"]
    assert forward.value == backward.value == 25.0
    assert forward.uncertainty == backward.uncertainty == 0.25


def test_rates_of_rubidium() -> None:
    """87Rb D2: 26.2348(77) ns is 3.8117(11)e7 s-1 and 5.978(5) e a0 (Steck, Rubidium 87 D Line Data)."""
    nu = checked("384230484.4685(62) MHz", "frequency")
    only = read("1", source="", evidence="computed", dimension="number")
    rate = rate_of_branching(only, checked("26.2348(77) ns", "time"))
    assert rate.value == pytest.approx(3.8117e7, abs=0.0011e7)
    assert rate.uncertainty == pytest.approx(0.0011e7, rel=0.05)
    dipole = dipole_of_rate(rate, nu, 3)
    assert dipole.value == pytest.approx(5.978, abs=0.005)
    assert rate_of_dipole(dipole, nu, 3).value == pytest.approx(rate.value, rel=1e-12)


def test_oscillator_strength_of_sodium() -> None:
    """Na D2: f = 0.6405 is 6.154e7 s-1, 16.25 ns (Volz and Schmoranzer 1996 as in Steck, Sodium D Line Data)."""
    nu = checked("508.8487162(13) THz", "frequency")
    rate = rate_of_oscillator_strength(checked("0.6405(11)", "number"), nu, 1, 3)
    assert rate.value == pytest.approx(6.154e7, abs=0.011e7)


def test_rate_lifetime_and_branching_are_one_fact() -> None:
    """Each of the three follows from the other two, relative uncertainties in quadrature."""
    lifetime, branching = checked("10.0(1) ns", "time"), checked("0.50(1)", "number")
    rate = rate_of_branching(branching, lifetime)
    assert rate.uncertainty is not None
    assert rate.uncertainty / rate.value == pytest.approx(math.hypot(0.01, 0.02), rel=1e-12)
    assert branching_of_rate(rate, lifetime).value == pytest.approx(0.5, rel=1e-12)
    assert lifetime_of_rate(branching, rate).value == pytest.approx(1e-8, rel=1e-12)


def test_a_product_of_unstated_uncertainties_prints_no_invented_digits() -> None:
    """Without uncertainties the text is no longer than its shortest factor."""
    rate = rate_of_branching(checked("0.33", "number"), checked("7.0 ns", "time"))
    assert (rate.text, rate.uncertainty) == ("4.7e+07 s-1", None)
