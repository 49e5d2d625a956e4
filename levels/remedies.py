"""What brings the light back from dark states: another field, a modulated polarisation, a second frequency.

Each remedy is predicted with the steady state of the changed scheme, so that the scattering rates can be compared.
"""

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.linalg import expm

from levels.beams import Beam, Scheme, with_field
from levels.bloch import Bloch, generator, index_table, reachable
from levels.errors import OutsideValidity
from levels.geometry import as_direction
from levels.pumping import as_populations, prepare, solve
from levels.steady import closed, null_spaces
from levels.structure import Structure, structure_of

Array = NDArray[np.float64]
LARGEST_GRID = 4000
LARGEST_MODULATED = 600


@dataclass(frozen=True, slots=True, eq=False)
class FieldScan:
    """Scattering rate per atom over field magnitudes (rows) and angles (columns) from the first axis of a plane."""

    magnitudes_gauss: Array
    angles_deg: Array
    plane: Array
    scattering_per_s: Array

    @property
    def best(self) -> tuple[float, float, float]:
        """Magnitude, angle and scattering rate of the brightest point."""
        row, column = np.unravel_index(int(np.argmax(self.scattering_per_s)), self.scattering_per_s.shape)
        return (
            float(self.magnitudes_gauss[row]),
            float(self.angles_deg[column]),
            float(self.scattering_per_s[row, column]),
        )


def plane_of(beam: Beam) -> Array:
    """Return two axes to turn the field in: the long axis of a beam's polarisation and the beam's direction.

    Angle 0 is a field along the polarisation, 90 degrees a field along the beam.
    """
    turned = beam.polarisation * np.exp(-0.5j * np.angle(np.sum(beam.polarisation**2)))
    return np.stack([as_direction("polarisation", turned.real), beam.direction])


def scan_field(
    scheme: Scheme, magnitudes_gauss: Sequence[float], angles_deg: Sequence[float], plane: ArrayLike | None = None
) -> FieldScan:
    """Predict the scattering rate over field magnitude and angle, beams and frequencies as they are.

    The field turns in the plane of two laboratory vectors, by default that of `plane_of` the first beam.
    """
    magnitudes, angles = np.array(magnitudes_gauss, dtype=np.float64), np.array(angles_deg, dtype=np.float64)
    if not 1 <= magnitudes.size * angles.size <= LARGEST_GRID:
        raise OutsideValidity("grid", f"{magnitudes.size} x {angles.size}", f"from 1 to {LARGEST_GRID} points")
    axes = plane_of(scheme.beams[0]) if plane is None else _orthonormal(np.asarray(plane, dtype=np.float64))
    found = np.empty((magnitudes.size, angles.size))
    for row, magnitude in enumerate(magnitudes):
        solved: Structure = structure_of(scheme.atom, [beam.line for beam in scheme.beams], abs(float(magnitude)))
        for column, angle in enumerate(np.radians(angles)):
            field = magnitude * (np.cos(angle) * axes[0] + np.sin(angle) * axes[1])
            found[row, column] = solve(prepare(with_field(scheme, field), structure=solved)).scattering_per_s
    return FieldScan(magnitudes, angles, axes, found)


def _orthonormal(plane: Array) -> Array:
    if plane.shape != (2, 3):
        raise OutsideValidity("plane", str(plane.tolist())[:60], "two vectors x, y, z")
    first, second = as_direction("plane", plane[0]), as_direction("plane", plane[1])
    across = second - (second @ first) * first
    if float(np.linalg.norm(across)) < 1e-9:
        raise OutsideValidity("plane", "two parallel vectors", "two vectors that span a plane")
    return np.stack([first, as_direction("plane", across)])


def modulated_scattering(first: Scheme, second: Scheme, rate_mhz: float) -> float:
    """Predict the mean scattering rate per s when the light switches between two schemes at a rate (full periods).

    Both have the same beams, frequencies and field and differ in polarisations or intensities only. The state repeats
    after each period; half of it is spent in each scheme. The switching is sudden.
    """
    if not 0.0 < rate_mhz < 1e4:
        raise OutsideValidity("modulation rate", rate_mhz, "above 0 and below 10000 MHz")
    lights = [prepare(scheme, "bloch") for scheme in (first, second)]
    if not np.array_equal(lights[0].frame.shift_mhz, lights[1].frame.shift_mhz):
        raise OutsideValidity("modulation", "two schemes", "schemes whose lasers keep their frequencies")
    bloch = [closed(light.bloch) for light in lights]
    table = index_table(reachable(bloch[0]) | reachable(bloch[1]) | _joint(bloch))
    size = int(table.max()) + 1
    if size > LARGEST_MODULATED:
        raise OutsideValidity("beams", f"{size} unknowns", f"at most {LARGEST_MODULATED} for modulated light")
    steps = [_half_period(generator(item, table).toarray(), 0.5 / rate_mhz) for item in bloch]
    start = _periodic(steps[1][0] @ steps[0][0], np.diag(table))
    spent = steps[0][1] @ start + steps[1][1] @ (steps[0][0] @ start)
    populations = spent[np.diag(table)] * rate_mhz
    structure = lights[0].structure
    rates = np.array([decay.total_per_s - decay.leak_per_s for decay in structure.decays])[structure.level_index]
    return float(rates @ populations)


def _joint(bloch: list[Bloch]) -> NDArray[np.bool_]:
    both = replace(bloch[0], coupling=np.abs(bloch[0].coupling) + np.abs(bloch[1].coupling))
    return reachable(both)


def _half_period(matrix: Array, time_us: float) -> tuple[Array, Array]:
    """Return exp(M t) and its integral over the half period."""
    n = matrix.shape[0]
    doubled = np.block([[matrix, np.eye(n)], [np.zeros((n, 2 * n))]])
    whole = expm(doubled * time_us)
    return whole[:n, :n], whole[:n, n:]


def _periodic(period: Array, traced: NDArray[np.int64]) -> Array:
    right, _ = null_spaces(period - np.eye(period.shape[0]))
    state: Array = right[:, 0]
    return state / float(state[traced].sum())


def second_frequency(scheme: Scheme, beam_name: str, shift_mhz: float) -> float:
    """Predict the scattering rate per s with a second beam of the orthogonal polarisation and another frequency.

    The beat of the two frequencies washes out dark superpositions when it is faster than the pumping; rate equations
    are then the right model, and are used.
    """
    extra = [
        replace(
            beam, name=f"{beam.name} shifted", polarisation=orthogonal(beam), offset_mhz=beam.offset_mhz + shift_mhz
        )
        for beam in scheme.beams
        if beam.name == beam_name
    ]
    if not extra:
        raise OutsideValidity("beam", beam_name, f"one of {', '.join(beam.name for beam in scheme.beams)}")
    light = prepare(replace(scheme, beams=(*scheme.beams, *extra)), "rate")
    return solve(light, as_populations(light.structure, None)).scattering_per_s


def orthogonal(beam: Beam) -> NDArray[np.complex128]:
    """Return the polarisation across the beam that is orthogonal to the beam's own."""
    vector: NDArray[np.complex128] = np.cross(beam.direction, beam.polarisation).conj()
    return vector
