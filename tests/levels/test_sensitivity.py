"""Derivatives with respect to the constants against 40 digits, and uncertainties against random draws."""

from dataclasses import replace

import mpmath
import numpy as np
import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st

from levels.blocks import block_ms
from levels.components import component
from levels.constants import MU_B_MHZ_PER_GAUSS
from levels.insensitive import difference
from levels.records import Level
from levels.sensitivity import ENERGY, MIXING, NAMES, QUADRATIC, SHIFT, SLOPE, add_terms, movement, spread, terms_of
from levels.sublevels import HZ_PER_MHZ, constants_of, find_sublevel, solve_block, sublevels
from tests import full_dimension
from tests.records_for_tests import RB87_D2, RB87_GROUND, RB87_P3, level, levels, line, quantity, signed

DRAWS = 4000
STEP = mpmath.mpf("1e-12")


def numeric(of: Level, twice_m: int, field: float, name: str) -> np.ndarray:
    """Derivatives of energy, slope and quadratic coefficient by one constant, central differences at 40 digits."""
    with mpmath.workdps(40):
        low, high = (full_dimension.precise(of, twice_m, field, {name: sign * STEP}) for sign in (-1, 1))
        pairs = [zip(*pair, strict=True) for pair in zip(low, high, strict=True)]
        rows = [[float((b - a) / (2 * STEP)) for a, b in pair] for pair in pairs]
    return np.array(rows).T * np.array([1.0, 1.0, HZ_PER_MHZ])[:, None]


def smallest_gap(of: Level, twice_m: int, field: float) -> float:
    energy = solve_block(constants_of(of), twice_m, np.array([field])).energy_mhz[0]
    gap = float(np.diff(energy).min()) if energy.size > 1 else np.inf
    return min(gap, full_dimension.largest_term(of, field))


def check_movement(of: Level, twice_m: int, field: float) -> None:
    """Compare to 1e-12 of the derivatives' own size, times (largest term / gap), which rounding grows with.

    The size is that of the largest expected number in the block, or a hundredth of what perturbation theory allows.
    """
    moved = movement(solve_block(constants_of(of), twice_m, np.array([field])), np.array([field])).numbers
    gap, zeeman = smallest_gap(of, twice_m, field), float(np.abs(full_dimension.moving(of, field)).max())
    share = 1e-12 * full_dimension.largest_term(of, field) / gap
    for at, name in enumerate(NAMES):
        expected = numeric(of, twice_m, field, name)
        unit = 1.0 if at < 3 else MU_B_MHZ_PER_GAUSS * max(abs(field), gap / zeeman)
        rate = zeeman / gap
        for row, allowed in ((ENERGY, unit), (SLOPE, unit * rate), (QUADRATIC, unit * rate**2 * HZ_PER_MHZ)):
            size = max(np.abs(expected[row]).max(), 0.01 * allowed)
            assert moved[row, at, 0] == pytest.approx(expected[row], abs=share * size)


@settings(max_examples=15)
@given(levels(st.integers(1, 5), st.integers(1, 5), mixed=True), signed(0.1, 3e3), st.data())
def test_derivatives_against_forty_digits(of: Level, field: float, data: st.DataObject) -> None:
    """dE, d(slope) and d(quadratic) by A, B, C, g_J and g_I are those of 40-digit differences, any J, I and field."""
    twice_m = data.draw(st.sampled_from(list(block_ms(of.twice_J, of.twice_I))))
    assume(full_dimension.largest_term(of, field) / smallest_gap(of, twice_m, field) < 1e4)
    check_movement(of, twice_m, field)


@pytest.mark.parametrize("field", [-35.0, 0.0, 3.2289, 120.0, 4000.0])
@pytest.mark.parametrize("twice_m", [-6, -4, 0, 2])
def test_derivatives_of_rubidium(twice_m: int, field: float) -> None:
    """The same for 87Rb 5p 2P3/2 in blocks of size 1, 2, 3 and 4, from zero field to where J and I decouple."""
    check_movement(RB87_P3, twice_m, field)


@pytest.mark.parametrize(("J", "I"), [(0, 0), (0, 3), (3, 0)])
def test_without_one_of_the_spins_only_its_factor_counts(J: int, I: int) -> None:
    """J = 0 moves with g_I alone, I = 0 with g_J alone, and J = I = 0 with nothing."""
    of = level(J, I, g_J=1.3 if J else None, g_I=0.001 if I else None, spread={"g_J": 1e-3, "g_I": 1e-6})
    eigen = solve_block(constants_of(of), J + I, np.array([50.0]))
    terms = terms_of(of, movement(eigen, np.array([50.0])))
    factors = ["g_J(a)"] * bool(J) + ["g_I(Zz)"] * bool(I)
    assert [name for name, row in zip(terms.names, terms.numbers, strict=True) if row.any()] == factors
    expected = 50.0 * MU_B_MHZ_PER_GAUSS * (J / 2 * 1e-3 + I / 2 * 1e-6)
    assert np.ravel(spread(terms).uncertainty[ENERGY])[0] == pytest.approx(expected, rel=1e-14)


def drawn(of: Level, rng: np.random.Generator, shared: dict[str, float] | None = None) -> Level:
    """The same level with every uncertain constant drawn from its normal distribution."""
    changes = {}
    for name in NAMES:
        constant = getattr(of, name)
        if constant is not None and constant.uncertainty:
            value = constant.value + constant.uncertainty * rng.standard_normal()
            changes[name] = quantity((shared or {}).get(name, value))
    return replace(of, **changes)


UNCERTAIN = level(
    3, 5, 25.0, 26.0, 0.02, 1.34, -0.0003, name="b", parity=-1,
    spread={"A": 2e-3, "B": 2e-2, "C": 1e-3, "g_J": 1.3e-3, "g_I": 1e-5},
)  # fmt: skip


@pytest.mark.parametrize(("twice_F", "twice_m"), [(4, 0), (6, 2), (8, -6), (8, 8)])
@pytest.mark.parametrize("field", [2.0, 60.0])
def test_uncertainties_against_random_constants(twice_F: int, twice_m: int, field: float) -> None:
    """Standard uncertainties of energy, slope, quadratic coefficient and shift are the scatter of 4,000 random draws.

    The scatter of N draws is itself known to 1/sqrt(2N) = 1.1 %; five of those are allowed.
    """
    rng = np.random.default_rng(20260512)
    constants = constants_of(UNCERTAIN)
    rank, fields = find_sublevel(constants, twice_F, twice_m), np.array([field])
    own = spread(terms_of(UNCERTAIN, movement(solve_block(constants, twice_m, fields), fields, [rank])))
    samples = np.empty((DRAWS, 4))
    for k in range(DRAWS):
        some = constants_of(drawn(UNCERTAIN, rng))
        eigen = solve_block(some, twice_m, fields)
        samples[k, ENERGY] = eigen.energy_mhz[0, rank]
        samples[k, SLOPE] = eigen.slope_mhz_per_gauss()[0, rank]
        samples[k, QUADRATIC] = eigen.quadratic_mhz_per_gauss2()[0, rank] * HZ_PER_MHZ
        samples[k, SHIFT] = samples[k, ENERGY] - solve_block(some, twice_m, np.zeros(1)).energy_mhz[0, rank]
    scatter = samples.std(axis=0, ddof=1)
    if twice_m == twice_F == 8:  # the stretched state is straight
        assert scatter[QUADRATIC] == own.uncertainty[QUADRATIC, 0, 0] == 0
        scatter[QUADRATIC] = own.uncertainty[QUADRATIC, 0, 0] = 1.0
    assert own.excludes == ()
    assert own.uncertainty[:, 0, 0] == pytest.approx(scatter, rel=5 / np.sqrt(2 * DRAWS))


def test_uncertainty_of_a_component_with_shared_g_I() -> None:
    """A line whose levels share one uncertain g_I scatters as its component says when g_I is drawn once for both."""
    rng = np.random.default_rng(7)
    shared = quantity(-0.001, 2e-4)
    lower = replace(RB87_GROUND, g_I=shared, g_J=quantity(2.0023, 1e-5), A=quantity(3417.3, 1e-4))
    upper = replace(RB87_P3, g_I=shared, B=quantity(12.5, 1e-4), A=quantity(84.7, 1e-4), g_J=quantity(1.336, 1e-5))
    labels, field = ((2, -2), (4, 0)), 20.0
    own = component(line(lower, upper), *labels, field).spread.uncertainty[:, 0, 0]
    samples = np.empty((DRAWS, 3))
    for k in range(DRAWS):
        both = {"g_I": shared.value + 2e-4 * rng.standard_normal()}
        some = component(line(drawn(lower, rng, both), drawn(upper, rng, both)), *labels, field)
        samples[k] = some.offset_mhz, some.slope_mhz_per_gauss, some.quadratic_hz_per_gauss2
    assert own[:3] == pytest.approx(samples.std(axis=0, ddof=1), rel=5 / np.sqrt(2 * DRAWS))


def test_shared_g_I_cancels_on_the_stretched_line() -> None:
    """On |2,2> - |3,3> both ends turn the nucleus alike, so an uncertain g_I that both share drops out entirely."""
    shared = quantity(-0.000995, 1e-5)
    lower, upper = replace(RB87_GROUND, g_I=shared), replace(RB87_P3, g_I=shared)
    alone = [replace(lower, g_J=quantity(2.0)), replace(upper, g_J=quantity(1.3), A=quantity(85.0), B=quantity(12.0))]
    found = component(line(*alone), (4, 4), (6, 6), 100.0)
    assert found.spread.stated[:3, 0, 0] == pytest.approx([0, 0, 0], abs=1e-18)
    apart = replace(alone[1], g_I=quantity(-0.000995, 3e-5))  # measured separately in the upper level
    found = component(line(alone[0], apart), (4, 4), (6, 6), 100.0)
    expected = 1.5 * MU_B_MHZ_PER_GAUSS * np.hypot(1e-5, 3e-5)
    assert found.spread.stated[SLOPE, 0, 0] == pytest.approx(expected, rel=1e-12)


def test_constants_of_two_levels_add_in_quadrature() -> None:
    """A of the lower and A of the upper level are different constants even where their numbers agree."""
    lower = level(1, 1, 100.0, g_J=2.0, g_I=0.0, name="a", spread={"A": 0.3})
    upper = level(1, 1, 100.0, g_J=2.0, g_I=0.0, name="b", spread={"A": 0.4})
    found = difference(lower, (2, 0), upper, (2, 0), 0.0)
    assert found.spread.uncertainty[ENERGY, 0, 0] == pytest.approx(0.5 / 4, rel=1e-12)
    same = difference(lower, (0, 0), lower, (2, 0), 0.0)
    assert same.spread.uncertainty[ENERGY, 0, 0] == pytest.approx(0.3, rel=1e-12)


def test_constants_without_uncertainty_are_named() -> None:
    """What a standard uncertainty leaves out is said by name; a constant that does not matter is not mentioned."""
    found = component(RB87_D2, (4, 4), (6, 6), 3.2)
    assert set(found.spread.excludes) == {"A(5s_2S1/2)"}  # g_I cancels on this line, C is not given
    away = component(RB87_D2, (4, 2), (6, 4), 3.2)
    assert set(away.spread.excludes) == {"A(5s_2S1/2)", "g_I(87Rb)"}
    at_rest = component(line(level(0, 0), level(2, 0, g_J=1.5, name="b")), (0, 0), (2, 0), 5.0)
    assert at_rest.spread.excludes == ()


def test_a_number_that_rests_on_unstated_constants_has_no_uncertainty() -> None:
    """Where a constant without uncertainty could outweigh the rest, the uncertainty is unknown, not small."""
    lower = replace(RB87_GROUND, A=quantity(3417.3, 1e-6), g_J=quantity(2.0023, 1e-7), g_I=quantity(-0.001, 1e-9))
    upper = replace(RB87_P3, A=quantity(84.7, 2e-3), B=quantity(12.5, 4e-3), g_J=quantity(1.334), g_I=lower.g_I)
    found = component(line(lower, upper), (4, 4), (6, 6), 3.0).spread
    assert np.isnan(found.uncertainty[SLOPE, 0, 0])  # 1e-4 of g_J moves it a thousand times the stated part
    assert found.uncertainty[ENERGY, 0, 0] == found.stated[ENERGY, 0, 0]  # A and B weigh more than that here
    assert found.excludes == ("g_J(5p_2P3/2)",)


def test_a_lande_factor_of_a_coupled_level_counts_for_more_than_a_doublet() -> None:
    """Coupling of 3P1 is only nearly pure: a stated rest that outweighs the formula of a doublet does not there."""
    formula = replace(quantity(1.5), evidence="computed")
    of = replace(level(2, 3, 1000.0, name="6s.6p_3P1", spread={"A": 0.05}), g_J=formula, g_I=quantity(0.0, 1e-9))
    fields = np.array([5.0])
    shifts = {}
    for term in ("3P", "2P"):
        named = replace(of, term=term)
        eigen = solve_block(constants_of(named), 5, fields)
        shifts[term] = spread(terms_of(named, movement(eigen, fields))).uncertainty[ENERGY, 0, 0]
    assert np.isnan(shifts["3P"])
    assert shifts["2P"] == pytest.approx(1.5 * 0.05, rel=1e-9)  # F = I + J: energy A I J


def test_a_shift_made_by_mixing_alone_has_no_uncertainty() -> None:
    """The quadratic shift of a 3P0 level rests on LS coupling: its uncertainty is unknown and the answer says why."""
    clock = replace(level(0, 0, name="5s.5p_3P0"), term="3P", neighbours=((2, 5.6e6),))
    found = difference(level(0, 0, name="ground"), (0, 0), clock, (0, 0), 10.0)
    assert np.isnan(found.spread.uncertainty[SHIFT, 0, 0])
    assert found.spread.excludes == ("fine-structure mixing(5s.5p_3P0)",)


@given(levels(twice_J=st.integers(1, 6), twice_I=st.integers(1, 6)))
def test_the_shift_does_not_know_the_hyperfine_constants_at_zero_field(of: Level) -> None:
    """At zero field the shift is zero whatever A, B and C are, so its derivatives vanish."""
    for twice_m in block_ms(of.twice_J, of.twice_I):
        moved = movement(solve_block(constants_of(of), twice_m, np.zeros(1)), np.zeros(1))
        size = max(np.abs(moved.numbers[ENERGY]).max(), 1.0)
        assert np.abs(moved.numbers[SHIFT]).max() <= 1e-10 * size


@given(levels(twice_J=st.integers(0, 6), twice_I=st.integers(0, 6)), signed(0.1, 1e3))
def test_energies_are_linear_in_the_constants(of: Level, field: float) -> None:
    """E = A dE/dA + B dE/dB + C dE/dC + g_J dE/dg_J + g_I dE/dg_I: the Hamiltonian is linear in its constants."""
    for twice_m in block_ms(of.twice_J, of.twice_I):
        eigen = solve_block(constants_of(of), twice_m, np.array([field]))
        moved = movement(eigen, np.array([field])).numbers[ENERGY, :, 0]
        total = sum(full_dimension.number(of, name) * moved[at] for at, name in enumerate(NAMES))
        scale = full_dimension.largest_term(of, field)
        assert total == pytest.approx(eigen.energy_mhz[0], abs=1e-11 * scale)


def test_movement_of_chosen_ranks_is_a_part_of_all() -> None:
    """Asking for one rank gives that column of the whole block, at several fields at once."""
    fields = np.array([0.0, 5.0, -40.0])
    eigen = solve_block(constants_of(RB87_P3), 0, fields)
    whole, one = movement(eigen, fields).numbers, movement(eigen, fields, [2]).numbers
    assert one.shape == (4, MIXING + 1, 3, 1)
    assert one[..., 0] == pytest.approx(whole[..., 2], rel=1e-12, abs=1e-15)
    assert movement(eigen, fields, [2]).minus(movement(eigen, fields, [2])).numbers == pytest.approx(0 * one)


def test_terms_with_the_same_key_add_before_squaring() -> None:
    """Two contributions of one g_I to a sum of two sublevels add up linearly."""
    of = level(1, 3, 3417.0, g_J=2.0, g_I=-0.001, spread={"g_I": 1e-5})
    fields = np.array([10.0])
    eigen = solve_block(constants_of(of), 4, fields)
    terms = terms_of(of, movement(eigen, fields))
    assert spread(add_terms(terms, terms)).stated == pytest.approx(2 * spread(terms).stated, rel=1e-14)


def test_sublevel_energies_are_those_that_movement_differentiates() -> None:
    """The rank that `find_sublevel` gives is the column that the table of sublevels shows under that label."""
    solved = sublevels(RB87_P3, 33.0)
    constants = constants_of(RB87_P3)
    for k, (F, m) in enumerate(zip(solved.twice_F.tolist(), solved.twice_m.tolist(), strict=True)):
        eigen = solve_block(constants, m, np.array([33.0]))
        assert solved.energy_mhz[0, k] == eigen.energy_mhz[0, find_sublevel(constants, F, m)]
