"""Beams resolved along the field: fractions, attainable purity, multipole factors, rotations and refusals."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from hypothesis.extra.numpy import arrays

from levels.errors import OutsideValidity
from levels.geometry import (
    attainable,
    axes_of,
    best_jones,
    direction_from_angles,
    factors,
    polarisation_vector,
    resolve,
    transverse_basis,
)
from levels.jones import circular, elliptical, linear

UP = axes_of((0.0, 0.0, 1.0))
VECTORS = arrays(np.float64, 3, elements=st.floats(-1.0, 1.0)).filter(lambda v: np.linalg.norm(v) > 0.1)
JONES = st.builds(elliptical, st.floats(-45.0, 45.0), st.floats(0.0, 180.0))


def fractions(direction, jones, field, multipole="E1"):
    axes = axes_of(field)
    return resolve(direction, polarisation_vector(direction, jones), axes, multipole).fractions


def rotation(vector):
    """Rotate about a vector by its length (Rodrigues)."""
    angle = np.linalg.norm(vector)
    x, y, z = vector / angle
    cross = np.array([[0, -z, y], [z, 0, -x], [-y, x, 0]])
    return np.eye(3) + np.sin(angle) * cross + (1 - np.cos(angle)) * cross @ cross


def test_positive_helicity_along_the_field_is_sigma_plus():
    """Light of positive helicity along the field drives m -> m + 1, against the field m -> m - 1."""
    assert fractions((0, 0, 1), circular("right"), (0, 0, 2.0)) == pytest.approx([0, 0, 1])
    assert fractions((0, 0, 1), circular("right"), (0, 0, -2.0)) == pytest.approx([1, 0, 0])


@given(st.floats(0.0, 180.0), st.floats(-180.0, 180.0))
def test_circular_light_at_an_angle(polar, azimuth):
    """Circular light at theta to the field has cos^4(theta/2) sigma+, sin^2(theta)/2 pi, sin^4(theta/2) sigma-
    (rotation matrices of spin 1; Edmonds 1957, chapter 4)."""
    direction = direction_from_angles(UP, polar, azimuth)
    half = np.radians(polar) / 2
    expected = [np.sin(half) ** 4, np.sin(2 * half) ** 2 / 2, np.cos(half) ** 4]
    assert fractions(direction, circular("right"), (0, 0, 1)) == pytest.approx(expected, abs=1e-12)


@given(st.floats(0.0, 180.0))
def test_linear_light_across_the_field(angle):
    """A beam across the field with linear polarisation at an angle to it: cos^2 pi, sin^2/2 of each sigma."""
    share = np.sin(np.radians(angle)) ** 2
    assert fractions((1, 0, 0), linear(angle), (0, 0, 1)) == pytest.approx([share / 2, 1 - share, share / 2], abs=1e-12)


@given(VECTORS, JONES)
def test_beam_across_the_field_is_never_pure_sigma(direction, jones):
    """Whatever its polarisation, a beam across the field drives no more than half sigma+."""
    field = transverse_basis(direction)[0]
    assert fractions(direction, jones, field)[2] <= 0.5 + 1e-12
    assert attainable(direction, axes_of(field))[2] == pytest.approx(0.5)


@given(VECTORS, VECTORS, st.sampled_from(["E1", "M1", "E2", "E3"]), st.data())
def test_attainable_is_reached_and_never_exceeded(direction, field, multipole, data):
    """`best_jones` reaches the attainable fraction of its q, and no other polarisation exceeds it."""
    axes = axes_of(field)
    largest = attainable(direction, axes, multipole)
    rank = largest.size // 2
    q = data.draw(st.integers(-rank, rank))
    if largest[q + rank] > 1e-6:
        best = best_jones(direction, axes, q, multipole)
        assert fractions(direction, best, field, multipole)[q + rank] == pytest.approx(largest[q + rank])
    assert fractions(direction, data.draw(JONES), field, multipole)[q + rank] <= largest[q + rank] + 1e-9


@given(VECTORS, JONES, VECTORS, VECTORS, st.sampled_from(["E1", "M1", "E2", "E3"]))
def test_turning_everything_together_changes_nothing(direction, jones, field, turn, multipole):
    """Fractions depend only on beam and field together: a rotation of both leaves them."""
    matrix = rotation(turn)
    vector = polarisation_vector(direction, jones)
    before = resolve(direction, vector, axes_of(field), multipole).fractions
    after = resolve(matrix @ direction, matrix @ vector, axes_of(matrix @ field), multipole).fractions
    assert after == pytest.approx(before, abs=1e-9)


@given(VECTORS, JONES, VECTORS, st.sampled_from([("E1", 1), ("M1", 1), ("E2", 5 / 3), ("E3", 7 / 3)]))
def test_factors_have_one_norm_per_multipole(direction, jones, field, case):
    """Sum |c_q|^2 is (2 rank + 1)/3 whatever the geometry."""
    multipole, norm = case
    resolved = resolve(direction, polarisation_vector(direction, jones), axes_of(field), multipole)
    assert np.sum(np.abs(resolved.amplitudes) ** 2) == pytest.approx(norm)
    assert resolved.fractions.sum() == pytest.approx(1.0)


@given(st.floats(0.0, 180.0), st.floats(0.0, 180.0))
def test_quadrupole_factors_of_linear_light(phi, gamma):
    """E2 factors: |cos g sin 2phi|/2 for q = 0, |+-cos g cos 2phi + i sin g cos phi|/sqrt6 for +-1,
    |cos g sin(2phi)/2 +- i sin g sin phi|/sqrt6 for +-2 (James, Appl. Phys. B 66, 181 (1998), written for linear light
    at gamma from the plane of beam and field), here times sqrt5."""
    p, g = np.radians(phi), np.radians(gamma)
    direction = np.array([np.sin(p), 0.0, np.cos(p)])
    vector = np.cos(g) * np.array([np.cos(p), 0.0, -np.sin(p)]) + np.sin(g) * np.array([0.0, 1.0, 0.0])
    one = np.abs(np.cos(g) * np.cos(2 * p) + 1j * np.sin(g) * np.cos(p)) / np.sqrt(6)
    two = np.abs(np.cos(g) * np.sin(2 * p) / 2 + 1j * np.sin(g) * np.sin(p)) / np.sqrt(6)
    zero = np.abs(np.cos(g) * np.sin(2 * p)) / 2
    expected = np.sqrt(5) * np.array([two, one, zero, one, two])
    assert np.abs(factors(direction, vector + 0j, UP, "E2")) == pytest.approx(expected, abs=1e-9)


def test_transverse_axes_are_right_handed():
    """e1, e2 and k are a right-handed set, e1 on the reference's side."""
    for direction in [(0, 0, 1), (0, 0, -1), (1, 0, 0), (0.3, -0.5, 0.2)]:
        e1, e2 = transverse_basis(direction)
        assert np.cross(e1, e2) == pytest.approx(np.array(direction) / np.linalg.norm(direction))
    assert transverse_basis((1, 0, 0))[0] == pytest.approx([0, 0, 1])


def test_without_a_field_the_axis_is_z():
    """No field leaves the quantisation axis along the laboratory z."""
    axes = axes_of((0, 0, 0))
    assert axes.magnitude_gauss == 0.0
    assert axes.frame.tolist() == np.eye(3).tolist()


@pytest.mark.parametrize(
    ("make", "parameter"),
    [
        (lambda: resolve((0, 0, 0), (1, 0, 0), UP), "direction"),
        (lambda: resolve((0, 0, 1), (0, 0, 1), UP), "polarisation"),
        (lambda: resolve((0, 0, 1), (1, 0, 0.01), UP), "polarisation"),
        (lambda: resolve((0, 0, 1), (0, 0, 0), UP), "polarisation"),
        (lambda: resolve((0, np.nan, 1), (1, 0, 0), UP), "direction"),
        (lambda: axes_of((0, np.inf, 1)), "field"),
        (lambda: axes_of((0, 0, 2e6)), "field"),
        (lambda: polarisation_vector((0, 0, 1), (0, 0)), "polarisation"),
        (lambda: transverse_basis((0, 0, 1), (0, 0, 2)), "reference"),
        (lambda: factors(np.array([0, 0, 1.0]), np.array([1, 0, 0j]), UP, "M2"), "multipole"),
        (lambda: best_jones((0, 0, 1), UP, 0), "polarisation"),
        (lambda: direction_from_angles(UP, np.nan), "polar angle"),
    ],
)
def test_bad_geometry_names_its_parameter(make, parameter):
    """Zero vectors, longitudinal polarisations and numbers that are not finite are refused by name."""
    with pytest.raises(OutsideValidity) as caught:
        make()
    assert caught.value.parameter == parameter
