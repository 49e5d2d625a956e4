"""Sums of poles: every root in a range, whatever hides."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.typing import NDArray

from levels.rational import Rational, every_root, merged, minus, stretches

Array = NDArray[np.float64]


def rational(poles: list[float], weights: list[float], constant: float = 0.0, clearance: float = 0.0) -> Rational:
    return Rational(np.array(poles), np.array(weights), np.full(len(poles), clearance), constant)


def roots_of_polynomial(function: Rational, low: float, high: float) -> Array:
    """The real roots of the numerator, by an eigenvalue solver: a second way, good for few poles."""
    numerator = function.constant * np.poly(function.pole)
    for k, weight in enumerate(function.weight):
        numerator = np.polyadd(numerator, -weight * np.poly(np.delete(function.pole, k)))
    found = np.roots(numerator)
    real = np.sort(found[np.abs(found.imag) < 1e-7].real)
    return real[(real > low) & (real < high)]


def test_one_root_between_two_poles() -> None:
    """1/(1-x) + 1/(3-x) is zero in the middle, at 2."""
    assert every_root(rational([1.0, 3.0], [1.0, 1.0], clearance=1e-3), 0.0, 10.0).roots == pytest.approx([2.0])


def test_signs_alike_leave_no_root() -> None:
    """Two poles of opposite weight have no root between them without a constant, and one with it."""
    assert every_root(rational([1.0, 3.0], [1.0, -1.0], clearance=1e-3), 0.0, 10.0).roots == ()
    assert len(every_root(rational([1.0, 3.0], [1.0, -1.0], -5.0, 1e-3), 0.0, 10.0).roots) == 2


poles = st.lists(st.integers(-40, 40), min_size=2, max_size=6, unique=True)


@settings(max_examples=200)
@given(poles, st.lists(st.integers(-9, 9).filter(bool), min_size=6, max_size=6), st.integers(-5, 5))
def test_every_root_is_found(places: list[int], weights: list[int], constant: int) -> None:
    """All roots that the numerator polynomial has in the range are found, and no others."""
    function = rational([float(p) for p in places], [float(w) for w in weights[: len(places)]], constant / 10, 1e-9)
    expected = roots_of_polynomial(function, -30.5, 30.5)
    distinct = np.diff(expected).size == 0 or np.diff(expected).min() > 1e-4
    found = np.array(every_root(function, -30.5, 30.5).roots)
    assert np.abs(function.value(found)).max(initial=0.0) < 1e-6
    if distinct and np.abs(np.abs(expected) - 30.5).min(initial=1.0) > 1e-6:
        assert found == pytest.approx(expected, abs=1e-6)


@pytest.mark.parametrize("gap", [1e-2, 1e-4, 1e-6])
def test_two_roots_close_together_are_both_found(gap: float) -> None:
    """A curve that dips by very little below zero has both its roots, at the scale of optical frequencies in MHz."""
    # f = 1/(a-x) + 1/(x-b) + c with a minimum between a and b; c puts it just below zero.
    a, b = 3.9e8, 3.8e8
    middle = (a + b) / 2
    least = 2 / (a - middle)
    function = rational([a, b], [1.0, -1.0], -least * (1 + gap), clearance=10.0)
    found = every_root(function, 3.81e8, 3.89e8).roots
    assert len(found) == 2
    assert found[0] < middle < found[1]
    half = (found[1] - found[0]) / 2
    assert half == pytest.approx((a - b) / 2 * np.sqrt(gap / (1 + gap)), rel=1e-5)
    assert every_root(rational([a, b], [1.0, -1.0], -least * (1 - gap), clearance=10.0), 3.81e8, 3.89e8).roots == ()


def test_root_next_to_a_weak_pole_is_found_unless_too_close() -> None:
    """A pole of tiny weight makes a root close to it: found outside its clearance, left out inside."""
    function = rational([3.8e8, 3.85e8], [1e8, 1e2], clearance=1.0)
    beside = 3.85e8 - 1e2 * 0.05e8 / 1e8
    assert every_root(function, 3.84e8, 3.86e8).roots == pytest.approx([beside], abs=1e-3)
    wide = Rational(function.pole, function.weight, np.array([1.0, 10.0]), 0.0)
    assert every_root(wide, 3.84e8, 3.86e8).roots == ()


def test_stretches_leave_out_the_clearances() -> None:
    """The range is cut around every pole in it, also where clearances overlap or reach over its ends."""
    function = rational([1.0, 5.0, 5.5, 9.9], [1.0, 1.0, 1.0, 1.0], clearance=0.5)
    assert np.array(stretches(function, 0.0, 10.0)) == pytest.approx(np.array([[0, 0.5], [1.5, 4.5], [6, 9.4]]))
    assert stretches(function, 5.1, 5.4) == []


def test_difference_that_cancels_vanishes() -> None:
    """A function less itself vanishes everywhere, and says so instead of listing roots."""
    function = rational([1.0, 3.0], [1.0, 2.0], 0.3, 0.1)
    found = every_root(minus(function, function), 0.0, 10.0)
    assert found.vanishes
    assert found.roots == ()
    assert merged(minus(function, function)).pole.size == 0


def test_noise_is_not_a_root() -> None:
    """What cancels but for rounding vanishes too: no roots are read from noise."""
    function = rational([1.0, 1.0 + 4e-16, 3.0], [1.0, -1.0 + 1e-16, 1e-17], 0.0, 0.1)
    assert every_root(function, 0.0, 10.0).roots == ()


def test_slope_is_the_derivative() -> None:
    """The slope agrees with a difference quotient."""
    function = rational([1.0, 3.0], [1.0, -2.0], 0.3)
    step = 1e-6
    quotient = (function.value(2.0 + step) - function.value(2.0 - step)) / (2 * step)
    assert function.slope(2.0) == pytest.approx(quotient, rel=1e-8)


def test_nearly_equal_functions_are_told_apart() -> None:
    """Two sums of poles a kilohertz apart differ by their derivative; all its roots are found, and that is proved.

    1/(a-x)^2 = 2/(b-x)^2 has the roots x = (sqrt2 a +- b)/(sqrt2 +- 1).
    """
    a, b, apart = 3.8e8, 3.9e8, 1e-3
    one = rational([a, b], [1.0, -2.0], clearance=10.0)
    two = rational([a + apart, b + apart], [1.0, -2.0], clearance=10.0)
    found = every_root(minus(one, two), 2.0e8, 6.0e8)
    root = np.sqrt(2)
    assert found.proved
    assert found.roots == pytest.approx([(root * a - b) / (root - 1), (root * a + b) / (root + 1)], rel=1e-7)


def test_a_search_too_long_says_so(monkeypatch: pytest.MonkeyPatch) -> None:
    """Beyond the bound on cells only changes of sign are found, and nothing is proved."""
    monkeypatch.setattr("levels.rational.MOST_CELLS", 2)
    function = rational([1.0, 3.0, 7.0], [1.0, 1.0, 1.0], 0.1, 1e-3)
    found = every_root(function, -1.0, 10.0)
    assert not found.proved
    assert found.roots == pytest.approx(roots_of_polynomial(function, -1.0, 10.0))
