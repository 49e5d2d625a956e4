"""Pairs for clocks and qubits: candidates, drives, noise figures, order."""

from dataclasses import replace

import numpy as np
import pytest

from levels.lightshift import shift_of
from levels.magic import Side
from levels.pairs import Asked, Noise, candidates, drive_of_pair, magnetic_element, ranked_pairs
from levels.partners import partners_of
from levels.setting import make_setting
from tests.full_dimension import operators, solve, spin
from tests.levels.lightshift_records import D1, D2, RB87
from tests.records_for_tests import quantity

GROUND = RB87.levels[0]
RB = partners_of(replace(RB87, static_polarisability={GROUND.name: quantity(320.1, 0.6)}), GROUND)  # type: ignore[arg-type]
ASKED = Asked(RB, RB, 100.0)


def test_magnetic_elements_against_full_dimension() -> None:
    """<u|g_J J_q + g_I I_q|l> has the size that plain matrices and eigenvectors give, at fields weak and strong."""
    ops = operators(1, 3)
    g_J, g_I = GROUND.g_J.value, GROUND.g_I.value  # type: ignore[union-attr]
    raising = np.kron(g_J * spin(1)[1], np.eye(4)) + np.kron(np.eye(2), g_I * spin(3)[1])
    plus = -raising / np.sqrt(2)
    none = g_J * ops.J_z + g_I * ops.I_z
    for field in (0.5, 600.0):
        full = solve(GROUND, field)
        labels = [(2, -2), (2, 0), (2, 2), (4, -4), (4, -2), (4, 0), (4, 2), (4, 4)]
        place = {label: k for k, label in enumerate(sorted(labels, key=lambda pair: (pair[1], pair[0])))}
        for low in labels:
            for up in labels:
                if abs(up[1] - low[1]) > 2:
                    continue
                matrix = {2: plus, 0: none, -2: -plus.T}[up[1] - low[1]]
                expected = full.states[:, place[up]] @ matrix @ full.states[:, place[low]]
                element = magnetic_element(GROUND, low, up, field)
                assert abs(element) == pytest.approx(abs(expected), abs=1e-9), (low, up, field)


def test_clock_pair_is_driven_by_a_microwave_along_the_field() -> None:
    """|1,0> to |2,0> has (g_J - g_I)/2 Bohr magnetons, driven by the component along the field."""
    pair = next(pair for pair in ranked_pairs(ASKED, (), None, Noise()) if (pair.lower, pair.upper) == ((2, 0), (4, 0)))
    assert (pair.drive.kind, pair.drive.polarisation) == ("microwave", "pi")
    assert pair.drive.moment_mu_b == pytest.approx((2.00233113 + 0.0009951414) / 2, rel=1e-9)
    assert pair.field_gauss == 0.0
    assert pair.quadratic_hz_per_gauss2 == pytest.approx(575.15, abs=0.01)


def test_two_photon_pair() -> None:
    """|1,-1> to |2,1> at 3.229 G needs two photons (microwave and radio frequency) and moves by 431.36 Hz/G2."""
    pair = next(pair for pair in ranked_pairs(ASKED, (), None, Noise()) if pair.upper == (4, 2))
    assert pair.field_gauss == pytest.approx(3.2289, abs=1e-4)
    assert pair.drive.kind == "two photons"
    assert pair.field_noise_hz == pytest.approx(431.36 * 1e-6, rel=1e-4)


def test_pairs_at_a_field_count_their_slope() -> None:
    """At one given field every pair is a candidate once; its noise is slope times field noise; neighbours are radio."""
    asked = Asked(RB, RB, 1.0, 4, 5.0)
    here = [one for one in candidates(asked) if not one[3]]
    assert len({frozenset(one[:2]) for one in here}) == len(here)
    ms = [-2, 0, 2, -4, -2, 0, 2, 4]
    assert len(here) == sum(abs(ms[k] - ms[j]) <= 4 for k in range(8) for j in range(k))
    found = ranked_pairs(asked, (), None, Noise(field_gauss=2e-3), 100)
    neighbour = next(pair for pair in found if {pair.lower, pair.upper} == {(4, 0), (4, 2)})
    assert neighbour.drive.kind == "radio frequency"
    assert neighbour.difference_mhz > 0
    slope = abs(neighbour.slope_mhz_per_gauss) * 1e6
    assert neighbour.field_noise_hz == pytest.approx(slope * 2e-3, rel=1e-3)
    assert [pair.figure_hz for pair in found] == sorted(pair.figure_hz for pair in found)


def test_light_noise_is_depth_times_the_relative_difference() -> None:
    """In a trap of 1 MHz with 1 % intensity noise the clock pair moves by 1e4 Hz times (alpha_u/alpha_l - 1)."""
    setting = make_setting(1064.0)
    found = ranked_pairs(ASKED, (), setting, Noise(1e-3, 1.0, 1e-2))
    clock = next(pair for pair in found if (pair.lower, pair.upper) == ((2, 0), (4, 0)))
    one, two = (
        float(setting.fractions @ Side(RB, label).at(0.0).by_drive(setting.frequency_mhz)[:, 0])
        for label in ((2, 0), (4, 0))
    )
    assert clock.light_ratio == pytest.approx(two / one - 1, rel=1e-9)
    assert clock.light_noise_hz == pytest.approx(abs(two / one - 1) * 1e6 * 1e-2, rel=1e-9)
    assert clock.figure_hz == pytest.approx(np.hypot(clock.field_noise_hz, clock.light_noise_hz))
    assert shift_of(two - one) / shift_of(one) == pytest.approx(clock.light_ratio, rel=1e-9)


def test_optical_pairs_name_their_line() -> None:
    """Between two levels the drive is a line that joins them, with multipole, polarisation and strength."""
    excited = partners_of(RB87, D2.upper)
    asked = Asked(RB, excited, 1.0, 4, 1.0)
    found = ranked_pairs(asked, (D1, D2), None, Noise(), 500)
    stretched = next(pair for pair in found if (pair.lower, pair.upper) == ((4, 4), (6, 6)) and not pair.insensitive)
    assert (stretched.drive.kind, stretched.drive.line, stretched.drive.polarisation) == ("line", "780", "sigma+")
    assert stretched.drive.strength == pytest.approx(1.0)
    closed = next(pair for pair in found if (pair.lower, pair.upper) == ((4, 0), (6, 4)))
    assert closed.drive.kind == "none"
    assert drive_of_pair(asked, [], stretched).kind == "none"


def test_limit_keeps_the_best() -> None:
    """Only as many pairs as asked for are answered, the best ones."""
    everything = ranked_pairs(Asked(RB, RB, 2000.0), (), None, Noise(), 100)
    assert ranked_pairs(Asked(RB, RB, 2000.0), (), None, Noise(), 2) == everything[:2]
