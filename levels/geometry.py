"""Beam direction and polarisation resolved along the magnetic field: how much sigma+, pi and sigma- an atom sees.

Directions, polarisations and the field are vectors in one right-handed laboratory frame. The quantisation axis is the
field's direction (the laboratory z when there is no field). Its frame is (theta, phi, r) of spherical coordinates, so
that a field along z leaves x and y where they are.

A polarisation is the complex unit vector of E(t) = E0 Re[eps exp(i(k.r - omega t))]. Its amplitude for q is
a_q = e_q* . eps with e_+1 = -(x + iy)/sqrt2, e_0 = z, e_-1 = (x - iy)/sqrt2, and a_q drives m -> m + q:
eps . d = sum_q a_q d_q. Fractions are |a_q|^2. Positive helicity along the field is sigma+.

For other multipoles the factors c_q replace a_q: E2 and E3 couple eps with one or two more unit vectors k to rank 2 or
3, M1 takes k x eps. They are scaled so that sum |c_q|^2 = (2 rank + 1)/3; with the strengths of `components` the Rabi
frequency then has one formula for every multipole (`beams.reference_rabi_mhz`). Varshalovich et al., Quantum Theory
of Angular Momentum (1988), sections 1.1 and 3.1.
"""

from collections.abc import Sequence
from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import ArrayLike, NDArray

from levels.angular import clebsch_gordan
from levels.errors import OutsideValidity
from levels.notation import MULTIPOLE_RANK
from levels.sublevels import LARGEST_FIELD_GAUSS

Vector = NDArray[np.float64]
Complex = NDArray[np.complex128]

DIRECTION_WITHOUT_FIELD = (0.0, 0.0, 1.0)
LONGITUDINAL_TOLERANCE = 1e-6  # share of the polarisation along the beam that rounding can explain
_SPHERICAL = np.array([[1, -1j, 0], [0, 0, np.sqrt(2)], [-1, -1j, 0]]) / np.sqrt(2)  # rows e_q, q = -1, 0, +1


@dataclass(frozen=True, slots=True, eq=False)
class Axes:
    """The field's magnitude in gauss and the frame along it: rows x', y', z' in laboratory coordinates."""

    magnitude_gauss: float
    frame: Vector

    @property
    def direction(self) -> Vector:
        """The quantisation axis, a unit vector."""
        axis: Vector = self.frame[2]
        return axis


@dataclass(frozen=True, slots=True, eq=False)
class Resolved:
    """One beam along the field. Arrays run over q = -rank .. rank; `attainable` is the largest fraction of each q.

    `attainable` belongs to the beam's direction: no polarisation of a beam at this angle does better.
    """

    multipole: str
    amplitudes: Complex
    fractions: Vector
    attainable: Vector
    angle_deg: float  # between the beam and the field
    helicity: float  # -1 to 1, the mean photon spin along the beam

    @property
    def rank(self) -> int:
        """The multipole rank."""
        return self.amplitudes.size // 2

    def fraction(self, q: int) -> float:
        """The share of the intensity that drives m -> m + q."""
        return float(self.fractions[q + self.rank])


def as_vector(parameter: str, value: ArrayLike) -> Vector:
    """Check three finite numbers and return them as an array."""
    vector = np.asarray(value, dtype=np.float64)
    if vector.shape != (3,) or not np.all(np.isfinite(vector)):
        raise OutsideValidity(parameter, _shown(value), "three finite numbers x, y, z")
    return vector


def as_direction(parameter: str, value: ArrayLike) -> Vector:
    """Check a direction and return it as a unit vector."""
    vector = as_vector(parameter, value)
    largest = float(np.abs(vector).max())
    if largest == 0.0:
        raise OutsideValidity(parameter, "(0, 0, 0)", "a vector that is not zero, such as 0, 0, 1")
    vector = vector / largest
    return vector / float(np.linalg.norm(vector))


def axes_of(field_gauss: ArrayLike) -> Axes:
    """Set up the frame along a field vector in gauss; without a field the quantisation axis is the laboratory z.

    >>> axes_of((0.0, 0.0, -3.0)).direction.tolist()
    [0.0, 0.0, -1.0]
    """
    field = as_vector("field", field_gauss)
    magnitude = float(np.linalg.norm(field))
    if magnitude > LARGEST_FIELD_GAUSS:
        raise OutsideValidity("field", magnitude, f"at most {LARGEST_FIELD_GAUSS:g} G")
    x, y, z = as_direction("field", field) if magnitude > 0.0 else np.array(DIRECTION_WITHOUT_FIELD)
    across = float(np.hypot(x, y))
    cos, sin = (x / across, y / across) if across > 0.0 else (1.0, 0.0)
    frame = np.array([[z * cos, z * sin, -across], [-sin, cos, 0.0], [x, y, z]])
    return Axes(magnitude, frame + 0.0)


def direction_from_angles(axes: Axes, polar_deg: float, azimuth_deg: float = 0.0) -> Vector:
    """Return the beam direction at a polar angle from the field and an azimuth around it (from x' to y')."""
    for name, angle in (("polar angle", polar_deg), ("azimuth", azimuth_deg)):
        if not np.isfinite(angle):
            raise OutsideValidity(name, angle, "a finite angle in degrees")
    polar, azimuth = np.radians(polar_deg), np.radians(azimuth_deg)
    along = np.array([np.sin(polar) * np.cos(azimuth), np.sin(polar) * np.sin(azimuth), np.cos(polar)])
    direction: Vector = along @ axes.frame
    return direction


def transverse_basis(direction: ArrayLike, reference: ArrayLike | None = None) -> Vector:
    """Return the two axes (rows e1, e2) that Jones vectors and polariser angles of a beam refer to.

    e1 is the part of the reference vector across the beam and e2 = k x e1: angles grow from e1 to e2, counter-clockwise
    for someone who looks into the beam. The reference is the laboratory z, or x for a beam along z.
    """
    k = as_direction("direction", direction)
    if reference is None:
        wanted = np.array([0.0, 0.0, 1.0]) if np.hypot(k[0], k[1]) > 1e-9 else np.array([1.0, 0.0, 0.0])
    else:
        wanted = as_direction("reference", reference)
    across = wanted - (wanted @ k) * k
    length = float(np.linalg.norm(across))
    if length < 1e-9:
        raise OutsideValidity("reference", _shown(reference), "a vector that is not along the beam")
    return np.stack([across / length, np.cross(k, across / length)])


def polarisation_vector(direction: ArrayLike, jones: Sequence[complex], reference: ArrayLike | None = None) -> Complex:
    """Return the unit polarisation vector, in the laboratory frame, of a Jones vector on the transverse basis."""
    pair = np.asarray(jones, dtype=np.complex128)
    if pair.shape != (2,) or not np.all(np.isfinite(pair)) or not np.any(pair):
        raise OutsideValidity("polarisation", _shown(jones), "two finite complex amplitudes, not both zero")
    pair = pair / np.abs(pair).max()
    vector: Complex = (pair / np.linalg.norm(pair)) @ transverse_basis(direction, reference)
    return vector


def as_polarisation(direction: ArrayLike, polarisation: ArrayLike) -> Complex:
    """Check a polarisation given as a laboratory vector and return it as a unit vector across the beam."""
    k = as_direction("direction", direction)
    vector = np.asarray(polarisation, dtype=np.complex128)
    if vector.shape != (3,) or not np.all(np.isfinite(vector)) or not np.any(vector):
        raise OutsideValidity("polarisation", _shown(polarisation), "three finite amplitudes x, y, z, not all zero")
    vector = vector / np.abs(vector).max()
    vector = vector / np.linalg.norm(vector)
    along = abs(vector @ k)
    if along > LONGITUDINAL_TOLERANCE:
        allowed = f"across the beam, but {along:.3g} of it points along; turn it to be perpendicular to the direction"
        raise OutsideValidity("polarisation", _shown(polarisation), allowed)
    vector = vector - (vector @ k) * k
    unit: Complex = vector / np.linalg.norm(vector)
    return unit


def _shown(value: object) -> str:
    text = str(value).replace("\n", " ")
    return text if len(text) <= 60 else text[:57] + "..."


@lru_cache(maxsize=8)
def _stretch(rank: int) -> Vector:
    """Return <rank-1 p, 1 r | rank q> as an array (q, p, r): how one more unit vector raises the rank."""
    table = np.zeros((2 * rank + 1, 2 * rank - 1, 3))
    for q in range(-rank, rank + 1):
        for r in (-1, 0, 1):
            if abs(q - r) < rank:
                value = clebsch_gordan(2 * rank - 2, 2 * (q - r), 2, 2 * r, 2 * rank, 2 * q)
                table[q + rank, q - r + rank - 1, r + 1] = float(value)
    table.setflags(write=False)
    return table


@lru_cache(maxsize=8)
def _scale(rank: int) -> float:
    """Return the factor that makes sum |c_q|^2 equal (2 rank + 1)/3; it does not depend on the direction."""
    raw = _raise_rank(np.array([1.0, 0.0, 0.0], dtype=np.complex128), np.array([0, 1.0, 0], dtype=np.complex128), rank)
    return float(np.sqrt((2 * rank + 1) / 3) / np.linalg.norm(raw))


def _raise_rank(amplitudes: Complex, beam: Complex, rank: int) -> Complex:
    for k in range(2, rank + 1):
        amplitudes = np.einsum("qpr,p,r->q", _stretch(k), amplitudes, beam)
    return amplitudes


def factors(direction: Vector, polarisation: Complex, axes: Axes, multipole: str = "E1") -> Complex:
    """Compute the geometry factors c_q, q = -rank .. rank, of a beam along the field; for E1 they are the a_q.

    >>> factors(np.array([0.0, 0.0, 1.0]), np.array([1.0, 1j, 0.0]) / np.sqrt(2), axes_of((0, 0, 1))).round(6).tolist()
    [0j, 0j, (-1+0j)]
    """
    if multipole not in ("E1", "M1", "E2", "E3"):
        raise OutsideValidity("multipole", multipole, "E1, M1, E2 or E3: no geometry factors for others")
    rank = MULTIPOLE_RANK[multipole]
    vector = np.cross(direction, polarisation) if multipole == "M1" else polarisation
    to_spherical = _SPHERICAL.conj() @ axes.frame
    amplitudes: Complex = to_spherical @ vector
    if rank > 1:
        amplitudes = _raise_rank(amplitudes, to_spherical @ direction, rank) * _scale(rank)
    return amplitudes + 0.0


def factor_map(direction: ArrayLike, axes: Axes, multipole: str = "E1", reference: ArrayLike | None = None) -> Complex:
    """Return the matrix (2 rank + 1, 2) that turns a Jones vector of this beam into its geometry factors."""
    k = as_direction("direction", direction)
    columns = [factors(k, axis + 0j, axes, multipole) for axis in transverse_basis(k, reference)]
    return np.stack(columns, axis=1)


def attainable(direction: ArrayLike, axes: Axes, multipole: str = "E1") -> Vector:
    """Compute the largest fraction of each q that any polarisation of a beam in this direction reaches.

    For a dipole line at an angle theta to the field: (1 + cos^2)/2 for sigma, sin^2 for pi. A beam across the field can
    give no more than half sigma+ (the other half is sigma-).
    """
    rows = factor_map(direction, axes, multipole)
    largest: Vector = np.sum(np.abs(rows) ** 2, axis=1) * 3 / rows.shape[0]
    return largest


def best_jones(
    direction: ArrayLike, axes: Axes, q: int, multipole: str = "E1", reference: ArrayLike | None = None
) -> Complex:
    """Return the Jones vector of a beam that drives q with the largest attainable fraction."""
    rows = factor_map(direction, axes, multipole, reference)
    rank = rows.shape[0] // 2
    if abs(q) > rank:
        raise OutsideValidity("polarisation", q, f"q from -{rank} to {rank} for a {multipole} line")
    row = rows[q + rank]
    length = float(np.linalg.norm(row))
    if length < 1e-9:
        raise OutsideValidity("polarisation", q, "a beam in this direction cannot drive it at all; turn beam or field")
    best: Complex = row.conj() / length
    return best


def resolve(direction: ArrayLike, polarisation: ArrayLike, axes: Axes, multipole: str = "E1") -> Resolved:
    """Resolve a beam along the field: amplitudes, fractions and the best that its direction allows.

    >>> along = axes_of((0.0, 0.0, 1.0))
    >>> resolve((1.0, 0.0, 0.0), (0.0, 1.0, 0.0), along).fractions.round(6).tolist()
    [0.5, 0.0, 0.5]
    """
    k = as_direction("direction", direction)
    vector = as_polarisation(k, polarisation)
    amplitudes = factors(k, vector, axes, multipole)
    shares = np.abs(amplitudes) ** 2
    helicity = float((1j * np.cross(vector, vector.conj()) @ k).real)
    angle = float(np.degrees(np.arctan2(np.linalg.norm(np.cross(k, axes.direction)), k @ axes.direction)))
    return Resolved(multipole, amplitudes, shares / shares.sum(), attainable(k, axes, multipole), angle, helicity)
