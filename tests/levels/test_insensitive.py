"""Field-insensitive points and fields from splittings against closed forms, brute force and round trips."""

from dataclasses import replace

import mpmath
import numpy as np
import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st
from numpy.typing import NDArray

from levels.constants import MU_B_MHZ_PER_GAUSS
from levels.errors import NotPublished, OutsideValidity, UnknownName
from levels.insensitive import difference, field_grid, fields_from_splitting, insensitive, roots
from levels.records import Level
from levels.sublevels import HZ_PER_MHZ, constants_of, sublevels
from tests import full_dimension
from tests.records_for_tests import (
    CS133_GROUND,
    CS133_P3,
    RB87_GROUND,
    RB87_P3,
    level,
    levels,
    quantity,
    signed,
)

Array = NDArray[np.float64]
halves = levels(twice_J=st.just(1), twice_I=st.integers(1, 9))


def delta_and_rate(of: Level) -> tuple[float, float]:
    """The zero-field splitting A (I + 1/2) in MHz and (g_J - g_I) muB in MHz/G of a J = 1/2 level."""
    numbers = {name: full_dimension.number(of, name) for name in ("A", "g_J", "g_I")}
    return numbers["A"] * (of.twice_I + 1) / 2, (numbers["g_J"] - numbers["g_I"]) * MU_B_MHZ_PER_GAUSS


@given(halves)
def test_equal_m_pairs_of_a_J_half_level(of: Level) -> None:
    """|I-1/2, m> and |I+1/2, m> part as Delta sqrt(1 + 4mx/(2I+1) + x^2): least at x = -2m/(2I+1), in closed form.

    There the difference is |Delta| sqrt(1 - c^2) and the quadratic coefficient rate^2 / (2 |Delta| sqrt(1 - c^2)) with
    c = 2m/(2I+1). Breit and Rabi, Phys. Rev. 38, 2082 (1931).
    """
    delta, rate = delta_and_rate(of)
    assume(abs(rate) > 0.05)
    largest = 2 * abs(delta / rate)
    found = [point for point in insensitive(of, of, largest, max_twice_dm=0) if point.lower[1] == point.upper[1]]
    expected = []
    for m in range(1 - of.twice_I, of.twice_I, 2):
        field = -m / (of.twice_I + 1) * delta / rate
        if field >= 0:
            expected.append((field, m))
    assert [point.lower[1] for point in found] == [m for _, m in sorted(expected)]
    for point, (field, m) in zip(found, sorted(expected), strict=True):
        root = np.sqrt(1 - (m / (of.twice_I + 1)) ** 2)
        assert {point.lower[0], point.upper[0]} == {of.twice_I - 1, of.twice_I + 1}
        assert point.field_gauss == pytest.approx(field, rel=1e-11, abs=1e-12)
        assert point.difference_mhz == pytest.approx(abs(delta) * root, rel=1e-12)
        assert point.quadratic_hz_per_gauss2 == pytest.approx(
            rate**2 / (2 * abs(delta) * root) * HZ_PER_MHZ, rel=1e-9
        )


def breit_rabi_slopes(of: Level, field: Array) -> dict[tuple[int, int], Array]:
    """dE/dB of every sublevel of a J = 1/2 level on a grid, closed form."""
    delta, rate = delta_and_rate(of)
    x = rate * field / delta
    nuclear = full_dimension.number(of, "g_I") * MU_B_MHZ_PER_GAUSS
    slopes = {}
    for sign, F in ((1, of.twice_I + 1), (-1, of.twice_I - 1)):
        for m in range(-F, F + 1, 2):
            tilt = 2 * m / (of.twice_I + 1)
            if abs(m) == of.twice_I + 1:
                bend = np.full_like(x, np.sign(m))
            else:
                bend = (tilt / 2 + x) / np.sqrt(1 + tilt * x + x * x)
            slopes[F, m] = nuclear * m / 2 + sign * rate / 2 * bend
    return slopes


@settings(max_examples=20)
@given(halves)
def test_no_pair_is_missed_and_none_invented(of: Level) -> None:
    """All pairs with |dm| <= 2 up to three times the decoupling field are those of a dense scan of the closed form."""
    delta, rate = delta_and_rate(of)
    assume(abs(rate) > 0.05)
    largest = 3 * abs(delta / rate)
    grid = np.concatenate([[0.0], np.geomspace(1e-6 * largest, largest, 20001)])
    slopes = breit_rabi_slopes(of, grid)
    expected = set()
    for one in slopes:
        for two in slopes:
            if one < two and abs(two[1] - one[1]) <= 4:
                value = slopes[two] - slopes[one]
                if np.abs(value).max() < 1e-12 or (np.abs(value[1:]).min() < 1e-10 and one[1] != two[1]):
                    continue
                for at in np.nonzero(value[:-1] * value[1:] < 0)[0]:
                    expected.add((frozenset((one, two)), int(at)))
                if one[1] == two[1] == 0:
                    expected.add((frozenset((one, two)), -1))
    found = {
        (frozenset((point.lower, point.upper)), int(np.searchsorted(grid, point.field_gauss)) - 1)
        for point in insensitive(of, of, largest)
    }
    assert found == expected


def test_clock_pair_of_rubidium_in_closed_form() -> None:
    """87Rb |1,-1> - |2,1>: the root of the closed-form slope difference by mpmath, field to 1e-9 G, frequency to 1 uHz.

    The point that trapped-atom clocks use; the published numbers are compared in tests/published.
    """
    delta, rate = delta_and_rate(RB87_GROUND)
    with mpmath.workdps(40):
        A, g_J, g_I = (mpmath.mpf(full_dimension.number(RB87_GROUND, n)) for n in ("A", "g_J", "g_I"))
        span, turn = 2 * A, (g_J - g_I) * mpmath.mpf(MU_B_MHZ_PER_GAUSS)
        nuclear = 2 * g_I * mpmath.mpf(MU_B_MHZ_PER_GAUSS)

        def splitting(b: "mpmath.mpf") -> "mpmath.mpf":
            x = turn * b / span
            return nuclear * b + span / 2 * (mpmath.sqrt(1 + x + x * x) + mpmath.sqrt(1 - x + x * x))

        field = mpmath.findroot(lambda b: mpmath.diff(splitting, b), 3.2)
        frequency, quadratic = splitting(field), mpmath.diff(splitting, field, 2) / 2
    found = [p for p in insensitive(RB87_GROUND, RB87_GROUND, 100.0) if (p.lower, p.upper) == ((2, -2), (4, 2))]
    assert len(found) == 1
    assert found[0].field_gauss == pytest.approx(float(field), abs=1e-9)
    assert found[0].difference_mhz == pytest.approx(float(frequency), abs=1e-11 * delta)
    assert found[0].quadratic_hz_per_gauss2 == pytest.approx(float(quadratic) * HZ_PER_MHZ, rel=1e-9)
    assert rate > 0


@pytest.mark.parametrize(
    ("lower", "upper", "largest"),
    [(CS133_P3, CS133_P3, 300.0), (RB87_GROUND, RB87_P3, 400.0)],
    ids=["within 6p3/2", "87Rb D2"],
)
def test_points_are_stationary(lower: Level, upper: Level, largest: float) -> None:
    """At every point found, in a level of any J or on a line, the difference of slopes is zero and the curvature right.

    Checked with the full-dimension Hamiltonian; the number of points is that of a dense scan.
    """
    points = insensitive(lower, upper, largest)
    assert len(points) > 20
    for point in points[:: max(1, len(points) // 12)]:
        slopes = []
        for of, (F, m) in ((lower, point.lower), (upper, point.upper)):
            solved, labels = full_dimension.solve(of, point.field_gauss), full_dimension.zero_field_labels(of)
            at = np.nonzero((solved.twice_m == m) & (labels == F))[0]
            slopes.append(float(solved.slope_mhz_per_gauss[at][0]))
        assert slopes[1] == pytest.approx(slopes[0], abs=1e-11)
    grid = np.linspace(1e-3, largest, 30001)
    low, up = sublevels(lower, grid, quadratic=False), sublevels(upper, grid, quadratic=False)
    crossings = 0
    for i in range(low.twice_F.size):
        for j in range(i + 1 if lower is upper else 0, up.twice_F.size):
            if abs(up.twice_m[j] - low.twice_m[i]) <= 4:
                value = up.slope_mhz_per_gauss[:, j] - low.slope_mhz_per_gauss[:, i]
                if np.abs(value).max() > 1e-12:
                    crossings += int(np.count_nonzero(value[:-1] * value[1:] < 0))
    assert crossings == sum(point.field_gauss > 1e-3 for point in points)


def test_a_clock_pair_is_listed_at_zero_field() -> None:
    """|3,0> - |4,0> of 133Cs is stationary at zero field, with K = (g_J - g_I)^2 muB^2 / 2 nu.

    Vanier and Audoin, The Quantum Physics of Atomic Frequency Standards (1989).
    """
    first = insensitive(CS133_GROUND, CS133_GROUND, 10.0)[0]
    delta, rate = delta_and_rate(CS133_GROUND)
    assert (first.lower, first.upper, first.field_gauss) == ((6, 0), (8, 0), 0.0)
    assert first.difference_mhz == pytest.approx(delta, rel=1e-13)
    assert first.quadratic_hz_per_gauss2 == pytest.approx(rate**2 / (2 * delta) * HZ_PER_MHZ, rel=1e-11)
    assert first.field_uncertainty_gauss == 0.0


def test_the_lower_energy_comes_first() -> None:
    """With A < 0 the upper F lies below and is listed as `lower`, so that the difference is positive."""
    inverted = level(1, 3, -625.0, g_J=2.00226206, g_I=0.0002134779853)
    points = insensitive(inverted, inverted, 200.0)
    assert points
    assert all(point.difference_mhz > 0 for point in points)
    assert {(point.lower, point.upper) for point in points} >= {((4, 0), (2, 2)), ((4, 0), (2, 0))}


def test_uncertainty_of_a_point_follows_its_constants() -> None:
    """The standard uncertainty of the field is that of the field's own numeric derivatives by A, g_J and g_I."""
    of = replace(RB87_GROUND, g_I=quantity(-0.000995, 3e-6), g_J=quantity(2.00233, 1e-4), A=quantity(3417.3, 1.0))

    def clock(some: Level) -> float:
        return next(p.field_gauss for p in insensitive(some, some, 50.0) if p.lower == (2, -2))

    moves = []
    for name in ("A", "g_J", "g_I"):
        constant = getattr(of, name)
        step = constant.uncertainty
        low, high = (clock(replace(of, **{name: quantity(constant.value + k * step)})) for k in (-1, 1))
        moves.append((high - low) / 2)
    point = next(p for p in insensitive(of, of, 50.0) if p.lower == (2, -2))
    assert point.field_uncertainty_gauss == pytest.approx(np.linalg.norm(moves), rel=1e-5)


def parabola(centre: float, depth: float) -> tuple[Array, Array, Array, object]:
    """(b - centre)^2 - depth on a coarse grid, with its derivative."""
    grid = np.linspace(0.0, 10.0, 11)

    def numbers(column: NDArray[np.int64], field: Array) -> tuple[Array, Array]:
        return (field - centre) ** 2 - depth, 2 * (field - centre)

    values, derivatives = numbers(np.zeros(grid.size, dtype=np.int64), grid)
    return grid, values[:, None], derivatives[:, None], numbers


@given(st.floats(0.2, 9.8), st.floats(-9.0, -1.0))
def test_two_roots_in_one_interval_are_both_found(centre: float, exponent: float) -> None:
    """Two roots closer than the grid are found by the turning point between them."""
    depth = 10.0**exponent
    half = depth**0.5
    assume(abs(centre - round(centre)) > 2 * half)
    grid, values, derivatives, numbers = parabola(centre, depth)
    columns, found = roots(numbers, grid, values, derivatives)  # type: ignore[arg-type]
    assert columns.tolist() == [0, 0]
    assert np.sort(found) == pytest.approx([centre - half, centre + half], abs=1e-12 / half + 1e-14)


@given(st.floats(0.2, 9.8), st.floats(1e-9, 1.0))
def test_a_turning_point_that_does_not_reach_zero_is_no_root(centre: float, height: float) -> None:
    """Where a function turns before zero nothing is found."""
    grid, values, derivatives, numbers = parabola(centre, -height)
    assert roots(numbers, grid, values, derivatives)[1].size == 0  # type: ignore[arg-type]


def test_a_root_on_a_grid_point_is_found_once() -> None:
    """A root that is a grid point is listed once."""
    grid = np.linspace(-5.0, 5.0, 11)

    def numbers(column: NDArray[np.int64], field: Array) -> tuple[Array, Array]:
        return field**3, 3 * field**2

    values, derivatives = numbers(np.zeros(11, dtype=np.int64), grid)
    columns, found = roots(numbers, grid, values[:, None], derivatives[:, None])
    assert found.tolist() == [0.0]
    assert columns.tolist() == [0]


@given(levels(twice_J=st.integers(1, 5), twice_I=st.integers(1, 5)), st.floats(0.5, 900.0), st.data())
def test_field_from_splitting_round_trip(of: Level, field: float, data: st.DataObject) -> None:
    """A splitting computed at a field leads back to that field, and every field found gives that splitting."""
    labels = list(zip(*(x.tolist() for x in (sublevels(of, 0.0).twice_F, sublevels(of, 0.0).twice_m)), strict=True))
    low, up = data.draw(st.lists(st.sampled_from(labels), min_size=2, max_size=2, unique=True))
    at = difference(of, low, of, up, field)
    zero = difference(of, low, of, up, 0.0)
    assume(abs(at.slope_mhz_per_gauss) > 1e-3)
    sign = np.sign(zero.difference_mhz) if low[0] != up[0] else np.sign(zero.slope_mhz_per_gauss) or 1.0
    assume(at.difference_mhz * sign > 1e-3)  # within a level a splitting is asked for without its sign
    found = fields_from_splitting(of, low, of, up, abs(at.difference_mhz), 1000.0)
    scale = full_dimension.largest_term(of, 1000.0)
    nearest = min(found, key=lambda one: abs(one.field_gauss - field))
    assert nearest.field_gauss == pytest.approx(field, abs=1e-12 * scale / abs(at.slope_mhz_per_gauss) + 1e-9)
    for one in found:
        again = difference(of, low, of, up, one.field_gauss)
        assert again.difference_mhz == pytest.approx(at.difference_mhz, abs=1e-12 * scale)
        assert one.slope_mhz_per_gauss == pytest.approx(again.slope_mhz_per_gauss)


def test_both_sides_of_a_turning_point_are_found() -> None:
    """1e-9 MHz above the least |1,-1> - |2,1> splitting of 87Rb two fields 3 mG apart fit, and both are given."""
    least = difference(RB87_GROUND, (2, -2), RB87_GROUND, (4, 2), 3.228916963)
    found = fields_from_splitting(RB87_GROUND, (2, -2), RB87_GROUND, (4, 2), least.difference_mhz + 1e-9, 100.0)
    half = np.sqrt(1e-9 / 431.36e-6)
    assert [one.field_gauss for one in found] == pytest.approx([3.228917 - half, 3.228917 + half], abs=2e-5)


@pytest.mark.parametrize("of", [RB87_GROUND, CS133_GROUND], ids=["87Rb", "133Cs"])
def test_the_least_splitting_itself_leads_to_its_field(of: Level) -> None:
    """The frequency of every field-insensitive point leads back to its field, rounding or not."""
    for point in insensitive(of, of, 3000.0):
        found = fields_from_splitting(of, point.lower, of, point.upper, point.difference_mhz, 3000.0)
        nearest = min(found, key=lambda one: abs(one.field_gauss - point.field_gauss))
        assert nearest.field_gauss == pytest.approx(point.field_gauss, abs=2e-4)
        assert nearest.uncertainty_gauss is None


def test_a_splitting_out_of_reach_has_no_field() -> None:
    """Below the least splitting nothing fits, and an empty list says so."""
    assert fields_from_splitting(RB87_GROUND, (2, -2), RB87_GROUND, (4, 2), 6834.0, 100.0) == []


def test_a_line_offset_leads_back_to_the_field() -> None:
    """Between two levels the splitting is the signed offset from the centroid: 87Rb |2,2> - |3,3> at 100 G."""
    at = difference(RB87_GROUND, (4, 4), RB87_P3, (6, 6), 100.0)
    found = fields_from_splitting(RB87_GROUND, (4, 4), RB87_P3, (6, 6), at.difference_mhz, 1000.0)
    assert [one.field_gauss for one in found] == pytest.approx([100.0], abs=1e-9)


def test_uncertainty_of_a_field_joins_measurement_and_constants() -> None:
    """(A uncertainty in quadrature with the measurement's) / slope, and what carries no uncertainty is named.

    87Rb |1,1> - |2,2> rises by 2.1 MHz/G: 1 kHz of measurement is 0.48 mG.
    """
    of = replace(RB87_GROUND, A=quantity(3417.34130545, 2e-4), g_J=quantity(2.00233113, 1e-4))
    at = difference(of, (2, 2), of, (4, 4), 10.0)
    found = fields_from_splitting(of, (2, 2), of, (4, 4), at.difference_mhz, 100.0, 1e-3)
    assert len(found) == 1
    constants = np.hypot(at.spread.uncertainty[0, 0, 0], 1e-3)
    assert found[0].uncertainty_gauss == pytest.approx(constants / at.slope_mhz_per_gauss, rel=1e-9)
    assert found[0].uncertainty_gauss == pytest.approx(7.6e-4, rel=0.1)
    assert found[0].excludes == ("g_I(87Rb)",)


def test_at_a_turning_point_there_is_no_first_order_uncertainty() -> None:
    """At zero field the 0-0 splitting says nothing about the field to first order: the uncertainty is None."""
    found = fields_from_splitting(CS133_GROUND, (6, 0), CS133_GROUND, (8, 0), 9192.63177, 10.0, 1e-6)
    assert [one.field_gauss for one in found] == [0.0]
    assert found[0].uncertainty_gauss is None


@given(levels(twice_J=st.integers(1, 8), twice_I=st.integers(0, 9)), st.floats(1e-3, 1e6))
def test_the_grid_runs_from_zero_to_the_largest_field(of: Level, largest: float) -> None:
    """Grid points rise strictly from 0 to exactly the largest field."""
    grid = field_grid(constants_of(of), largest)
    assert grid[0] == 0.0
    assert grid[-1] == largest
    assert np.all(np.diff(grid) > 0)


@pytest.mark.parametrize("largest", [0.0, -1.0, float("nan"), float("inf"), 2e6])
def test_impossible_ranges_are_refused(largest: float) -> None:
    """A range that is empty, negative, endless or beyond the model raises OutsideValidity."""
    with pytest.raises(OutsideValidity, match="above 0 and up to"):
        insensitive(RB87_GROUND, RB87_GROUND, largest)
    with pytest.raises(OutsideValidity, match="above 0 and up to"):
        fields_from_splitting(RB87_GROUND, (2, 0), RB87_GROUND, (4, 0), 6834.0, largest)


def test_unknown_labels_and_missing_constants_are_named() -> None:
    """A sublevel that does not exist and a constant nobody published each raise their own error."""
    with pytest.raises(UnknownName, match="F is one of 1, 2"):
        fields_from_splitting(RB87_GROUND, (6, 0), RB87_GROUND, (4, 0), 6834.0, 10.0)
    with pytest.raises(NotPublished, match="g_J"):
        insensitive(replace(RB87_GROUND, g_J=None), RB87_GROUND, 10.0)


@given(signed(0.5, 3.0), st.integers(1, 6))
def test_straight_levels_have_no_points(g_J: float, twice_J: int) -> None:
    """Without a nuclear spin every sublevel is straight: no pair stops moving, and nothing is invented."""
    of = level(twice_J, 0, g_J=g_J)
    assert insensitive(of, of, 1000.0) == []
