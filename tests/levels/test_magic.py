"""Magic and tune-out conditions: the shifts agree where they should, by the operator; nothing is missed or invented."""

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from levels.constants import MHZ_NM
from levels.errors import OutsideValidity
from levels.lightshift import couple, operator, shift_of
from levels.magic import Side, Solution, difference, magic_wavelengths, slopes_at, tune_outs
from levels.magicangles import at_insensitive_fields, azimuths, beam_angles, ellipticities, magic_fields
from levels.partners import partners_of
from levels.polarisability import polarisability
from levels.setting import make_setting
from tests.levels.lightshift_records import D1, INVENTED, MIDDLE, RB87, atom
from tests.records_for_tests import level, line, quantity

GROUND = RB87.levels[0]
RB = partners_of(replace(RB87, static_polarisability={GROUND.name: quantity(320.1, 0.6)}), GROUND)  # type: ignore[arg-type]
ZZ = partners_of(INVENTED, MIDDLE)
ONE, TWO = Side(ZZ, (5, 1)), Side(ZZ, (9, -3))
angle = st.floats(0.0, 180.0)


def shifts(lower: Side, upper: Side, found: Solution) -> tuple[float, float]:
    """The shifts of both sides at a solution, from the diagonal of the full operator."""
    pair = []
    for side in (lower, upper):
        here, coupled = couple(side.partners, found.setting.field_gauss)
        shift = operator(here, coupled, found.setting.light(1e6), side.partners.remainder.value)
        pair.append(float(shift[here.labels.index(side.label), here.labels.index(side.label)].real))  # type: ignore[arg-type]
    return pair[0], pair[1]


def assert_equal_shifts(lower: Side, upper: Side, found: Solution, tolerance: float = 1e-9) -> None:
    one, two = shifts(lower, upper, found)
    rounding = abs(shift_of(abs(found.slopes["wavelength"]) * 8 * np.spacing(found.setting.wavelength_nm), 1e6))
    assert one == pytest.approx(two, abs=tolerance * max(abs(one), 1e-3) + rounding)


# Settings


@given(angle, st.floats(-45.0, 45.0), angle)
def test_closed_form_of_fractions(beam: float, ellipticity: float, azimuth: float) -> None:
    """p and C of the ellipse are the fractions of the amplitudes that `geometry` resolves."""
    setting = make_setting(800.0, beam, ellipticity, azimuth)
    assert setting.fractions == pytest.approx(setting.light(1.0).fractions, abs=1e-12)


@given(st.floats(5.0, 175.0), st.floats(-40.0, 40.0), st.floats(5.0, 175.0))
def test_slopes_of_fractions_are_derivatives(beam: float, ellipticity: float, azimuth: float) -> None:
    """dp and dC per degree agree with differences."""
    setting, step = make_setting(800.0, beam, ellipticity, azimuth), 1e-4
    for name, (dp, dC) in setting.slopes_per_deg().items():
        value = getattr(setting, f"{name}_deg")
        ahead, behind = (replace(setting, **{f"{name}_deg": value + s}) for s in (step, -step))
        assert dp == pytest.approx((ahead.along - behind.along) / (2 * step), abs=1e-8)
        assert dC == pytest.approx((ahead.circularity - behind.circularity) / (2 * step), abs=1e-8)


def test_impossible_settings_are_refused() -> None:
    """Angles beyond their range are refused by name."""
    for bad in ({"beam_angle_deg": 181.0}, {"ellipticity_deg": 46.0}, {"azimuth_deg": 400.0}):
        with pytest.raises(OutsideValidity, match=next(iter(bad)).removesuffix("_deg")):
            make_setting(800.0, **bad)


# Wavelengths


def test_magic_wavelengths_by_the_operator() -> None:
    """At every magic wavelength of an invented pair the operator gives equal shifts; a scan finds no others."""
    setting = make_setting(700.0, 40.0, 20.0, 30.0, 5.0)
    found = magic_wavelengths(ONE, TWO, setting, 500.0, 1500.0)
    assert found.proved
    assert len(found.solutions) >= 2
    for solution in found.solutions:
        assert_equal_shifts(ONE, TWO, solution, 1e-7)
    grid = np.linspace(501.0, 1499.0, 4001)
    signs = np.sign([setting.fractions @ difference(ONE, TWO, replace(setting, wavelength_nm=nm)) for nm in grid])
    lines = MHZ_NM / np.array([5.0e8, 4.3e8, 3.3e8])
    crossed = [
        (grid[k], grid[k + 1])
        for k in np.nonzero(np.diff(signs))[0]
        if not np.any((lines > grid[k] - 0.3) & (lines < grid[k + 1] + 0.3))
    ]
    values = [solution.value for solution in found.solutions]
    for low, high in crossed:
        assert any(low <= value <= high for value in values), (low, high, values)


def test_tune_out_between_the_d_lines() -> None:
    """Between the D lines the scalar tune-out is the zero of the closed form, all terms in."""
    found = tune_outs(Side(RB), make_setting(800.0), 781.0, 794.0)
    assert len(found.solutions) == 1
    value = found.solutions[0].value
    assert value == pytest.approx(790.0, abs=0.1)
    at = polarisability(RB, [value - 1e-6, value + 1e-6]).numbers[0]
    assert at[0] > 0 > at[1]


def test_hyperfine_tune_outs_differ() -> None:
    """F = 1 lies 15 pm below F = 2: its lines are 6.8 GHz bluer (kept ground hyperfine shift; issue's pitfall)."""
    one, two = (tune_outs(Side(RB, None, F), make_setting(800.0), 781.0, 794.0).solutions[0].value for F in (2, 4))
    assert (two - one) * 1e3 == pytest.approx(6.8347 * 790.0**2 / 2.99792458e8 * 1e3, rel=0.05)


def test_uncertainty_of_a_tune_out_by_moving_a_strength() -> None:
    """The uncertainty is what moving each strength by its own makes, in quadrature, with the static value's."""
    base = tune_outs(Side(RB), make_setting(800.0), 781.0, 794.0).solutions[0]

    def moved(first: float, second: float, static: float) -> float:
        lines = tuple(
            replace(item, reduced_dipole=quantity(value, 0.003))
            for item, value in zip(RB87.lines, (first, second), strict=True)
        )
        whole = replace(RB87, lines=lines, static_polarisability={GROUND.name: quantity(static, 0.6)})
        return tune_outs(Side(partners_of(whole, GROUND)), make_setting(800.0), 781.0, 794.0).solutions[0].value

    parts = np.array([moved(4.234, 5.978, 320.1), moved(4.231, 5.982, 320.1), moved(4.231, 5.978, 320.7)]) - base.value
    assert base.stated > 0
    rest = abs(RB.remainder.dispersing)
    square = (base.setting.frequency_mhz / RB.remainder.opens_mhz) ** 2
    dispersion = rest * square / (1 - square) / abs(base.slopes["wavelength"])
    assert base.uncertainty == pytest.approx(np.sqrt((parts**2).sum() + dispersion**2), rel=1e-2)


def test_no_solution_says_why() -> None:
    """Far to the red two hyperfine sublevels keep their difference's sign, and the answer says how close they come."""
    found = magic_wavelengths(Side(RB, (2, 0)), Side(RB, (4, 0)), make_setting(1064.0), 900.0, 1100.0)
    assert found.solutions == ()
    assert "stays positive" in found.why_none
    assert "1100 nm" in found.why_none
    assert "not excluded" not in found.why_none


@pytest.mark.parametrize(
    ("static", "said"),
    [((320.1, 0.6), False), ((320.1, 400.0), True), (None, True)],
)
def test_no_solution_that_uncertainty_allows_is_not_ruled_out(static: tuple[float, float] | None, said: bool) -> None:
    """A sum that keeps its sign rules a tune-out out only where it is surer than it is large."""
    values = {} if static is None else {GROUND.name: quantity(*static)}
    side = Side(partners_of(replace(RB87, static_polarisability=values), GROUND))  # type: ignore[arg-type]
    found = tune_outs(side, make_setting(1064.0), 1000.0, 1100.0)
    assert found.solutions == ()
    assert ("not excluded" in found.why_none) == said
    angles = azimuths(None, Side(side.partners, (4, 4)), make_setting(1064.0, 90.0, 20.0))
    assert ("not excluded" in angles.why_none) == said


def test_twins_are_alike_at_every_wavelength() -> None:
    """m and -m in linear light at zero field shift alike everywhere: that is said, not listed."""
    found = magic_wavelengths(Side(RB, (4, 2)), Side(RB, (4, -2)), make_setting(850.0), 800.0, 900.0)
    assert "every wavelength" in found.why_none


def test_range_inside_the_lines_is_said() -> None:
    """A range that lies within the clearance of a line has no solutions and says so."""
    lower, upper = level(0, 0, name="g"), level(2, 0, g_J=1.0, name="e", parity=-1, width=quantity(100.0))
    item = line(lower, upper, centroid=quantity(5e8), reduced_dipole=quantity(2.0))
    at = MHZ_NM / 5e8
    found = tune_outs(Side(partners_of(atom(item), lower), (0, 0)), make_setting(at), at - 1e-4, at + 1e-4)
    assert "within the lines" in found.why_none
    with pytest.raises(OutsideValidity, match="rising"):
        tune_outs(Side(RB), make_setting(800.0), 900.0, 800.0)


def test_slopes_are_derivatives() -> None:
    """d(difference) per nm, per degree of each angle and per gauss agree with differences."""
    setting = make_setting(812.0, 50.0, 15.0, 25.0, 40.0)
    slopes = slopes_at(ONE, TWO, setting)
    steps = {
        "wavelength_nm": 1e-4,
        "ellipticity_deg": 1e-3,
        "azimuth_deg": 1e-3,
        "beam_angle_deg": 1e-3,
        "field_gauss": 1e-2,
    }
    for name, step in steps.items():
        ahead, behind = (
            at.fractions @ difference(ONE, TWO, at)
            for at in (replace(setting, **{name: getattr(setting, name) + s}) for s in (step, -step))
        )
        unknown = name.removesuffix("_nm").removesuffix("_deg").removesuffix("_gauss")
        assert slopes[unknown] == pytest.approx((ahead - behind) / (2 * step), rel=1e-5, abs=1e-9)


def test_two_spinless_singlets_are_insensitive_to_polarisation() -> None:
    """J = 0 to J = 0: whatever is magic is so for every polarisation, and flagged; a J = 2 pair is not."""
    ground, clock = level(0, 0, name="g"), level(0, 0, name="c", parity=-1)
    first, second = level(2, 0, g_J=1.0, name="p", parity=-1), level(2, 0, g_J=1.0, name="d")
    whole = atom(
        line(ground, first, name="1", centroid=quantity(6.5e8, 0.0), reduced_dipole=quantity(5.25, 0.01)),
        line(clock, second, name="2", centroid=quantity(4.4e8, 0.0), reduced_dipole=quantity(3.0, 0.01)),
    )
    pair = Side(partners_of(whole, ground), (0, 0)), Side(partners_of(whole, clock), (0, 0))
    found = magic_wavelengths(*pair, make_setting(800.0), 400.0, 2000.0)
    assert len(found.solutions) == 1
    assert found.solutions[0].insensitive
    assert not magic_wavelengths(ONE, TWO, make_setting(800.0), 500.0, 1500.0).solutions[0].insensitive


# Angles


@settings(max_examples=25)
@given(angle, angle, st.floats(0.0, 100.0))
def test_every_ellipticity_works(beam: float, azimuth: float, field: float) -> None:
    """Each ellipticity found makes the shifts equal; a scan of the same range crosses zero as often."""
    setting = make_setting(760.0, beam, 0.0, azimuth, field)
    found = ellipticities(ONE, TWO, setting)
    for solution in found.solutions:
        assert_equal_shifts(ONE, TWO, solution, 1e-8)
    grid = np.linspace(-45.0, 45.0, 2001)
    D = difference(ONE, TWO, setting)
    values = np.array([replace(setting, ellipticity_deg=chi).fractions @ D for chi in grid])
    crossings = int(np.count_nonzero(np.diff(np.sign(values))))
    if np.abs(values).min() < 1e-6 * np.abs(values).max():
        return
    assert len(found.solutions) == crossings
    assert bool(found.why_none) == (crossings == 0)


@settings(max_examples=25)
@given(angle, st.floats(-45.0, 45.0))
def test_every_azimuth_works(beam: float, ellipticity: float) -> None:
    """Each azimuth found makes the shifts equal; without one the reason has the range of the difference."""
    found = azimuths(ONE, TWO, make_setting(760.0, beam, ellipticity))
    for solution in found.solutions:
        assert 0 <= solution.value < 180
        assert_equal_shifts(ONE, TWO, solution, 1e-8)
    assert found.solutions or "difference" in found.why_none


@settings(max_examples=25)
@given(st.floats(-45.0, 45.0), angle)
def test_every_beam_angle_works(ellipticity: float, azimuth: float) -> None:
    """Each beam angle found makes the shifts equal."""
    found = beam_angles(ONE, TWO, make_setting(760.0, 90.0, ellipticity, azimuth))
    for solution in found.solutions:
        assert 0 <= solution.value <= 180
        assert_equal_shifts(ONE, TWO, solution, 1e-7)
    assert found.solutions or "difference" in found.why_none


def test_tensor_angle_of_two_sublevels_of_one_f() -> None:
    """Linear light at 54.7356 degrees to the field makes any two m of one F shift alike: 3 cos^2 = 1; standard."""
    found = azimuths(Side(ZZ, (9, 1)), Side(ZZ, (9, 5)), make_setting(750.0, 90.0))
    assert [solution.value for solution in found.solutions] == pytest.approx([54.7356, 180 - 54.7356], abs=1e-4)


def test_what_an_angle_cannot_change_is_said() -> None:
    """A beam along the field does not feel its azimuth, and the answer says what the difference stays at."""
    assert "azimuth changes nothing" in azimuths(ONE, TWO, make_setting(760.0, 0.0, 20.0)).why_none


def test_lithium_pair_has_a_magic_ellipticity() -> None:
    """A hyperfine pair with different g_F m_F has one red of the D lines (Kim, Han, Cho, PRL 111, 243004, for 7Li)."""
    found = ellipticities(Side(RB, (2, -2)), Side(RB, (4, -4)), make_setting(1064.0, 0.0, 0.0, 0.0, 1.0))
    assert len(found.solutions) == 1
    assert 0 < abs(found.solutions[0].value) < 10
    assert_equal_shifts(Side(RB, (2, -2)), Side(RB, (4, -4)), found.solutions[0], 1e-10)


# Fields


def test_clock_pair_has_a_magic_field_in_circular_light() -> None:
    """The vector shift of the 0-0 pair grows with the field and cancels the scalar one; only for one handedness."""
    lower, upper = Side(RB, (2, 0)), Side(RB, (4, 0))
    found = magic_fields(lower, upper, make_setting(1064.0, 0.0, 45.0), 50.0)
    assert len(found.solutions) == 1
    assert found.solutions[0].value == pytest.approx(3.4, abs=0.3)
    assert_equal_shifts(lower, upper, found.solutions[0], 1e-11)
    other = magic_fields(lower, upper, make_setting(1064.0, 0.0, -45.0), 50.0)
    assert other.solutions == ()
    assert "0 G" in other.why_none
    assert "name the sublevels" in magic_fields(Side(RB), upper, make_setting(1064.0), 50.0).why_none


def test_magic_fields_by_the_operator() -> None:
    """Every field found makes the shifts equal; a scan crosses zero as often."""
    setting = make_setting(720.0, 20.0, 10.0, 0.0)
    found = magic_fields(ONE, TWO, setting, 2000.0)
    for solution in found.solutions:
        assert_equal_shifts(ONE, TWO, solution, 1e-7)
    grid = np.linspace(0.0, 2000.0, 801)
    values = [setting.fractions @ difference(ONE, TWO, replace(setting, field_gauss=b)) for b in grid]
    assert len(found.solutions) == np.count_nonzero(np.diff(np.sign(values)))


def test_field_and_ellipticity_together() -> None:
    """At the field-insensitive point of |1,-1> and |2,1> the ellipticity is solved, or it is said why there is none."""
    found = at_insensitive_fields(Side(RB, (2, -2)), Side(RB, (4, 2)), make_setting(1064.0, 0.0), 10.0)
    assert len(found) == 1
    assert found[0].solutions or "ellipticity" in found[0].why_none
    pair = Side(RB, (2, -2)), Side(RB, (4, 0))
    entries = at_insensitive_fields(*pair, make_setting(1064.0, 0.0), 3000.0)
    assert entries
    for entry in entries:
        for solution in entry.solutions:
            assert_equal_shifts(*pair, solution, 1e-10)


def test_single_line_has_no_tune_out() -> None:
    """With one line and nothing else there is no tune-out wavelength, and the reason names the closest approach."""
    single = partners_of(atom(D1), GROUND)
    found = tune_outs(Side(single), make_setting(900.0), 800.0, 2000.0)
    assert found.solutions == ()
    assert "stays positive" in found.why_none


def test_a_magic_ellipticity_is_not_insensitive_to_polarisation() -> None:
    """|1,-1> and |2,1> at 6 G shift alike at one ellipticity only, though the change is tiny beside their shifts."""
    found = ellipticities(Side(RB, (2, -2)), Side(RB, (4, 2)), make_setting(1064.0, 0.0, field_gauss=6.0))
    (one,) = found.solutions
    assert abs(one.vector_a03) < 1e-3 * abs(one.polarisability_a03)
    assert not one.insensitive
