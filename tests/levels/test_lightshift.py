"""The light-shift operator: against a second construction, under rotation, and in its limits."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.typing import NDArray

from levels.constants import MHZ_NM
from levels.errors import NotPublished, OutsideValidity
from levels.geometry import axes_of, factors
from levels.lightshift import (
    Light,
    couple,
    dressed,
    drive_of,
    fictitious_field_gauss,
    operator,
    shift_of,
    solvable,
)
from levels.partners import partners_of
from levels.polarisability import polarisability
from levels.sublevels import sublevels
from tests.levels.lightshift_records import D2, INVENTED, LINES, MIDDLE, RB87, full_operator
from tests.records_for_tests import level

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]
GROUND = RB87.levels[0]
RB, ZZ = partners_of(RB87, GROUND), partners_of(INVENTED, MIDDLE)
INTENSITY = 1e9  # mW/cm2: shifts of MHz far from resonance
Z = np.array([0.0, 0.0, 1.0])


def unit(*parts: complex) -> Complex:
    vector = np.array(parts, dtype=complex)
    return vector / np.linalg.norm(vector)


def drive(eps: Complex, field: Array) -> tuple[complex, complex, complex]:
    """The c_q of any complex vector along a field, by `geometry`; E1 takes no notice of the beam's direction."""
    minus, none, plus = (complex(c) for c in factors(Z, eps, axes_of(field)))
    return minus, none, plus


def rotation(angles: tuple[float, float, float]) -> Array:
    """A rotation matrix from three angles."""
    result = np.eye(3)
    for angle, (a, b) in zip(angles, ((0, 1), (0, 2), (1, 2)), strict=True):
        turn = np.eye(3)
        turn[[a, b], [a, b]] = np.cos(angle)
        turn[a, b], turn[b, a] = -np.sin(angle), np.sin(angle)
        result = turn @ result
    return result


numbers = st.floats(-1.0, 1.0)
vectors = st.tuples(numbers, numbers, numbers, numbers, numbers, numbers).filter(lambda v: max(map(abs, v)) > 0.1)
angles = st.tuples(*[st.floats(0.0, 6.28)] * 3)


@pytest.mark.parametrize("wavelength", [532.0, 820.0, 5000.0])
@settings(max_examples=8)
@given(vectors)
def test_operator_against_full_dimension(wavelength: float, v: tuple[float, ...]) -> None:
    """Levels under light are those of a second construction, for any field direction, J = 2 and lines both ways."""
    eps, field = unit(v[0] + 1j * v[1], v[2] + 1j * v[3], v[4] + 1j * v[5]), np.array([30.0, -40.0, 120.0])
    here, coupled = couple(ZZ, float(np.linalg.norm(field)))
    shift = operator(here, coupled, Light(wavelength, INTENSITY, drive(eps, field)))
    ours = np.linalg.eigvalsh(np.diag(here.energy_mhz) + shift)
    plain = np.linalg.eigvalsh(full_operator(MIDDLE, LINES, eps, wavelength, INTENSITY, field))
    assert ours == pytest.approx(plain, abs=1e-7)
    assert np.abs(shift).max() > 0.1


@given(vectors, angles)
def test_rotating_light_at_zero_field_changes_no_energy(v: tuple[float, ...], turn: tuple[float, float, float]) -> None:
    """Without a field the eigenvalues of H plus the full operator do not know where the polarisation points."""
    eps = unit(v[0] + 1j * v[1], v[2] + 1j * v[3], v[4] + 1j * v[5])
    here, coupled = couple(ZZ, 0.0)
    spectra = []
    for vector in (eps, rotation(turn) @ eps):
        shift = operator(here, coupled, Light(650.0, INTENSITY, drive(vector, Z)))
        spectra.append(np.linalg.eigvalsh(np.diag(here.energy_mhz) + shift))
    assert spectra[0] == pytest.approx(spectra[1], abs=1e-9)


@given(vectors, angles)
def test_rotating_light_and_field_together_changes_no_energy(
    v: tuple[float, ...], turn: tuple[float, float, float]
) -> None:
    """Turning polarisation and quantisation axis alike leaves the diagonal and every eigenvalue."""
    eps, field = unit(v[0] + 1j * v[1], v[2] + 1j * v[3], v[4] + 1j * v[5]), np.array([0.3, 0.4, 1.2])
    matrix = rotation(turn)
    here, coupled = couple(RB, float(np.linalg.norm(field)))
    one, two = (
        operator(here, coupled, Light(850.0, INTENSITY, drive(R @ eps, R @ field))) for R in (np.eye(3), matrix)
    )
    assert np.diag(one).real == pytest.approx(np.diag(two).real, abs=1e-10)
    assert np.linalg.eigvalsh(one) == pytest.approx(np.linalg.eigvalsh(two), abs=1e-10)


@given(vectors)
def test_operator_is_hermitian_and_its_trace_is_the_scalar(v: tuple[float, ...]) -> None:
    """The operator is Hermitian; the mean over a level's sublevels is the scalar shift, whatever the polarisation."""
    eps = unit(v[0] + 1j * v[1], v[2] + 1j * v[3], v[4] + 1j * v[5])
    here, coupled = couple(ZZ, 0.0)
    shift = operator(here, coupled, Light(2000.0, INTENSITY, drive(eps, Z)), scalar_a03=7.0)
    assert np.abs(shift - shift.conj().T).max() < 1e-12 * np.abs(shift).max()
    weights = [F + 1 for F in range(1, 10, 2)]
    per_F = [polarisability(ZZ, 2000.0, F).numbers[0, 0] for F in range(1, 10, 2)]
    scalar = np.average(per_F, weights=weights) + 7.0
    mean = float(np.trace(shift).real) / len(here.labels)
    assert mean == pytest.approx(shift_of(scalar, INTENSITY), rel=1e-12)


@pytest.mark.parametrize("twice_F", [1, 3, 5, 7, 9])
@given(vectors)
def test_diagonal_follows_from_scalar_vector_tensor(twice_F: int, v: tuple[float, ...]) -> None:
    """At zero field each sublevel shifts by the F level's scalar, vector C m/2F and tensor D (3m^2-F(F+1))/F(2F-1)."""
    eps = unit(v[0] + 1j * v[1], v[2] + 1j * v[3], v[4] + 1j * v[5])
    light = Light(777.0, INTENSITY, drive(eps, Z))
    here, coupled = couple(ZZ, 0.0)
    diagonal = np.diag(operator(here, coupled, light)).real
    scalar, vector, tensor = polarisability(ZZ, 777.0, twice_F).numbers[:, 0]
    F, D = twice_F / 2, (3 * light.fractions[1] - 1) / 2
    for k, (label, twice_m) in enumerate(here.labels):
        if label == twice_F:
            m = twice_m / 2
            alpha = scalar + vector * light.circularity * m / (2 * F)
            alpha += tensor * D * (3 * m**2 - F * (F + 1)) / (F * (2 * F - 1)) if F > 0.5 else 0.0
            assert diagonal[k] == pytest.approx(shift_of(alpha, INTENSITY), rel=1e-10, abs=1e-9)


def test_tensor_angle() -> None:
    """At 54.7356 degrees, arccos(1/sqrt 3), linear light shifts every m of an F alike (3 cos^2 - 1 = 0); standard."""
    here, coupled = couple(ZZ, 0.0)
    angle = float(np.degrees(np.arccos(1 / np.sqrt(3))))
    assert angle == pytest.approx(54.7356, abs=5e-5)
    magic, off = (
        np.diag(operator(here, coupled, Light(700.5, INTENSITY, drive_of(90.0, 0.0, at)))).real for at in (angle, 40.0)
    )
    for F in {label[0] for label in here.labels}:
        rows = [k for k, label in enumerate(here.labels) if label[0] == F]
        assert np.ptp(magic[rows]) < 1e-11 * np.abs(magic).max()
    assert np.ptp(off[rows]) > 0.01 * np.abs(off).max()


def test_vector_shift_is_a_fictitious_field() -> None:
    """Far from resonance elliptical light moves the sublevels of both F as the fictitious field does."""
    vector = polarisability(RB, 1064.0).numbers[1, 0]
    light = Light(1064.0, INTENSITY, drive_of(30.0, 25.0, 10.0))
    here, coupled = couple(RB, 0.0)
    shift = operator(here, coupled, light, RB.remainder.value)
    field = fictitious_field_gauss(GROUND, vector, light)
    magnetic = np.linalg.eigvalsh(np.diag(here.energy_mhz) + shift)
    scalar = shift_of(polarisability(RB, 1064.0).numbers[0, 0], INTENSITY)
    expected = np.sort(sublevels(GROUND, float(np.linalg.norm(field))).energy_mhz[0]) + scalar
    # A true field moves g_I too, and the two F differ by hyperfine over detuning: 5e-3 and 5e-4.
    spread = float(np.ptp(expected[:3]))
    assert spread > 0.1
    assert magnetic - magnetic[1] == pytest.approx(expected - expected[1], abs=5e-3 * spread + 5e-4 * abs(scalar))
    along = fictitious_field_gauss(GROUND, vector, Light(1064.0, INTENSITY, drive_of(0.0, 45.0, 0.0)))
    assert field[2] / along[2] == pytest.approx(np.cos(np.radians(30)) * np.sin(np.radians(50)), rel=1e-9)
    assert field[0] / along[2] == pytest.approx(np.sin(np.radians(30)) * np.sin(np.radians(50)), rel=1e-9)


def test_fictitious_field_vanishes_for_linear_light() -> None:
    """Linear light has no vector shift: Le Kien et al. 2013; Wood, Turner, Anderson 2016 suppress it that way."""
    light = Light(1064.0, INTENSITY, drive_of(70.0, 0.0, 33.0))
    assert np.abs(fictitious_field_gauss(GROUND, -28.7, light)).max() < 1e-15
    with pytest.raises(NotPublished, match="J = 0"):
        fictitious_field_gauss(level(0, 0, atom="Zz", name="singlet"), -28.7, light)


def test_counter_rotating_term_is_the_far_red_limit() -> None:
    """Far to the red both terms are alike, and the shift is that of the static polarisability, the same for all m."""
    light = Light(1e5, INTENSITY, drive_of(90.0, 0.0, 0.0))
    here, coupled = couple(RB, 0.0)
    full = np.diag(operator(here, coupled, light)).real
    nu = light.frequency_mhz
    V = [np.tensordot(np.array(light.drive), part.elements, 1) for part in coupled]
    rotating = sum(-(np.abs(v) ** 2 / (part.gap_mhz - nu)).sum(axis=0) for v, part in zip(V, coupled, strict=True))
    assert full / full[0] == pytest.approx(rotating / rotating[0], rel=1e-4)
    unit_shift = shift_of(1.0, INTENSITY)
    static = polarisability(RB, np.inf).numbers[0, 0]
    assert full == pytest.approx(np.full(8, unit_shift * static), rel=1e-4)


@pytest.mark.parametrize(
    ("angle", "ellipticity", "azimuth", "fractions"),
    [
        (90.0, 0.0, 0.0, (0, 1, 0)),
        (90.0, 0.0, 90.0, (0.5, 0, 0.5)),
        (0.0, 45.0, 0.0, (0, 0, 1)),
        (0.0, -45.0, 0.0, (1, 0, 0)),
        (180.0, 45.0, 0.0, (1, 0, 0)),
        (90.0, 45.0, 0.0, (0.25, 0.5, 0.25)),
    ],
)
def test_beam_angles(angle: float, ellipticity: float, azimuth: float, fractions: tuple[float, ...]) -> None:
    """Positive helicity along the field is sigma+; across the field, linear light along it is pi."""
    light = Light(1064.0, 1.0, drive_of(angle, ellipticity, azimuth))
    assert light.fractions == pytest.approx(fractions, abs=1e-12)


def test_too_close_light_is_refused() -> None:
    """Within five natural widths of a component the shift is refused with the distance."""
    here, coupled = couple(RB, 0.0)
    gap = float(coupled[1].gap_mhz[-1, -1])
    light = Light(MHZ_NM / (gap + 10.0), 1.0, drive_of(0.0, 45.0, 0.0))
    with pytest.raises(OutsideValidity, match="10 MHz from a component of 780"):
        operator(here, coupled, light)


def test_level_without_constants_still_carries_a_line() -> None:
    """A far level without published A or g still shifts the level of interest, and its name is told."""
    bare = level(3, 3, name="bare")
    filled, missing = solvable(bare)
    assert missing == ("A", "g_J", "g_I")
    assert len(sublevels(filled, 1.0).twice_F) == 16
    assert solvable(D2.upper)[1] == ()


# Dressed sublevels


def test_weak_light_leaves_labels() -> None:
    """In a field that outweighs the light the dressed shift is the diagonal one, and the labels are sure."""
    here, coupled = couple(RB, 10.0)
    shift = operator(here, coupled, Light(850.0, 1e4, drive_of(40.0, 20.0, 70.0)))
    found = dressed(here, shift)
    assert found.shift_mhz == pytest.approx(np.diag(shift).real, abs=1e-4 * np.abs(shift).max())
    assert found.overlap.min() > 0.9999
    assert not found.ambiguous().any()


def test_strong_light_mixes_labels_and_says_so() -> None:
    """Without a field, light at an angle mixes the m of one F: energies stay right, labels become ambiguous."""
    here, coupled = couple(ZZ, 0.0)
    shift = operator(here, coupled, Light(650.0, INTENSITY, drive_of(90.0, 0.0, 50.0)))
    found = dressed(here, shift)
    assert found.ambiguous().any()
    whole = np.linalg.eigvalsh(np.diag(here.energy_mhz) + shift)
    assert np.sort(found.energy_mhz) == pytest.approx(whole, abs=1e-9)
    assert found.shift_mhz == pytest.approx(found.energy_mhz - here.energy_mhz, abs=1e-9)
