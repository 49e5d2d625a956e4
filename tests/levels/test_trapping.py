"""Magnetic traps against closed forms of two-state sublevels and an independent search."""

from collections.abc import Callable
from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from levels.constants import MU_B_MHZ_PER_GAUSS, H
from levels.errors import OutsideValidity
from levels.quantity import Quantity
from levels.records import Isotope, Level
from levels.sublevels import sublevels
from levels.trapping import MHZ_PER_MICROKELVIN, Trapped, losses, trapping
from tests.records_for_tests import CS133_GROUND, RB87_GROUND, RB87_P3, level, levels, quantity

RB = Isotope("87Rb", "Rb", 0, 37, 87, 3, "5s_2S1/2", quantity(86.909180529, 6e-9, "u"))


def by_label(found: list[Trapped]) -> dict[tuple[int, int], Trapped]:
    return {one.label: one for one in found}


def test_turning_field_of_two_states_in_closed_form() -> None:
    """|1,-1> of 87Rb turns where the slope of the Breit-Rabi formula is zero: m/2 + x + ... = 0, solved by hand."""
    A, g_J, g_I = 3417.34130545, 2.00233113, -0.0009951414
    one = by_label(trapping(RB, RB87_GROUND))[2, -2]
    per_gauss = (g_J - g_I) * MU_B_MHZ_PER_GAUSS / (2 * A)
    # E = -A/4 + g_I mu m B - A sqrt(1 + m x + x^2) with m = -1: dE/dB = 0
    fields = np.linspace(1100.0, 1300.0, 2_000_001)
    x = per_gauss * fields
    slope = -g_I * MU_B_MHZ_PER_GAUSS - A * (x - 0.5) / np.sqrt(1 - x + x**2) * per_gauss
    turn = float(fields[np.argmin(np.abs(slope))])
    assert one.turning_gauss == pytest.approx(turn, abs=2e-4)
    assert one.seeks == "weak field"
    assert one.from_gauss == 0.0
    assert one.depth_mhz == pytest.approx(A * (1 - np.sqrt(0.75)) - g_I * MU_B_MHZ_PER_GAUSS * turn * 1.0, rel=1e-4)
    assert one.moment_mu_b == pytest.approx(-0.5018, abs=1e-4)


@given(levels(twice_J=st.integers(1, 3), twice_I=st.integers(0, 5)), st.floats(0.0, 50.0))
def test_slopes_are_positive_between_start_and_turn(of: Level, bottom: float) -> None:
    """From where a sublevel begins to seek weak field to where it turns its energy rises; before it falls."""
    found = trapping(RB, of, bottom, 3000.0)
    fine = np.linspace(bottom, 3000.0, 3001)
    solved = sublevels(of, fine)
    for k, one in enumerate(found):
        slope = solved.slope_mhz_per_gauss[:, k]
        inside = np.zeros(fine.size, dtype=bool)
        if one.from_gauss is not None:
            end = 3000.0 if one.turning_gauss is None else one.turning_gauss
            inside = (fine > one.from_gauss) & (fine < end)
            assert one.depth_mhz is not None
            assert one.depth_mhz >= -1e-9
        assert (slope[inside] > -1e-6).all()
        before = fine < (3000.0 if one.from_gauss is None else one.from_gauss)
        assert (slope[before] < 1e-6).all()


def test_sublevels_without_a_slope_at_zero_field() -> None:
    """m = 0 is held by its curvature in the upper hyperfine level (|2,0>) and pushed out in the lower (|1,0>)."""
    found = by_label(trapping(RB, RB87_GROUND))
    assert (found[4, 0].seeks, found[4, 0].from_gauss, found[4, 0].levitation_gauss_per_cm) == ("weak field", 0.0, None)
    assert (found[2, 0].seeks, found[2, 0].from_gauss, found[2, 0].depth_mhz) == ("neither", None, None)
    assert found[4, -4].seeks == "strong field"
    still = trapping(RB, level(0, 0, name="s"))
    assert [(one.seeks, one.depth_mhz) for one in still] == [("neither", None)]


def test_strong_field_seeker_that_turns_back() -> None:
    """|2,-1> of 87Rb seeks strong field at first and weak field above some 1217 G; its depth counts from there."""
    one = by_label(trapping(RB, RB87_GROUND, 0.0, 3000.0))[4, -2]
    assert one.seeks == "strong field"
    assert one.from_gauss == pytest.approx(1216.7, abs=0.1)
    solved = sublevels(RB87_GROUND, [one.from_gauss, 3000.0])
    at = int(np.nonzero((solved.twice_F == 4) & (solved.twice_m == -2))[0][0])
    assert one.depth_mhz == pytest.approx(float(np.diff(solved.energy_mhz[:, at])[0]), rel=1e-12)


def test_levitation_balances_gravity() -> None:
    """The gradient times the moment is the weight; reversing m leaves it as it is."""
    found = by_label(trapping(RB, RB87_GROUND, 1.0))
    for one in found.values():
        assert one.levitation_gauss_per_cm is not None or one.slope_mhz_per_gauss == 0
    one = found[4, 4]
    force = H * one.slope_mhz_per_gauss * 1e10 * one.levitation_gauss_per_cm * 1e-2
    assert force == pytest.approx(86.909180529 * 1.66053906892e-27 * 9.80665, rel=1e-9)


def test_knife_takes_out_at_the_asked_depth() -> None:
    """At the knife's field the energy above the bottom is the asked depth and the splitting is the frequency."""
    found = by_label(trapping(RB, RB87_GROUND, 1.5, 2000.0, 500.0))
    for label, to in (((4, 4), (4, 2)), ((4, 2), (4, 0)), ((2, -2), (2, 0))):
        knife = found[label].knife
        assert knife is not None
        assert knife.to == to
        solved = sublevels(RB87_GROUND, [1.5, knife.field_gauss])
        own, other = (int(np.nonzero((solved.twice_F == F) & (solved.twice_m == m))[0][0]) for F, m in (label, to))
        depth = float(solved.energy_mhz[1, own] - solved.energy_mhz[0, own])
        assert depth == pytest.approx(500.0 * MHZ_PER_MICROKELVIN, rel=1e-9)
        split = np.abs(solved.energy_mhz[:, own] - solved.energy_mhz[:, other])
        assert (knife.bottom_mhz, knife.frequency_mhz) == (pytest.approx(split[0]), pytest.approx(split[1]))
    depth_of_a_megahertz = 1 / MHZ_PER_MICROKELVIN
    assert depth_of_a_megahertz == pytest.approx(47.9924, abs=1e-4)  # h/k_B


def test_why_there_is_no_knife() -> None:
    """Too deep, not drawn to weak field, nobody next to it, not asked: each has its own sentence."""
    deep = by_label(trapping(RB, RB87_GROUND, 0.0, 2000.0, 1e6))
    assert deep[2, -2].no_knife == "the trap is only 2.205e+04 uK deep"
    assert deep[4, -4].no_knife == "the sublevel is not drawn to weak field"
    assert by_label(trapping(RB, RB87_GROUND))[4, 4].no_knife == "no depth was asked for"
    lonely = level(0, 1, g_I=-0.001, name="s")
    assert [one.no_knife for one in trapping(RB, lonely, 0.0, 10.0, 1e-9)][1] in (
        "", "the sublevel is not drawn to weak field"
    )  # fmt: skip


def moved(of: Level, name: str, step: float) -> Level:
    constant = getattr(of, name)
    assert isinstance(constant, Quantity)
    return replace(of, **{name: replace(constant, value=constant.value + step)})


def test_uncertainties_are_those_of_the_constants() -> None:
    """Turning field, depth and knife move with A as their uncertainties say, by symmetric differences."""
    of = level(1, 3, 3417.34, g_J=2.0023, g_I=-0.001, name="s", spread={"A": 0.01, "g_J": 1e-12, "g_I": 1e-15})
    one = by_label(trapping(RB, of, 1.0, 2000.0, 800.0))[2, -2]
    ends = [by_label(trapping(RB, moved(of, "A", sign * 0.01), 1.0, 2000.0, 800.0))[2, -2] for sign in (1, -1)]

    def span(read: Callable[[Trapped], float]) -> float:
        return abs(read(ends[0]) - read(ends[1])) / 2

    assert one.turning_uncertainty_gauss == pytest.approx(span(lambda it: it.turning_gauss), rel=1e-3)
    assert one.depth_uncertainty_mhz == pytest.approx(span(lambda it: it.depth_mhz), rel=1e-4)
    assert one.knife is not None
    assert one.knife.frequency_uncertainty_mhz == pytest.approx(span(lambda it: it.knife.frequency_mhz), rel=1e-2)


def test_unstated_constants_leave_no_uncertainty() -> None:
    """A hyperfine constant without a stated uncertainty makes that of the turning field unknown, and is named."""
    one = by_label(trapping(RB, CS133_GROUND, 0.0, 4000.0))[6, -6]
    assert np.isnan(one.turning_uncertainty_gauss)
    assert "A(6s_2S1/2)" in one.excludes


def test_losses_follow_the_level_and_the_bottom() -> None:
    """Spin flips act where the field vanishes; decay has the level's rate; microwaves need a hyperfine structure."""
    excited = replace(RB87_P3, lifetime=quantity(26.2e-9, 1e-10, "s"))
    channels = {one.channel: one for one in losses(excited, 0.0)}
    assert channels["radiative decay of the level"].rate_per_s == pytest.approx(1 / 26.2e-9)
    spin = next(one for name, one in channels.items() if name.startswith("spin flips"))
    assert spin.acts == "the field vanishes at the bottom"
    held = {one.channel: one for one in losses(RB87_GROUND, 1.0)}
    assert next(one for name, one in held.items() if name.startswith("spin flips")).acts.startswith("not while")
    assert "radiative decay of the level" not in held
    assert any("microwave" in name for name in held)
    assert not any("microwave" in one.channel for one in losses(level(2, 0, g_J=1.5), 1.0))


@pytest.mark.parametrize(("bottom", "largest"), [(-1.0, 10.0), (10.0, 10.0), (0.0, 2e6), (0.0, float("nan"))])
def test_bad_ranges_are_refused(bottom: float, largest: float) -> None:
    """A bottom below zero, an empty range or one beyond the bound is refused."""
    with pytest.raises(OutsideValidity, match="the bottom from 0 G"):
        trapping(RB, RB87_GROUND, bottom, largest)
