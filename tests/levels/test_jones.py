"""Jones vectors: conventions of handedness, wave plates, and the setting that makes a wanted ellipse."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from levels.errors import OutsideValidity
from levels.geometry import axes_of, direction_from_angles, polarisation_vector, resolve
from levels.jones import (
    Plate,
    circular,
    ellipse_of,
    elliptical,
    linear,
    plate,
    plates_for,
    plates_toward,
    through_plates,
    with_impurity,
)

ANGLES = st.floats(-360.0, 360.0)


def overlap(one, other):
    return abs(np.vdot(one, other)) / (np.linalg.norm(one) * np.linalg.norm(other))


def test_right_by_helicity_turns_from_e1_to_e2():
    """Right-handed light of the house convention has E(t) going counter-clockwise for someone who looks into it."""
    jones = circular("right")
    early, later = (np.real(jones * np.exp(-1j * phase)) for phase in (0.0, 0.1))
    assert early[0] * later[1] - early[1] * later[0] == pytest.approx(np.sin(0.1) / 2)


def test_optics_convention_is_the_other_hand():
    """Right in the optics convention is left by helicity."""
    assert circular("right", "optics").tolist() == circular("left").tolist()


def test_quarter_wave_plate_makes_circular_light():
    """Linear light 45 degrees counter-clockwise from the fast axis leaves a quarter-wave plate with helicity +1."""
    assert overlap(through_plates(45.0, [plate("quarter", 0.0)]), circular("right")) == pytest.approx(1.0)


def test_vertical_fast_axis_makes_optics_right():
    """A quarter-wave plate with vertical fast axis turns light at 45 degrees into right-handed light of the optics
    convention (Hecht, Optics, table of Jones matrices)."""
    assert overlap(through_plates(45.0, [plate("quarter", 90.0)]), circular("right", "optics")) == pytest.approx(1.0)


@given(ANGLES, ANGLES)
def test_half_wave_plate_mirrors_the_angle(polariser, fast):
    """A half-wave plate turns linear light at alpha to 2 theta - alpha."""
    out = through_plates(polariser, [plate("half", fast)])
    assert overlap(out, linear(2 * fast - polariser)) == pytest.approx(1.0)


@given(st.floats(-45.0, 45.0), st.floats(0.0, 179.0))
def test_ellipse_reads_back(ellipticity, azimuth):
    """Ellipticity and azimuth read back from the Jones vector they made."""
    found = ellipse_of(elliptical(ellipticity, azimuth))
    assert found.ellipticity_deg == pytest.approx(ellipticity, abs=1e-5)
    assert overlap(elliptical(found.ellipticity_deg, found.azimuth_deg), elliptical(ellipticity, azimuth)) == (
        pytest.approx(1.0)
    )


@given(st.floats(-45.0, 45.0), ANGLES, ANGLES)
def test_two_plates_reach_any_polarisation(ellipticity, azimuth, polariser):
    """The half- and quarter-wave setting found for a wanted polarisation makes exactly it."""
    wanted = elliptical(ellipticity, azimuth)
    setting = plates_for(wanted, polariser)
    plates = [plate("half", setting.half_wave_deg), plate("quarter", setting.quarter_wave_deg)]
    assert overlap(through_plates(polariser, plates), wanted) == pytest.approx(1.0, abs=1e-9)


@given(st.floats(0.0, 1.0), ANGLES)
def test_impurity_is_the_share_of_the_other_polarisation(impurity, phase):
    """`with_impurity` keeps the norm and puts the stated share into the orthogonal polarisation."""
    mixed = with_impurity(circular("right"), impurity, phase)
    assert abs(np.vdot(circular("left"), mixed)) ** 2 == pytest.approx(impurity, abs=1e-12)
    assert np.linalg.norm(mixed) == pytest.approx(1.0)


@given(st.floats(0.0, 1.0), st.sampled_from([-1, 0, 1]), st.floats(5.0, 85.0), ANGLES)
def test_plates_reach_the_wanted_fraction(wanted, q, angle, polariser):
    """The plates make exactly the wanted fraction of q, or the largest that the beam's direction allows."""
    axes = axes_of((0, 0, 1.0))
    direction = direction_from_angles(axes, angle, 30.0)
    setting, reached = plates_toward(direction, axes, q, wanted, polariser_deg=polariser)
    plates = [plate("half", setting.half_wave_deg), plate("quarter", setting.quarter_wave_deg)]
    found = resolve(direction, polarisation_vector(direction, through_plates(polariser, plates)), axes)
    assert found.fraction(q) == pytest.approx(reached, abs=1e-9)
    assert reached == pytest.approx(min(wanted, found.attainable[q + 1]))


@pytest.mark.parametrize(
    ("make", "parameter"),
    [
        (lambda: linear(float("nan")), "linear angle"),
        (lambda: elliptical(46.0), "ellipticity"),
        (lambda: circular("up"), "handedness"),
        (lambda: circular("right", "house"), "convention"),
        (lambda: plate("third", 0.0), "plate"),
        (lambda: through_plates(0.0, [Plate(float("inf"), 0.0)]), "waves"),
        (lambda: with_impurity([1, 0], -0.1), "impurity"),
    ],
)
def test_impossible_polarisations_name_their_parameter(make, parameter):
    """What cannot be made is refused with the parameter that is wrong."""
    with pytest.raises(OutsideValidity) as caught:
        make()
    assert caught.value.parameter == parameter
