"""One sublevel's answer to light: equal to the operator's diagonal, its parts, its uncertainty."""

from dataclasses import replace

import numpy as np
import pytest

from levels.constants import MHZ_NM
from levels.lightshift import Light, couple, drive_of, operator, scale_mhz2, shift_of
from levels.partners import Partners, partners_of
from levels.response import doubt_of_difference, doubt_of_sublevel, response
from levels.shiftspread import diagonal
from tests.levels.lightshift_records import D1, D2, INVENTED, MIDDLE, RB87
from tests.records_for_tests import quantity

GROUND = RB87.levels[0]
STATIC = {"static_polarisability": {GROUND.name: quantity(320.1, 0.6)}}
RB = partners_of(replace(RB87, **STATIC), GROUND)  # type: ignore[arg-type]
ZZ = partners_of(INVENTED, MIDDLE)
FIELDS = np.array([0.0, 3.2, 150.0, -40.0])


@pytest.mark.parametrize("partners", [RB, ZZ], ids=["J = 1/2", "J = 2, lines both ways"])
def test_response_is_the_diagonal_of_the_operator(partners: Partners) -> None:
    """For every sublevel, several fields and light of any shape the sum of poles gives the operator's diagonal."""
    light = Light(755.5, 1e6, drive_of(35.0, 20.0, 50.0))
    for at, field in enumerate(FIELDS):
        here, coupled = couple(partners, float(field))
        diagonal = np.diag(operator(here, coupled, light, partners.remainder.value)).real
        for k, label in enumerate(here.labels):
            one = response(partners, label, FIELDS)
            alpha = float(np.array(light.fractions) @ one.by_drive(light.frequency_mhz, at)[:, 0])
            assert shift_of(alpha, 1e6) == pytest.approx(diagonal[k], rel=1e-11)
            assert one.along_field(light.frequency_mhz)[:, at] == pytest.approx(
                one.by_drive(light.frequency_mhz, at)[:, 0], rel=1e-13
            )
            assert one.energy_mhz[at] == pytest.approx(here.energy_mhz[k], abs=1e-9)


def test_rational_is_the_same_function() -> None:
    """The sum of poles for given fractions has the value and, by differences, the slope of the polarisability."""
    one, light = response(RB, (4, 2), 10.0), Light(850.0, 1.0, drive_of(60.0, 10.0, 20.0))
    function, nu = one.rational(light.fractions), light.frequency_mhz
    alpha = float(np.array(light.fractions) @ one.by_drive(nu)[:, 0])
    assert function.value(nu)[0] == pytest.approx(alpha, rel=1e-13)
    step = 100.0
    quotient = (function.value(nu + step) - function.value(nu - step))[0] / (2 * step)
    assert function.slope(nu)[0] == pytest.approx(quotient, rel=1e-5)


def test_shares_of_the_lines_add_up() -> None:
    """What the lines add and the remainder make the whole."""
    one = response(RB, (2, -2), 1.0)
    whole = one.by_drive(MHZ_NM / 900.0)[:, 0]
    assert one.shares(MHZ_NM / 900.0).sum(axis=0)[:, 0] + RB.remainder.value == pytest.approx(whole, rel=1e-13)


def test_orientation_and_alignment() -> None:
    """Stretched states have <J_z> = J and the full alignment; a clock state at zero field has neither."""
    top, clock = response(RB, (4, 4), 1.0), response(RB, (4, 0), 0.0)
    assert (top.orientation[0], clock.orientation[0]) == pytest.approx((0.5, 0.0))
    assert response(ZZ, (9, 9), 1.0).alignment[0] == pytest.approx(1.0)


def test_uncertainty_of_a_sublevel_is_that_of_its_inputs() -> None:
    """Moving a strength, or the static value, by its uncertainty moves the polarisability by its part of the whole."""
    nu, fractions = np.array([MHZ_NM / 900.0]), np.array([0.0, 1.0, 0.0])
    doubt = doubt_of_sublevel(response(RB, (4, 2), 5.0), nu, fractions)

    def value(first: float, second: float, static: float) -> float:
        lines = (
            replace(D1, reduced_dipole=quantity(first, 0.003)),
            replace(D2, reduced_dipole=quantity(second, 0.004)),
        )
        whole = replace(RB87, lines=lines, static_polarisability={GROUND.name: quantity(static, 0.6)})
        return float(response(partners_of(whole, GROUND), (4, 2), 5.0).by_drive(nu)[1, 0])

    moved = [
        value(4.231 + 0.003, 5.978, 320.1) - value(4.231, 5.978, 320.1),
        value(4.231, 5.978 + 0.004, 320.1) - value(4.231, 5.978, 320.1),
        0.6,
    ]
    rest = abs(RB.remainder.dispersing)
    square = (nu[0] / RB.remainder.opens_mhz) ** 2
    moved.append(rest * square / (1 - square))
    assert doubt.uncertainty[0] == pytest.approx(np.sqrt(np.sum(np.square(moved))), rel=2e-3)


def test_difference_within_a_level_forgets_the_scalar() -> None:
    """Between two sublevels of one level the static value cancels and a line that both share enters once."""
    nu, fractions = np.array([MHZ_NM / 900.0]), np.array([0.0, 1.0, 0.0])
    upper, lower = response(RB, (4, 0), 0.0), response(RB, (2, 0), 0.0)
    apart = doubt_of_difference(upper, lower, nu, fractions)
    alone = doubt_of_sublevel(upper, nu, fractions)
    assert apart.uncertainty[0] < 1e-3 * alone.uncertainty[0]
    difference = (upper.by_drive(nu) - lower.by_drive(nu))[1, 0]
    assert 0 < apart.uncertainty[0] < 0.05 * abs(difference)


def test_difference_of_levels_keeps_every_part() -> None:
    """Between two levels a line that joins them moves both; without the other's remainder nothing is sure."""
    excited = partners_of(RB87, D2.upper)
    apart = doubt_of_difference(
        response(excited, (6, 0), 1.0), response(RB, (4, 0), 1.0), np.array([MHZ_NM / 900.0]), np.array([0.0, 1.0, 0.0])
    )
    assert np.isnan(apart.uncertainty[0])
    assert any("5p_2P3/2" in reason for reason in apart.reasons)
    assert apart.stated[0] > 0


@pytest.mark.parametrize("partners", [RB, ZZ], ids=["J = 1/2", "J = 2, lines both ways"])
def test_all_sublevels_at_once(partners: Partners) -> None:
    """The sums for all sublevels together have the values and uncertainties of one sublevel at a time."""
    light = Light(905.0, 1e6, drive_of(35.0, 20.0, 50.0))
    here, coupled = couple(partners, 12.0)
    found = diagonal(partners, here, coupled, light)
    nu, fractions = np.array([light.frequency_mhz]), np.array(light.fractions)
    for k, label in enumerate(here.labels):
        one = response(partners, label, 12.0)
        assert found.polarisability_a03[k] == pytest.approx(fractions @ one.by_drive(nu)[:, 0], rel=1e-11)
        doubt = doubt_of_sublevel(one, nu, fractions)
        assert found.doubt.stated[k] == pytest.approx(doubt.stated[0], rel=1e-9)
        assert found.doubt.uncertainty[k] == pytest.approx(doubt.uncertainty[0], rel=1e-9, nan_ok=True)
        assert found.doubt.reasons == doubt.reasons


def test_excited_share_is_that_of_a_driven_two_level_atom() -> None:
    """Far off resonance the excited share is (Omega/2 Delta)^2, with the Rabi frequency of the stretched transition."""
    light = Light(MHZ_NM / (384230484.0 - 1e5), 1e4, drive_of(0.0, 45.0, 0.0))
    here, coupled = couple(RB, 0.0)
    found = diagonal(RB, here, coupled, light)
    top = here.labels.index((4, 4))
    gap = float(np.min(np.abs(coupled[1].gap_mhz[-1, top] - light.frequency_mhz)))
    rabi = 2 * np.sqrt(scale_mhz2(1e4)) * 5.978 / 2  # the stretched element is d/sqrt(2J'+1) with J' = 3/2
    assert found.excited[top] == pytest.approx((rabi / (2 * gap)) ** 2, rel=1e-3)
