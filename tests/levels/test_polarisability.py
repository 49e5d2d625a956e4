"""Polarisabilities: closed forms, sum rules, hyperfine levels against whole levels, uncertainties."""

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from levels.constants import HARTREE_MHZ, MHZ_NM
from levels.errors import OutsideValidity, UnknownName
from levels.partners import Partners, partners_of
from levels.polarisability import hyperfine_share, polarisability, rank_weights
from tests.full_dimension import wig6jj
from tests.levels.lightshift_records import D1, D2, INVENTED, MIDDLE, RB87, atom, static_dipole_a03
from tests.records_for_tests import level, line, quantity

GROUND = RB87.levels[0]
RB = partners_of(RB87, GROUND)
SCALAR, VECTOR, TENSOR = range(3)


def two_levels(twice_J: int, twice_J_up: int, dipole: float = 2.0, frequency_mhz: float = 5e8) -> Partners:
    lower, upper = level(twice_J, 0, g_J=1.0, name="g"), level(twice_J_up, 0, g_J=1.0, name="e", parity=-1)
    item = line(lower, upper, centroid=quantity(frequency_mhz), reduced_dipole=quantity(dipole, 0.02, "e*a0"))
    return partners_of(atom(item), lower)


@pytest.mark.parametrize("wavelength", [450.0, 700.0, 1064.0, 1e5])
def test_two_level_atom(wavelength: float) -> None:
    """J = 0 to J' = 1 has the textbook 2 w0 d_z^2/(w0^2 - w^2) with d_z^2 = d^2/3, and neither vector nor tensor."""
    nu, nu0 = MHZ_NM / wavelength, 5e8
    expected = 2 * nu0 * (2.0**2 / 3) / (nu0**2 - nu**2) * HARTREE_MHZ
    numbers = polarisability(two_levels(0, 2), wavelength).numbers[:, 0]
    assert numbers == pytest.approx([expected, 0.0, 0.0], rel=1e-12)


def test_alkali_d_lines_closed_form() -> None:
    """For J = 1/2 scalar and vector follow from the two D lines as Grimm, Weidemueller, Ovchinnikov (2000) have them.

    alpha_s = sum d^2 w_k/(3 (w_k^2 - w^2)), alpha_v = 2 sum g_k d^2 w/(w_k^2 - w^2)/3 with g = -1 for D1, +1/2 for D2.
    """
    nu = MHZ_NM / 810.0
    scalar = vector = 0.0
    for item, weight in ((D1, -1.0), (D2, 0.5)):
        nu_k, d = item.centroid.value, item.reduced_dipole.value  # type: ignore[union-attr]
        scalar += d**2 * nu_k / (3 * (nu_k**2 - nu**2)) * HARTREE_MHZ
        vector += 2 * weight * d**2 * nu / (3 * (nu_k**2 - nu**2)) * HARTREE_MHZ
    numbers = polarisability(RB, 810.0).numbers[:, 0]
    assert numbers == pytest.approx([scalar, vector, 0.0], rel=1e-12)


def test_static_is_the_long_wavelength_limit() -> None:
    """At infinite wavelength the scalar is 2 d^2/(3 (2J+1) w) of each line and the vector part is gone."""
    static = polarisability(RB, np.inf).numbers[:, 0]
    expected = sum(static_dipole_a03(k.reduced_dipole.value, k.centroid.value, 1) for k in (D1, D2))  # type: ignore[union-attr]
    assert static == pytest.approx([expected, 0.0, 0.0], rel=1e-12)
    assert polarisability(RB, 1e6).numbers[SCALAR, 0] == pytest.approx(expected, rel=1e-6)


@given(st.integers(0, 12), st.sampled_from([-2, 0, 2]))
def test_weights_add_up_over_sublevels(twice_J: int, step: int) -> None:
    """A line's scalar weight is the mean over sublevels and polarisations of |<J' m'|d_q|J m>|^2: 1/(3(2J+1))."""
    other = twice_J + step
    if other < 0 or (other == 0 and twice_J == 0):
        return
    assert rank_weights(twice_J, other)[0] == pytest.approx(1 / (3 * (twice_J + 1)), rel=1e-12)


@given(st.integers(0, 9), st.integers(1, 9), st.sampled_from([-2, 0, 2]))
def test_hyperfine_shares_add_up(twice_J: int, twice_I: int, step: int) -> None:
    """Summed over F', |<F'||d||F>|^2 is (2F+1)/(2J+1) of the whole line's: the nucleus looks on."""
    other = twice_J + step
    if other < 0 or (other == 0 and twice_J == 0):
        return
    for F in range(abs(twice_J - twice_I), twice_J + twice_I + 1, 2):
        shares = {
            G: hyperfine_share(twice_J, other, twice_I, F, G)
            for G in range(abs(other - twice_I), other + twice_I + 1, 2)
        }
        assert sum(shares.values()) == pytest.approx((F + 1) / (twice_J + 1), rel=1e-12)
        for G, share in shares.items():
            symbol = wig6jj(twice_J, F, twice_I, G, other, 2)
            assert share == pytest.approx((F + 1) * (G + 1) * symbol**2, abs=1e-13)


def test_hyperfine_levels_far_off_resonance() -> None:
    """Far from the lines every F has the level's scalar, its vector times the projection of J on F, and no tensor.

    alpha_v(F)/2F = alpha_v(J)/2J g, g = [F(F+1) + J(J+1) - I(I+1)]/2F(F+1); what is left is hyperfine over detuning.
    """
    whole = polarisability(RB, 1064.0).numbers[:, 0]
    for twice_F, projection in ((2, -0.25), (4, 0.25)):
        one = polarisability(RB, 1064.0, twice_F).numbers[:, 0]
        assert one[SCALAR] == pytest.approx(whole[SCALAR], rel=1e-4)
        assert one[VECTOR] / twice_F == pytest.approx(whole[VECTOR] * projection, rel=1e-3)
        assert abs(one[TENSOR]) < 1e-3
    difference = polarisability(RB, 1064.0, 4).numbers[SCALAR, 0] - polarisability(RB, 1064.0, 2).numbers[SCALAR, 0]
    step = 0.01
    slope = np.diff(polarisability(RB, [1064.0, 1064.0 - step]).numbers[SCALAR])[0] / (
        MHZ_NM / (1064.0 - step) - MHZ_NM / 1064.0
    )
    # F = 2 sees its lines 6.8 GHz redder than F = 1, as if the light were bluer; the static part moves by 1e-4 more.
    assert difference == pytest.approx(slope * 6834.68, rel=0.2)


def test_excited_level_sees_its_lines_downwards() -> None:
    """The upper level of one line has minus the static scalar of the lower, weighted by the statistical weights."""
    one = two_levels(0, 2)
    upper = partners_of(atom(one.lines[0]), one.lines[0].upper)
    below = polarisability(one, 900.0).numbers[SCALAR, 0]
    above = polarisability(upper, 900.0).numbers[:, 0]
    assert 3 * above[SCALAR] == pytest.approx(-below, rel=1e-12)
    assert above[TENSOR] == pytest.approx(-above[SCALAR], rel=1e-12)  # m = 0 takes all, m = +-1 nothing of z light


def test_light_on_resonance_has_no_number() -> None:
    """Inside a line's hyperfine structure a level has NaN, marked `close`; an F has numbers between its components."""
    on = MHZ_NM / (D2.centroid.value + 1.0)  # type: ignore[union-attr]
    found = polarisability(RB, [on, 810.0])
    assert found.close.tolist() == [True, False]
    assert np.isnan(found.numbers[:, 0]).all()
    assert np.isfinite(found.numbers[:, 1]).all()
    between = MHZ_NM / (D2.centroid.value - 2563.0 + 100.0)  # type: ignore[union-attr]
    assert not polarisability(RB, between, 4).close[0]


def test_bad_wavelengths_and_levels_are_refused() -> None:
    """Wavelengths outside 50 nm to 1 mm and an F that does not exist are refused with what would do."""
    with pytest.raises(OutsideValidity, match="from 50 to 1e\\+06 nm"):
        polarisability(RB, 10.0)
    with pytest.raises(UnknownName, match="1, 2"):
        polarisability(RB, 1064.0, 6)


# Remainder and uncertainty


def test_without_a_remainder_nothing_is_sure() -> None:
    """Lines alone have no uncertainty, and the reason says that what they leave out is not known."""
    doubt = polarisability(RB, 1064.0).doubts[SCALAR]
    assert np.isnan(doubt.uncertainty).all()
    assert "leaves out" in doubt.reasons[0]
    first, second = polarisability(RB, 1064.0).shares[:, SCALAR, 0]
    assert doubt.stated[0] == pytest.approx(np.hypot(2 * 0.003 / 4.231 * first, 2 * 0.004 / 5.978 * second), rel=1e-9)


def test_static_value_anchors_the_sum() -> None:
    """With a static value the whole is that value at zero frequency, with its uncertainty and not the lines'."""
    anchored = partners_of(replace(RB87, static_polarisability={GROUND.name: quantity(320.1, 0.6, "a0^3")}), GROUND)
    found = polarisability(anchored, [np.inf, 1064.0])
    assert found.numbers[SCALAR, 0] == pytest.approx(320.1, abs=1e-9)
    assert found.doubts[SCALAR].uncertainty[0] == pytest.approx(0.6, rel=1e-9)
    lines = polarisability(RB, [np.inf, 1064.0])
    grown = found.shares[:, SCALAR, 1] - found.shares[:, SCALAR, 0]
    by_hand = np.hypot(2 * 0.003 / 4.231 * grown[0], 2 * 0.004 / 5.978 * grown[1])
    rest = 320.1 - lines.numbers[SCALAR, 0]
    square = (MHZ_NM / 1064.0 / D2.centroid.value) ** 2  # type: ignore[union-attr]
    expected = np.sqrt(0.6**2 + by_hand**2 + (rest * square / (1 - square)) ** 2)
    assert found.doubts[SCALAR].uncertainty[1] == pytest.approx(expected, rel=1e-9)
    assert found.numbers[SCALAR, 1] == pytest.approx(lines.numbers[SCALAR, 1] + rest, rel=1e-12)


def test_core_and_tail_without_uncertainty_say_so() -> None:
    """Core and tail add to the scalar; without their uncertainties the sum has none."""
    parts = {"core_polarisability": {GROUND.name: quantity(9.076)}, "tail_polarisability": {GROUND.name: quantity(1.2)}}
    found = polarisability(partners_of(replace(RB87, **parts), GROUND), 1064.0)  # type: ignore[arg-type]
    assert found.numbers[SCALAR, 0] == pytest.approx(polarisability(RB, 1064.0).numbers[SCALAR, 0] + 10.276)
    assert np.isnan(found.doubts[SCALAR].uncertainty[0])
    sure = {name: {GROUND.name: quantity(part[GROUND.name].value, 0.3)} for name, part in parts.items()}
    again = polarisability(partners_of(replace(RB87, **sure), GROUND), 1064.0)  # type: ignore[arg-type]
    assert again.doubts[SCALAR].uncertainty[0] > np.hypot(0.3, 0.3)


def test_lines_without_strength_are_left_out_and_named() -> None:
    """A line without a strength is left out by name; two-photon and field-opened lines do not count at all."""
    weak = line(GROUND, level(3, 3, 1.0, g_J=1.0, g_I=0.0, name="6p", parity=-1), name="420", nominal_nm=420.3)
    pair = replace(weak, name="778", photons=2)
    found = partners_of(atom(D1, D2, weak, pair), GROUND)
    assert [item.name for item in found.left_out] == ["420"]
    assert found.remainder.opens_mhz == pytest.approx(MHZ_NM / 420.3)
    assert not found.complete


def test_unstated_strength_makes_no_uncertainty() -> None:
    """A strength without a stated uncertainty that matters leaves NaN and names itself."""
    vague = replace(D2, reduced_dipole=quantity(5.978, None, "e*a0"))
    rest = {name: {GROUND.name: quantity(0.0, 0.3)} for name in ("core_polarisability", "tail_polarisability")}
    doubt = polarisability(partners_of(replace(atom(D1, vague), **rest), GROUND), 1064.0).doubts[SCALAR]  # type: ignore[arg-type]
    assert doubt.excludes == ("strength of 780",)
    assert np.isnan(doubt.uncertainty[0])
    assert doubt.reasons == ("inputs without a stated uncertainty could outweigh those with one",)


def test_ten_thousand_wavelengths_are_one_array_call() -> None:
    """A long curve equals its points one by one."""
    grid = np.linspace(600.0, 1100.0, 10_000)
    whole = polarisability(partners_of(INVENTED, MIDDLE), grid)
    for k in (0, 1234, 9999):
        one = polarisability(partners_of(INVENTED, MIDDLE), grid[k])
        assert whole.numbers[:, k] == pytest.approx(one.numbers[:, 0], rel=1e-13, nan_ok=True)
