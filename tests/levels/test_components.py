"""Components of a line: strengths by an independent operator and by sum rules, numbers by differences of sublevels."""

from dataclasses import replace
from fractions import Fraction

import numpy as np
import pytest
from hypothesis import assume, given
from hypothesis import strategies as st

from levels.angular import line_strength
from levels.components import (
    amplitudes,
    component,
    components,
    pairs_of,
    strength_model,
    strengths,
    zero_field_strength,
)
from levels.constants import MU_B_MHZ_PER_GAUSS
from levels.errors import NotPublished, OutsideValidity, UnknownName
from levels.records import Level, Line
from levels.sensitivity import ENERGY
from levels.sublevels import constants_of, solve_block, sublevels
from tests import full_dimension
from tests.records_for_tests import (
    CS133_D2,
    RB87_D1,
    RB87_D2,
    RB87_GROUND,
    RB87_P3,
    level,
    levels,
    line,
    quantity,
    signed,
)

fields = st.one_of(st.just(0.0), signed(1e-2, 2e4))


@st.composite
def lines(draw: st.DrawFn, largest_twice_J: int = 8, largest_twice_I: int = 5) -> Line:
    """A line of rank 1, 2 or 3 between any two levels that it can join."""
    rank, J = draw(st.integers(1, 3)), draw(st.integers(0, largest_twice_J))
    J_up = draw(st.sampled_from(range(abs(J - 2 * rank), J + 2 * rank + 1, 2)))
    I = draw(st.integers(0, largest_twice_I))
    lower, upper = draw(levels(st.just(J), st.just(I))), draw(levels(st.just(J_up), st.just(I)))
    return line(lower, replace(upper, name="b", g_I=lower.g_I), rank)


def condition(of: Level, field: float) -> float:
    """How far rounding errors in the states grow: the largest term over the smallest gap inside an m."""
    return max(1.0, full_dimension.largest_term(of, field) / full_dimension.solve(of, field).gap_mhz)


@given(lines(), fields)
def test_sum_rules_hold_at_any_field(of: Line, field: float) -> None:
    """All decays of an upper sublevel sum to 1; all absorption of a lower one to (2J'+1)/(2J+1); each q has its share.

    Over the whole line one q carries (2J'+1)(2I+1)/(2k+1). Completeness of the two levels demands it at every field.
    """
    found = components(of, field)
    strength = found.strength[0]
    J, J_up, I, k = of.lower.twice_J, of.upper.twice_J, of.lower.twice_I, of.rank
    uppers: dict[tuple[int, int], float] = {}
    lowers: dict[tuple[int, int], float] = {}
    for at in range(strength.size):
        up = (int(found.upper_twice_F[at]), int(found.upper_twice_m[at]))
        low = (int(found.lower_twice_F[at]), int(found.lower_twice_m[at]))
        uppers[up] = uppers.get(up, 0.0) + strength[at]
        lowers[low] = lowers.get(low, 0.0) + strength[at]
    assert len(uppers) == (J_up + 1) * (I + 1)
    assert list(uppers.values()) == pytest.approx([1.0] * len(uppers), abs=1e-11)
    assert list(lowers.values()) == pytest.approx([(J_up + 1) / (J + 1)] * len(lowers), abs=1e-11)
    for q in range(-k, k + 1):
        assert strength[found.q == q].sum() == pytest.approx((J_up + 1) * (I + 1) / (2 * k + 1), abs=1e-10)


@given(lines(), fields)
def test_absorption_of_one_polarisation(of: Line, field: float) -> None:
    """What a lower sublevel absorbs of one polarisation is that of its m_J, weighted with how much of each it holds."""
    found = components(of, field)
    solved = full_dimension.solve(of.lower, field)
    assume(condition(of.lower, field) < 1e6)
    order = np.lexsort((sublevels(of.lower, field).energy_mhz[0], sublevels(of.lower, field).twice_m))
    solved_low = sublevels(of.lower, field)
    labels = list(zip(solved_low.twice_F[order].tolist(), solved_low.twice_m[order].tolist(), strict=True))
    lower_labels = list(zip(found.lower_twice_F.tolist(), found.lower_twice_m.tolist(), strict=True))
    for q in range(-of.rank, of.rank + 1):
        operator = full_dimension.multipole(of.lower.twice_J, of.upper.twice_J, of.lower.twice_I, of.rank, q)
        held = np.einsum("ik,ij,jk->k", solved.states, operator.T @ operator, solved.states)
        for label, expected in zip(labels, held, strict=True):
            mine = [k for k, low in enumerate(lower_labels) if low == label and found.q[k] == q]
            assert found.strength[0, mine].sum() == pytest.approx(expected, abs=1e-8)


@given(lines(largest_twice_J=5, largest_twice_I=4), fields)
def test_strengths_agree_with_full_dimension(of: Line, field: float) -> None:
    """Every strength is the squared element of an independent multipole operator between plain eigh vectors."""
    blur = 1e-13 * (condition(of.lower, field) + condition(of.upper, field))
    assume(blur < 1e-6)
    low, up = full_dimension.solve(of.lower, field), full_dimension.solve(of.upper, field)
    ranks = [
        {label: k for k, label in enumerate(zip(s.twice_F[o].tolist(), s.twice_m[o].tolist(), strict=True))}
        for s in (sublevels(of.lower, field), sublevels(of.upper, field))
        for o in [np.lexsort((s.energy_mhz[0], s.twice_m))]
    ]
    found = components(of, field)
    for q in range(-of.rank, of.rank + 1):
        operator = full_dimension.multipole(of.lower.twice_J, of.upper.twice_J, of.lower.twice_I, of.rank, q)
        square = (up.states.T @ operator @ low.states) ** 2
        for at in np.nonzero(found.q == q)[0]:
            row = ranks[1][int(found.upper_twice_F[at]), int(found.upper_twice_m[at])]
            column = ranks[0][int(found.lower_twice_F[at]), int(found.lower_twice_m[at])]
            assert found.strength[0, at] == pytest.approx(square[row, column], abs=blur + 1e-12)


@given(lines())
def test_zero_field_strengths_are_the_exact_rationals(of: Line) -> None:
    """At zero field the numerical strength of every component is its exact fraction."""
    assume(max(condition(of.lower, 0.0), condition(of.upper, 0.0)) < 1e4)
    found = components(of, 0.0)
    exact = [float(fraction) for fraction in found.zero_field_strength]
    assert found.strength[0] == pytest.approx(exact, abs=1e-10)


@given(lines(largest_twice_J=4, largest_twice_I=4), fields)
def test_a_component_is_a_row_of_the_table(of: Line, field: float) -> None:
    """One component alone gives the numbers of the table, and those are the differences of its two sublevels."""
    found = components(of, field)
    below, above = sublevels(of.lower, field), sublevels(of.upper, field)
    low_at = {pair: k for k, pair in enumerate(zip(below.twice_F.tolist(), below.twice_m.tolist(), strict=True))}
    up_at = {pair: k for k, pair in enumerate(zip(above.twice_F.tolist(), above.twice_m.tolist(), strict=True))}
    at = (len(found.q) * 3) // 4
    low = (int(found.lower_twice_F[at]), int(found.lower_twice_m[at]))
    up = (int(found.upper_twice_F[at]), int(found.upper_twice_m[at]))
    one = component(of, low, up, field)
    i, j = low_at[low], up_at[up]
    scale = full_dimension.largest_term(of.lower, field) + full_dimension.largest_term(of.upper, field)
    expected = above.energy_mhz[0, j] - below.energy_mhz[0, i]
    assert one.offset_mhz == found.offset_mhz[0, at] == pytest.approx(expected, abs=1e-13 * scale)
    assert found.shift_mhz[0, at] == pytest.approx(one.shift_mhz, abs=1e-12 * scale)
    slope = above.slope_mhz_per_gauss[0, j] - below.slope_mhz_per_gauss[0, i]
    assert one.slope_mhz_per_gauss == found.slope_mhz_per_gauss[0, at] == pytest.approx(slope, rel=1e-12, abs=1e-13)
    quadratic = above.quadratic_hz_per_gauss2[0, j] - below.quadratic_hz_per_gauss2[0, i]
    assert one.quadratic_hz_per_gauss2 == pytest.approx(quadratic, rel=1e-9, abs=1e-6)
    assert found.quadratic_hz_per_gauss2[0, at] == pytest.approx(quadratic, rel=1e-12, abs=1e-9)
    assert one.strength == pytest.approx(found.strength[0, at], abs=1e-12)
    assert one.zero_field_strength == found.zero_field_strength[at]
    assert one.q == found.q[at] == (up[1] - low[1]) // 2


@given(lines(largest_twice_J=4, largest_twice_I=4), fields)
def test_reversing_field_and_m_keeps_strengths(of: Line, field: float) -> None:
    """A component at B has the strength and offset of the one with -m and -m' at -B, with the other circular light."""
    assume(max(condition(of.lower, field), condition(of.upper, field)) < 1e5)
    one, two = components(of, field), components(of, -field)
    rows = zip(one.lower_twice_F, one.lower_twice_m, one.upper_twice_F, one.upper_twice_m, strict=True)
    places = {row: k for k, row in enumerate(rows)}
    mirror = [places[F, -m, F_up, -m_up] for F, m, F_up, m_up in places]
    assert one.strength[0] == pytest.approx(two.strength[0][mirror], abs=1e-9)
    assert one.offset_mhz[0] == pytest.approx(two.offset_mhz[0][mirror], rel=1e-11, abs=1e-9)
    assert np.array_equal(one.q, -two.q[mirror])


@pytest.mark.parametrize("of", [RB87_D1, RB87_D2, CS133_D2], ids=["87Rb D1", "87Rb D2", "133Cs D2"])
def test_a_strong_field_leaves_one_component_per_m_J_step(of: Line) -> None:
    """In a strong field only components that keep m_I are left: (2I+1) for each m_J, m_J' pair of each polarisation."""
    found = components(of, 5e5)
    strong = found.strength[0] > 1e-2
    steps = {-1: 0, 0: 0, 1: 0}
    for q in steps:
        steps[q] = int(np.count_nonzero(strong & (found.q == q)))
    I, J_up = of.lower.twice_I, of.upper.twice_J
    per_q = {-1: 1, 0: 2, 1: 1} if J_up == 1 else {-1: 2, 0: 2, 1: 2}
    assert steps == {q: count * (I + 1) for q, count in per_q.items()}


@pytest.mark.parametrize("field", [-5000.0, 0.0, 1.0, 1e3, 1e5])
def test_the_stretched_line_is_straight(field: float) -> None:
    """87Rb |2,2> - |3,3>: strength 1 and slope (3/2 g_J' - 1/2 g_J) muB at every field; g_I drops out.

    A guiding transition: common practice gives 1.40 MHz/G with g_J' = 4/3.
    """
    found = component(RB87_D2, (4, 4), (6, 6), field)
    assert found.strength == pytest.approx(1.0, abs=1e-14)
    assert found.zero_field_strength == Fraction(1)
    expected = MU_B_MHZ_PER_GAUSS * (1.5 * 1.3362 - 0.5 * 2.00233113)
    assert found.slope_mhz_per_gauss == pytest.approx(expected, rel=1e-13)
    assert found.shift_mhz == pytest.approx(expected * field, rel=1e-12, abs=1e-9)
    assert found.quadratic_hz_per_gauss2 == 0
    assert found.q == 1


def test_pi_light_on_equal_F_leaves_zero_to_zero_dark() -> None:
    """|F, 0> - |F' = F, 0> is forbidden at zero field and opens with the field (87Rb D1, D2)."""
    for of in (RB87_D1, RB87_D2):
        assert component(of, (4, 0), (4, 0), 0.0).strength == pytest.approx(0, abs=1e-28)
        assert component(of, (4, 0), (4, 0), 0.0).zero_field_strength == 0
        assert component(of, (4, 0), (4, 0), 50.0).strength > 1e-5


def test_forbidden_dF_2_components_open_with_the_field() -> None:
    """87Rb |1,-1> - |3,-1> (dF = 2) has no strength at zero field and some at 500 G."""
    assert component(RB87_D2, (2, -2), (6, -2), 0.0).strength == pytest.approx(0, abs=1e-28)
    assert component(RB87_D2, (2, -2), (6, -2), 500.0).strength > 0.01


def test_lists_of_pairs() -> None:
    """A line lists every pair with |m' - m| up to its rank, ordered by F, m, F', m', and one q when asked for one."""
    pairs = pairs_of(RB87_D2)
    assert pairs == sorted(pairs)
    assert sorted(pair for q in (-1, 0, 1) for pair in pairs_of(RB87_D2, q)) == pairs
    assert len(set(pairs)) == len(pairs) == 68
    assert all(up[1] - low[1] == 2 for low, up in pairs_of(RB87_D2, 1))
    only = components(RB87_D2, [0.0, 10.0], q=1)
    assert only.offset_mhz.shape == (2, len(pairs_of(RB87_D2, 1)))
    assert set(only.q.tolist()) == {1}


def test_strengths_of_chosen_pairs() -> None:
    """Strengths can be asked for a few pairs only, in any order, at many fields."""
    pairs = [((4, 4), (6, 6)), ((2, 0), (0, 0)), ((4, 0), (6, 0))]
    found = strengths(RB87_D2, [0.0, 100.0], pairs)
    for column, (low, up) in enumerate(pairs):
        for row, field in enumerate((0.0, 100.0)):
            assert found[row, column] == pytest.approx(component(RB87_D2, low, up, field).strength, abs=1e-12)


def test_a_long_grid_of_components_is_that_of_single_fields() -> None:
    """Strengths on 1,001 fields are those of each field alone, to 1e-10."""
    grid = np.linspace(-200.0, 300.0, 1001)
    swept = components(RB87_D2, grid)
    for row in (0, 17, 400, 555, 1000):
        alone = components(RB87_D2, grid[row])
        assert swept.strength[row] == pytest.approx(alone.strength[0], abs=1e-10)
        assert swept.offset_mhz[row] == pytest.approx(alone.offset_mhz[0], abs=1e-8)


def test_amplitudes_keep_relative_signs() -> None:
    """Amplitudes between two solved blocks are coherent: they rotate the lower block into the upper operator."""
    below, above = constants_of(RB87_GROUND), constants_of(RB87_P3)
    low, up = solve_block(below, 0, np.array([7.0])), solve_block(above, 2, np.array([7.0]))
    amplitude = amplitudes(RB87_D2, low, up)[0]
    total = amplitude @ amplitude.T  # sum over lower states: an operator of the upper block alone, basis-independent
    turned = up.states[0] @ total @ up.states[0].T
    full = full_dimension.multipole(1, 3, 3, 1, 1)
    square = full @ full.T
    rows = [  # |m_J', m_I> of the upper block in the full basis, highest first there, lowest first here
        (3 - mJ) // 2 * 4 + (3 - mI) // 2 for mJ, mI in zip(up.block.twice_mJ, up.block.twice_mI, strict=True)
    ]
    assert turned == pytest.approx(square[np.ix_(rows, rows)], abs=1e-13)


@pytest.mark.parametrize("q", [-2, 2, 5])
def test_a_polarisation_beyond_the_rank_is_refused(q: int) -> None:
    """A dipole line has no component with |m' - m| = 2."""
    with pytest.raises(OutsideValidity, match="from -1 to 1"):
        components(RB87_D2, 1.0, q=q)


def test_a_forbidden_component_names_the_rule() -> None:
    """|2,2> - |3,0> on a dipole line raises OutsideValidity and says which m the rule leaves."""
    with pytest.raises(OutsideValidity, match="an E1 line changes m by at most 1: from m = 2 to 1 or 2 or 3"):
        component(RB87_D2, (4, 4), (6, 0), 1.0)


@pytest.mark.parametrize(
    ("low", "up"), [((6, 6), (6, 6)), ((4, 6), (6, 6)), ((4, 4), (8, 6)), ((4, 4), (6, 8)), ((3, 3), (6, 4))]
)
def test_sublevels_that_do_not_exist_are_refused(low: tuple[int, int], up: tuple[int, int]) -> None:
    """An F or m that a level does not have raises UnknownName."""
    with pytest.raises(UnknownName):
        component(RB87_D2, low, up, 1.0)


def test_a_quadrupole_line_reaches_two_steps_of_m() -> None:
    """40Ca+-like 2S1/2 - 2D5/2 (E2, I = 0): ten components, strengths as (5/2 2 1/2) 3j symbols squared times six."""
    clock = line(level(1, 0, g_J=2.00225664), level(5, 0, g_J=1.2003340, name="b"), 2)
    found = components(clock, 4.0)
    by_label = {
        (low, up): value
        for low, up, value in zip(found.lower_twice_m, found.upper_twice_m, found.strength[0], strict=True)
    }
    assert len(by_label) == 10
    assert by_label[1, 5] == pytest.approx(1.0, abs=1e-14)
    assert by_label[1, 3] == pytest.approx(4 / 5, abs=1e-14)
    assert by_label[-1, 3] == pytest.approx(1 / 5, abs=1e-14)
    assert by_label[1, 1] == pytest.approx(3 / 5, abs=1e-14)
    assert by_label[-1, 1] == pytest.approx(2 / 5, abs=1e-14)


def test_frequency_joins_centroid_and_offset() -> None:
    """The frequency is the centroid plus the offset, its uncertainty both in quadrature; without a centroid, None."""
    lower = replace(RB87_D2.lower, A=quantity(3417.341, 1e-6, "MHz"))
    placed = replace(RB87_D2, lower=lower, centroid=quantity(384230484.468, 0.012, "MHz"))
    found = component(placed, (4, 4), (6, 6), 0.0)
    assert found.frequency_mhz == pytest.approx(384230484.468 + found.offset_mhz, abs=1e-6)
    offset_part = found.spread.uncertainty[ENERGY, 0, 0]
    assert found.frequency_uncertainty_mhz == pytest.approx(np.hypot(0.012, offset_part))
    unsure = component(replace(RB87_D2, centroid=placed.centroid), (4, 4), (6, 6), 0.0)
    assert unsure.frequency_uncertainty_mhz is None  # A of the lower level has none stated
    bare = component(RB87_D2, (4, 4), (6, 6), 0.0)
    assert bare.frequency_mhz is None
    assert bare.frequency_uncertainty_mhz is None


def test_offsets_count_from_the_centroid() -> None:
    """Weighted with 2F+1 the zero-field offsets of a line average to zero."""
    found = components(RB87_D2, 0.0)
    pairs = dict.fromkeys(zip(found.lower_twice_F.tolist(), found.upper_twice_F.tolist(), strict=True))
    total = 0.0
    for F, F_up in pairs:
        at = np.nonzero((found.lower_twice_F == F) & (found.upper_twice_F == F_up))[0][0]
        total += (F + 1) * (F_up + 1) * found.offset_mhz[0, at]
    assert set(pairs) == {(F, F_up) for F in (2, 4) for F_up in (0, 2, 4, 6)}
    assert total == pytest.approx(0.0, abs=1e-8)


CLOCK_LOWER = level(0, 9, g_I=-0.0001317)
CLOCK_UPPER = level(0, 9, g_I=-0.00020923, name="b", parity=-1)


def test_a_hyperfine_induced_line_has_strengths_between_F() -> None:
    """A 1S0 - 3P0 line that hyperfine mixing opens drives F - F' as if they were J and J'; its decays sum to 1."""
    clock = line(CLOCK_LOWER, CLOCK_UPPER, induced="hyperfine")
    assert strength_model(clock) == "F"
    found = components(clock, 3.0)
    by_upper: dict[int, float] = {}
    for m, value in zip(found.upper_twice_m.tolist(), found.strength[0], strict=True):
        by_upper[m] = by_upper.get(m, 0.0) + value
    assert list(by_upper.values()) == pytest.approx([1.0] * 10, abs=1e-12)
    assert zero_field_strength(clock, (9, 9), (9, 9)) == Fraction(9, 11)  # pi: m^2 / F(F+1)
    assert component(clock, (9, 9), (9, 9), 3.0).strength == pytest.approx(9 / 11, abs=1e-14)


def test_a_field_induced_line_says_that_its_strength_is_unknown() -> None:
    """A line that only a field opens has frequencies and slopes, and says that its strength is not in the model."""
    clock = line(level(0, 0), level(0, 0, name="b", parity=-1), induced="magnetic field")
    found = component(clock, (0, 0), (0, 0), 3.0)
    assert strength_model(clock) == ""
    assert not found.strength_known
    assert found.strength == 0.0
    assert found.zero_field_strength == 0
    assert not components(clock, 3.0).strength_known


def test_a_missing_constant_of_either_level_is_named() -> None:
    """A line whose upper level lacks A raises NotPublished with that level's name."""
    with pytest.raises(NotPublished, match="A of 87Rb 5p_2P3/2"):
        component(replace(RB87_D2, upper=replace(RB87_P3, A=None)), (4, 4), (6, 6), 1.0)


@given(lines(largest_twice_J=6, largest_twice_I=5))
def test_components_add_up_to_line_strengths(of: Line) -> None:
    """Summed over m and m', the zero-field strengths of F - F' are S(F,F') (2F+1) (2J'+1)/(2J+1)."""
    found = components(of, 0.0)
    sums: dict[tuple[int, int], Fraction] = {}
    for F, F_up, value in zip(
        found.lower_twice_F.tolist(), found.upper_twice_F.tolist(), found.zero_field_strength, strict=True
    ):
        sums[F, F_up] = sums.get((F, F_up), Fraction(0)) + value
    J, J_up, I = of.lower.twice_J, of.upper.twice_J, of.lower.twice_I
    for (F, F_up), total in sums.items():
        assert total == line_strength(J, J_up, I, F, F_up, of.rank) * (F + 1) * Fraction(J_up + 1, J + 1)


def test_a_measured_component_is_answered_from_its_measurement() -> None:
    """Frequency and uncertainty of a component measured itself are the measurement's, moved by the field alone."""
    measured = quantity(384228115.203, 0.001, "MHz")
    placed = replace(RB87_D2, centroid=quantity(384230484.468, 0.5, "MHz"), measured=((4, 6, measured),))
    at_rest = component(placed, (4, 4), (6, 6), 0.0)
    assert (at_rest.frequency_mhz, at_rest.frequency_uncertainty_mhz) == (measured.value, measured.uncertainty)
    moved, table = component(placed, (4, 4), (6, 6), 3.0), components(placed, 3.0)
    assert moved.frequency_mhz == pytest.approx(measured.value + moved.shift_mhz, abs=1e-7)
    row = int(np.flatnonzero((table.lower_twice_m == 4) & (table.upper_twice_m == 6))[0])
    assert table.frequency_mhz is not None
    assert table.frequency_mhz[0, row] == moved.frequency_mhz
    other = component(placed, (4, 4), (4, 4), 0.0)
    assert other.frequency_mhz == pytest.approx(384230484.468 + other.offset_mhz, abs=1e-7)
