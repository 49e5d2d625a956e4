"""Energies, slopes and quadratic coefficients against full dimension, closed forms, limits and 40 digits."""

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st

from levels.angular import hyperfine_shares
from levels.blocks import block_ms
from levels.constants import MU_B_MHZ_PER_GAUSS
from levels.errors import NotPublished, OutsideValidity, UnknownName
from levels.records import Level
from levels.sublevels import (
    HZ_PER_MHZ,
    Sublevels,
    cautions,
    constants_of,
    find_sublevel,
    high_field_labels,
    labels_of,
    ranked_F,
    solve_block,
    sublevels,
)
from tests import full_dimension
from tests.records_for_tests import CS133_P3, LARGE, RB87_GROUND, RB87_P3, level, levels, signed

EPS = float(np.finfo(float).eps)
fields = st.one_of(st.just(0.0), signed(1e-3, 1e5))


def by_m_and_energy(solved: Sublevels) -> np.ndarray:
    """The order of the full-dimension answer."""
    return np.lexsort((solved.energy_mhz[0], solved.twice_m))


def smallest_gap(of: Level) -> float:
    """The smallest zero-field distance between two F of one level."""
    constants = constants_of(of)
    energies = np.sort([solve_block(constants, 0 if (of.twice_J + of.twice_I) % 2 == 0 else 1, np.zeros(1)).energy_mhz])
    return float(np.diff(energies).min()) if energies.size > 1 else np.inf


@given(levels(mixed=True), fields)
def test_energies_agree_with_full_dimension(of: Level, field: float) -> None:
    """Every energy of any level at any field is that of a plain eigh, to 1e-11 of the largest term."""
    expected, actual = full_dimension.solve(of, field), sublevels(of, field)
    order = by_m_and_energy(actual)
    assert np.array_equal(actual.twice_m[order], expected.twice_m)
    scale = full_dimension.largest_term(of, field)
    assert np.abs(actual.energy_mhz[0][order] - expected.energy_mhz).max() <= 1e-11 * scale


@given(levels(mixed=True), fields)
def test_slopes_agree_with_full_dimension(of: Level, field: float) -> None:
    """Every slope is the expectation of dH/dB in the full-dimension eigenvectors, to rounding over the gap."""
    expected, actual = full_dimension.solve(of, field), sublevels(of, field)
    order = by_m_and_energy(actual)
    zeeman = max(np.abs(full_dimension.moving(of, field)).max(), 1e-12)
    blur = 1e-12 + 1e3 * EPS * full_dimension.largest_term(of, field) / expected.gap_mhz
    assume(blur < 1e-3)
    assert np.abs(actual.slope_mhz_per_gauss[0][order] - expected.slope_mhz_per_gauss).max() <= blur * zeeman


@given(levels(), fields)
def test_F_labels_are_those_of_zero_field(of: Level, field: float) -> None:
    """The k-th energy of an m carries, at every field, the F that F^2 measures in the k-th zero-field state."""
    assume(smallest_gap(of) > 1e-6 * full_dimension.largest_term(of, 0.0))
    solved = sublevels(of, field)
    assert np.array_equal(solved.twice_F[by_m_and_energy(solved)], full_dimension.zero_field_labels(of))


@given(levels(), fields)
def test_trace_does_not_move(of: Level, field: float) -> None:
    """Energies, slopes and quadratic coefficients each add up to zero over the whole level."""
    solved = sublevels(of, field)
    count = solved.twice_F.size
    assert abs(solved.energy_mhz.sum()) <= 1e-13 * full_dimension.largest_term(of, field) * count
    assert abs(solved.slope_mhz_per_gauss.sum()) <= 1e-13 * np.abs(full_dimension.zeeman(of)).max() * count
    size = np.abs(solved.quadratic_hz_per_gauss2).sum()
    assert abs(solved.quadratic_hz_per_gauss2.sum()) <= 1e-9 * max(size, 1e-9)


@given(levels(mixed=True), fields)
def test_reversing_field_and_m_changes_nothing(of: Level, field: float) -> None:
    """E(F, m, B) = E(F, -m, -B), with the slope turned and the quadratic coefficient kept."""
    one, two = sublevels(of, field), sublevels(of, -field)
    places = {label: k for k, label in enumerate(zip(one.twice_F.tolist(), one.twice_m.tolist(), strict=True))}
    mirror = [places[F, -m] for F, m in places]
    scale = full_dimension.largest_term(of, field)
    assert one.energy_mhz[0] == pytest.approx(two.energy_mhz[0][mirror], abs=1e-12 * scale)
    blur = 1e-12 + 1e3 * EPS * scale / full_dimension.solve(of, field).gap_mhz
    zeeman = np.abs(full_dimension.moving(of, field)).max()
    assert one.slope_mhz_per_gauss[0] == pytest.approx(-two.slope_mhz_per_gauss[0][mirror], abs=blur * zeeman + 1e-15)


@given(levels(twice_J=st.integers(1, 16), twice_I=st.integers(1, 9)), st.sampled_from([-1.0, 1.0]))
def test_strong_field_decouples_the_spins(of: Level, sign: float) -> None:
    """In a strong field E -> muB (g_J m_J + g_I m_I) B + <m_J m_I|H_hfs|m_J m_I> with the labels that are given.

    What is left falls as (hyperfine)^2 / Zeeman splitting; the labels follow the sign of the field.
    """
    hyperfine = float(np.abs(np.linalg.eigvalsh(full_dimension.still(of))).max())
    g_J, g_I = of.g_J.value, of.g_I.value  # type: ignore[union-attr]
    assume(abs(g_J - g_I) > 0.05)
    splitting = 1e4 * hyperfine
    field = sign * splitting / (MU_B_MHZ_PER_GAUSS * abs(g_J - g_I))
    assume(abs(field) < 1e6)
    solved = sublevels(of, field)
    diagonal = np.diag(full_dimension.still(of))
    ops = full_dimension.operators(of.twice_J, of.twice_I)
    products = list(zip(np.rint(2 * np.diag(ops.J_z)), np.rint(2 * np.diag(ops.I_z)), strict=True))
    where = {pair: k for k, pair in enumerate(products)}
    for k, (mJ, mI) in enumerate(zip(solved.twice_mJ, solved.twice_mI, strict=True)):
        zeeman = MU_B_MHZ_PER_GAUSS * (g_J * mJ + g_I * mI) / 2 * field
        expected = zeeman + diagonal[where[mJ, mI]]
        assert solved.energy_mhz[0, k] == pytest.approx(expected, abs=5 * hyperfine**2 / splitting)
    assert len(set(zip(solved.twice_mJ, solved.twice_mI, strict=True))) == solved.twice_F.size


def breit_rabi(of: Level, upper: bool, m: float, field: float) -> tuple[float, float, float]:
    """Energy, slope and half the second derivative of a J = 1/2 sublevel in closed form (Breit, Rabi 1931).

    E = -h A/4 + g_I muB m B +- (Delta/2) sqrt(1 + 4 m x/(2I+1) + x^2), x = (g_J - g_I) muB B / Delta,
    Delta = A (I + 1/2); the upper sign belongs to F = I + 1/2 whatever the sign of A.
    """
    A, g_J, g_I = (full_dimension.number(of, name) for name in ("A", "g_J", "g_I"))
    I = of.twice_I / 2
    delta = A * (I + 0.5)
    rate = (g_J - g_I) * MU_B_MHZ_PER_GAUSS / delta
    x, sign = rate * field, 1.0 if upper else -1.0
    tilt = 4 * m / (2 * I + 1)
    if abs(m) == I + 0.5:  # the root is a perfect square and keeps its sign through zero
        root, first, second = 1 + x * tilt / 2, tilt / 2, 0.0
    else:
        root = np.sqrt(1 + tilt * x + x * x)
        first = (tilt / 2 + x) / root
        second = 1 / root - (tilt / 2 + x) ** 2 / root**3
    nuclear = g_I * MU_B_MHZ_PER_GAUSS * m
    return (
        -A / 4 + nuclear * field + sign * delta / 2 * root,
        nuclear + sign * delta / 2 * first * rate,
        sign * delta / 4 * second * rate**2 * HZ_PER_MHZ,
    )


@given(levels(twice_J=st.just(1), twice_I=st.integers(1, 9)), fields)
def test_breit_rabi(of: Level, field: float) -> None:
    """A level of J = 1/2 has the energies, slopes and quadratic coefficients of the closed formula, any I, either sign.

    Breit and Rabi, Phys. Rev. 38, 2082 (1931).
    """
    solved = sublevels(of, field)
    delta = abs(of.A.value) * (of.twice_I + 1) / 2  # type: ignore[union-attr]
    rate = abs(of.g_J.value - of.g_I.value) * MU_B_MHZ_PER_GAUSS  # type: ignore[union-attr]
    scale = full_dimension.largest_term(of, field)
    for k, (F, m) in enumerate(zip(solved.twice_F, solved.twice_m, strict=True)):
        energy, slope, quadratic = breit_rabi(of, bool(of.twice_I + 1 == F), m / 2, field)
        assert solved.energy_mhz[0, k] == pytest.approx(energy, abs=1e-12 * scale)
        assert solved.slope_mhz_per_gauss[0, k] == pytest.approx(slope, abs=1e-11 * rate)
        assert solved.quadratic_hz_per_gauss2[0, k] == pytest.approx(
            quadratic, abs=1e-10 * rate**2 / delta * HZ_PER_MHZ
        )


@settings(max_examples=8)
@given(levels(st.integers(2, 7), st.integers(1, 5), mixed=True), signed(1.0, 3e3), st.data())
def test_slopes_and_quadratics_against_forty_digits(of: Level, field: float, data: st.DataObject) -> None:
    """Slope and quadratic coefficient are the first and half the second derivative, by differences at 40 digits.

    Central differences with a step of 1e-9 G at 40 digits are exact to 1e-16; what is compared is our rounding, which
    grows with (largest term / gap).
    """
    twice_m = data.draw(st.sampled_from(list(block_ms(of.twice_J, of.twice_I))))
    slope, quadratic = full_dimension.differences(of, twice_m, field, 1e-9)
    eigen = solve_block(constants_of(of), twice_m, np.array([field]))
    gap = float(np.diff(eigen.energy_mhz[0]).min()) if eigen.block.size > 1 else np.inf
    scale = full_dimension.largest_term(of, field)
    assume(scale / gap < 1e7)
    zeeman = float(np.abs(full_dimension.moving(of, field)).max())
    blur = 100 * EPS * scale / gap + 1e-12
    assert eigen.slope_mhz_per_gauss()[0] == pytest.approx(slope, abs=blur * zeeman)
    assert eigen.quadratic_mhz_per_gauss2()[0] == pytest.approx(quadratic, abs=blur * zeeman**2 / gap + 1e-18)


@pytest.mark.parametrize("of", [RB87_P3, CS133_P3, LARGE], ids=lambda of: f"{of.atom} {of.name}")
def test_large_level_against_forty_digits(of: Level) -> None:
    """At several fields the middle block of a many-sublevel level is right to 1e-13, 1e-12 and 1e-9.

    Of the largest term (energies), of the largest element of dH/dB (slopes), of the largest quadratic coefficient.
    """
    twice_m = (of.twice_J + of.twice_I) % 2
    for field in (-800.0, 0.0, 0.5, 37.0, 250.0, 2.0e4):
        expected = np.array(full_dimension.precise(of, twice_m, field), dtype=float)
        eigen = solve_block(constants_of(of), twice_m, np.array([field]))
        actual = (eigen.energy_mhz[0], eigen.slope_mhz_per_gauss()[0], eigen.quadratic_mhz_per_gauss2()[0])
        zeeman = np.abs(full_dimension.zeeman(of)).max()
        sizes = (full_dimension.largest_term(of, field), zeeman, np.abs(expected[:, 2]).max())
        for column, (share, size) in enumerate(zip((1e-13, 1e-12, 1e-9), sizes, strict=True)):
            assert actual[column] == pytest.approx(expected[:, column], abs=share * size)


@given(levels(twice_I=st.just(0)), fields)
def test_without_nuclear_spin_the_field_splits_evenly(of: Level, field: float) -> None:
    """I = 0: E = muB g_J m B exactly, no curvature, F stands for J; J = 0 as well: one sublevel that does not move."""
    solved = sublevels(of, field)
    g_J = 0.0 if of.g_J is None else of.g_J.value
    slope = MU_B_MHZ_PER_GAUSS * g_J * solved.twice_m / 2
    assert set(solved.twice_F.tolist()) == {of.twice_J}
    assert solved.energy_mhz[0] == pytest.approx(slope * field, rel=1e-14, abs=1e-300)
    assert solved.slope_mhz_per_gauss[0] == pytest.approx(slope, rel=1e-14, abs=1e-300)
    assert np.all(solved.quadratic_hz_per_gauss2 == 0)
    assert np.array_equal(solved.twice_mJ, solved.twice_m)


@given(levels(twice_J=st.just(0), twice_I=st.integers(1, 9)), fields)
def test_without_electronic_spin_only_the_nucleus_turns(of: Level, field: float) -> None:
    """J = 0: E = muB g_I m B, F stands for I, and neither A nor g_J is asked for."""
    solved = sublevels(of, field)
    slope = MU_B_MHZ_PER_GAUSS * of.g_I.value * solved.twice_m / 2  # type: ignore[union-attr]
    assert set(solved.twice_F.tolist()) == {of.twice_I}
    assert solved.slope_mhz_per_gauss[0] == pytest.approx(slope, rel=1e-14)
    assert solved.energy_mhz[0] == pytest.approx(slope * field, rel=1e-14, abs=1e-300)


@given(levels(), st.lists(fields, min_size=2, max_size=5))
def test_many_fields_are_the_single_ones(of: Level, several: list[float]) -> None:
    """An array of fields gives the rows of the single fields, in the order asked."""
    together = sublevels(of, several)
    for row, field in enumerate(several):
        alone = sublevels(of, field)
        scale = full_dimension.largest_term(of, field)
        assert together.energy_mhz[row] == pytest.approx(alone.energy_mhz[0], abs=1e-13 * scale)
        assert together.slope_mhz_per_gauss.shape == (len(several), alone.twice_F.size)


@given(levels())
def test_nothing_has_shifted_at_zero_field(of: Level) -> None:
    """At zero field every shift is zero and the energies are those of A, B and C."""
    solved = sublevels(of, 0.0)
    assert np.abs(solved.shift_mhz).max() <= 1e-12 * full_dimension.largest_term(of, 0.0)


@given(levels(), st.floats(1e-6, 1e-4))
def test_weak_field_slope_is_g_F_times_m(of: Level, field: float) -> None:
    """In a weak field the slope is muB g_F m with g_F from the vector model, for any F."""
    assume(smallest_gap(of) > 0.1)
    solved = sublevels(of, 0.0)
    g_J, g_I = full_dimension.number(of, "g_J"), full_dimension.number(of, "g_I")
    for k, F in enumerate(solved.twice_F.tolist()):
        share_J, share_I = hyperfine_shares(F, of.twice_J, of.twice_I)
        g_F = float(share_J) * g_J + float(share_I) * g_I
        expected = MU_B_MHZ_PER_GAUSS * g_F * solved.twice_m[k] / 2
        assert solved.slope_mhz_per_gauss[0, k] == pytest.approx(expected, abs=1e-9)
        assert solved.moment_mu_b[0, k] == pytest.approx(-g_F * solved.twice_m[k] / 2, abs=1e-9)


def test_rubidium_ground_at_one_tesla() -> None:
    """87Rb 5s: |2,2> moves by (g_J/2 + 3 g_I/2) muB = 1.3992 MHz/G at every field, straight."""
    solved = sublevels(RB87_GROUND, [0.0, 1.0, 1e4])
    last = -1
    assert (solved.twice_F[last], solved.twice_m[last]) == (4, 4)
    expected = MU_B_MHZ_PER_GAUSS * (2.00233113 / 2 - 1.5 * 0.0009951414)
    assert solved.slope_mhz_per_gauss[:, last] == pytest.approx(np.full(3, expected), rel=1e-14)
    assert np.all(solved.quadratic_hz_per_gauss2[:, last] == 0)


def test_high_field_labels_of_rubidium() -> None:
    """87Rb 5s |2,m> reaches m_J = +1/2 but for |2,-2>, and a negative field turns the labels round."""
    forward, backward = sublevels(RB87_GROUND, 3e4), sublevels(RB87_GROUND, -3e4)
    labels = {(F, m): mJ for F, m, mJ in zip(forward.twice_F, forward.twice_m, forward.twice_mJ, strict=True)}
    assert [labels[4, m] for m in (-4, -2, 0, 2, 4)] == [-1, 1, 1, 1, 1]
    assert [labels[2, m] for m in (-2, 0, 2)] == [-1, -1, -1]
    turned = {(F, m): mJ for F, m, mJ in zip(backward.twice_F, backward.twice_m, backward.twice_mJ, strict=True)}
    assert all(turned[F, -m] == -mJ for (F, m), mJ in labels.items())


def test_labels_with_a_small_g_J_follow_the_larger_factor() -> None:
    """Where g_I outweighs g_J the order of m_J in a strong field is the reverse."""
    constants = constants_of(level(1, 1, 1000.0, g_J=-0.002, g_I=0.003))
    assert high_field_labels(constants, 0) == ((1, -1), (-1, 1))


def test_order_of_the_table() -> None:
    """Sublevels are listed by F and then by m."""
    solved = sublevels(RB87_P3, 12.0)
    pairs = list(zip(solved.twice_F.tolist(), solved.twice_m.tolist(), strict=True))
    assert pairs == labels_of(constants_of(RB87_P3)) == sorted(pairs)


def test_inverted_structure_keeps_its_labels() -> None:
    """With A < 0 (as in 40K) F = I + 1/2 lies lowest and keeps its label."""
    assert ranked_F(constants_of(level(1, 8, -285.7308, g_J=2.00229421, g_I=0.000176490)), 1) == (9, 7)


def test_quadratic_can_be_left_out() -> None:
    """Without quadratic coefficients the other numbers are the same and the column is empty."""
    full, short = sublevels(RB87_P3, [1.0, 2.0]), sublevels(RB87_P3, [1.0, 2.0], quadratic=False)
    assert np.array_equal(full.energy_mhz, short.energy_mhz)
    assert short.quadratic_hz_per_gauss2.shape == (2, 0)


@pytest.mark.parametrize("field", [float("nan"), float("inf"), -float("inf"), 1.1e6, [0.0, float("nan")]])
def test_impossible_fields_are_refused(field: float | list[float]) -> None:
    """NaN, infinity and a field beyond a million gauss raise OutsideValidity naming the range."""
    with pytest.raises(OutsideValidity, match="from -1e\\+06 to 1e\\+06 G"):
        sublevels(RB87_P3, field)


@pytest.mark.parametrize(("name", "missing"), [("A", "A"), ("g_J", "g_J"), ("g_I", "g_I")])
def test_a_missing_constant_is_named(name: str, missing: str) -> None:
    """A constant that the Hamiltonian needs and nobody published raises NotPublished with its name and level."""
    with pytest.raises(NotPublished, match=f"{missing} of 87Rb 5p_2P3/2 is not in the catalogue"):
        sublevels(replace(RB87_P3, **{name: None}), 1.0)


def test_a_missing_B_is_a_caution() -> None:
    """An unpublished B is taken as zero and said; where no quadrupole exists nothing is said."""
    bare = replace(RB87_P3, B=None)
    assert cautions(bare) == ("B of 87Rb 5p_2P3/2 is not in the catalogue and taken as zero",)
    assert cautions(replace(RB87_GROUND, B=None)) == ()


@pytest.mark.parametrize(
    ("label", "hint"),
    [((2, 6), "m of F = 1 runs from -1 to 1"), ((8, 0), "F is one of 0, 1, 2, 3"), ((4, 1), "in steps of 1")],
)
def test_unknown_sublevels_say_what_exists(label: tuple[int, int], hint: str) -> None:
    """A sublevel that does not exist raises UnknownName with the F or m that do."""
    with pytest.raises(UnknownName, match=hint):
        find_sublevel(constants_of(RB87_P3), *label)


def test_coinciding_hyperfine_levels_are_refused() -> None:
    """With A = 0 the F of a level coincide at zero field, and labels by F are refused rather than invented."""
    with pytest.raises(OutsideValidity, match="coincide at zero field"):
        sublevels(level(1, 3, 0.0, g_J=2.0, g_I=0.0), 1.0)
