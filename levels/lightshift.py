"""Light shifts of the sublevels of one level: the full second-order operator in a field.

For light E(t) = E0 Re(eps e^(-i omega t)) the operator on the sublevels a, b of a level is, summed over every
sublevel o that an electric-dipole line of the book joins to it,

    H_ab = -(E0^2/4h) sum_o [ <a|eps*.d|o><o|eps.d|b> / (D_o - nu) + <a|eps.d|o><o|eps*.d|b> / (D_o + nu) ]

with D_o = (E_o - E_a)/h, which is the mean over a and b off the diagonal. Hyperfine and Zeeman energies of both levels
are kept. eps.d = sum_q c_q d_q, where c_q drives m -> m + q (`geometry`). The remainder (core and levels beyond the
book) adds a common scalar. Neglected: saturation, so the light must be many linewidths and Rabi frequencies from every
line. Cohen-Tannoudji, Dupont-Roc, Grynberg, Atom-Photon Interactions (1992); Le Kien et al., Eur. Phys. J. D 67, 92
(2013).
"""

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from levels.blocks import block_ms
from levels.components import amplitudes
from levels.constants import EA0, EPS0, HARTREE_MHZ, MHZ_NM, MU_B_MHZ_PER_GAUSS, POLARISABILITY_SI, C, H
from levels.errors import NotPublished, OutsideValidity
from levels.geometry import axes_of, factors, polarisation_vector
from levels.jones import elliptical
from levels.partners import Partners, dipole_of, other_end, signed_frequency_mhz
from levels.polarisability import clearance_mhz
from levels.quantity import Quantity
from levels.records import Level, Line
from levels.sublevels import Eigen, as_fields, constants_of, labels_of, solve_block

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]
Label = tuple[int, int]
QS = (-1, 0, 1)
STAND_IN_MHZ = 1e-6  # a splitting that orders the F of a level whose own is not published
LARGEST_INTENSITY = 1e12  # mW/cm2; far beyond it an atom ionises


@dataclass(frozen=True, slots=True)
class Light:
    """Monochromatic light: vacuum wavelength, intensity, and c_q for q = -1, 0, +1 with sum |c_q|^2 = 1."""

    wavelength_nm: float
    intensity_mw_per_cm2: float
    drive: tuple[complex, complex, complex]

    @property
    def frequency_mhz(self) -> float:
        """The light's frequency in MHz."""
        return MHZ_NM / self.wavelength_nm

    @property
    def counter_drive(self) -> tuple[complex, complex, complex]:
        """The c_q of eps*.d: (-1)^q conj(c_-q)."""
        minus, none, plus = (np.conj(c) for c in self.drive)
        return -plus, none, -minus

    @property
    def fractions(self) -> tuple[float, float, float]:
        """The |c_q|^2."""
        return abs(self.drive[0]) ** 2, abs(self.drive[1]) ** 2, abs(self.drive[2]) ** 2

    @property
    def circularity(self) -> float:
        """The degree of circularity along the field, from -1 (pure sigma-) to 1 (pure sigma+)."""
        return self.fractions[2] - self.fractions[0]


def drive_of(beam_angle_deg: float, ellipticity_deg: float, azimuth_deg: float) -> tuple[complex, complex, complex]:
    """Compute c_q of a beam at an angle to the field's axis z.

    Ellipticity runs from -45 to 45 degrees (helicity -1 to 1); the azimuth of the ellipse's long axis counts from the
    plane of beam and field.

    >>> [round(abs(c) ** 2, 6) for c in drive_of(90.0, 0.0, 0.0)]
    [0.0, 1.0, 0.0]
    """
    angle = np.radians(beam_angle_deg)
    if not np.isfinite(angle):
        raise OutsideValidity("beam_angle", beam_angle_deg, "a finite angle in degrees")
    direction = np.array([np.sin(angle), 0.0, np.cos(angle)])
    across = np.array([-np.cos(angle), 0.0, np.sin(angle)])
    vector = polarisation_vector(direction, list(elliptical(ellipticity_deg, azimuth_deg)), across)
    minus, none, plus = (complex(c) for c in factors(direction, vector, axes_of((0.0, 0.0, 0.0))))
    return minus, none, plus


def scale_mhz2(intensity_mw_per_cm2: float) -> float:
    """Compute (e a0 E0 / 2h)^2 in MHz^2: the shift is minus this, times d^2 in (e a0)^2, over a detuning in MHz.

    The intensity is that of a travelling wave, I = c eps0 E0^2 / 2.
    """
    return float((EA0 / H) ** 2 * 2 * intensity_mw_per_cm2 * 10 / (C * EPS0) / 4 * 1e-12)


def shift_of(polarisability_a03: float, intensity_mw_per_cm2: float = 1.0) -> float:
    """Compute the shift -alpha E0^2/4h in MHz of a polarisability in a0^3.

    >>> round(shift_of(1.0) * 1e9, 6)  # mHz in 1 mW/cm2
    -0.046871
    """
    if not 0 <= intensity_mw_per_cm2 <= LARGEST_INTENSITY:
        raise OutsideValidity("intensity", intensity_mw_per_cm2, f"from 0 to {LARGEST_INTENSITY:g} mW/cm2")
    energy = polarisability_a03 * POLARISABILITY_SI * intensity_mw_per_cm2 * 10 / (2 * C * EPS0)
    return float(-energy / H * 1e-6)


@dataclass(frozen=True, slots=True, eq=False)
class Manifold:
    """Every sublevel of a level at one field, in the order of `labels_of`: energies (s,) and blocks by 2m."""

    level: Level
    field_gauss: float
    labels: tuple[Label, ...]
    energy_mhz: Array
    blocks: dict[int, Eigen]


def manifold(level: Level, field_gauss: float) -> Manifold:
    """Solve a level at one field with its states."""
    constants, fields = constants_of(level), as_fields(field_gauss)
    labels = labels_of(constants)
    blocks = {m: solve_block(constants, m, fields) for m in block_ms(constants.twice_J, constants.twice_I)}
    energy = np.array([blocks[m].energy_mhz[0, blocks[m].twice_F.index(F)] for F, m in labels])
    return Manifold(level, field_gauss, tuple(labels), energy, blocks)


def solvable(level: Level) -> tuple[Level, tuple[str, ...]]:
    """Return a level at the far end of a line with zero for the constants that are not published, and their names.

    Its own splittings matter only where the light is near the line.
    """
    missing = []
    nothing, ordering = (Quantity(value, None, "", "", "", "computed") for value in (0.0, STAND_IN_MHZ))
    if level.A is None and level.twice_J and level.twice_I:
        missing.append("A")
        level = replace(level, A=ordering, B=None, C=None)
    if level.g_J is None and level.twice_J:
        missing.append("g_J")
        level = replace(level, g_J=nothing)
    if level.g_I is None and level.twice_I:
        missing.append("g_I")
        level = replace(level, g_I=nothing)
    return level, tuple(missing)


def dipole_elements(line: Line, here: Manifold, there: Manifold) -> Array:
    """Build <o|d_q|a> in e a0 between the sublevels o of the other level and a of this one, shape (3, o, a).

    q = m_o - m_a is the first index in the order of `QS`.
    """
    ours_is_lower = line.lower.name == here.level.name
    low, up = (here, there) if ours_is_lower else (there, here)
    scale = dipole_of(line) / np.sqrt(line.upper.twice_J + 1)
    elements = np.zeros((3, len(there.labels), len(here.labels)))
    rows = {label: k for k, label in enumerate(there.labels)}
    columns = {label: k for k, label in enumerate(here.labels)}
    for m, lower_block in low.blocks.items():
        for q in QS:
            upper_block = up.blocks.get(m + 2 * q)
            if upper_block is None:
                continue
            square = scale * amplitudes(line, lower_block, upper_block)[0]
            uppers = [(F, m + 2 * q) for F in upper_block.twice_F]
            lowers = [(F, m) for F in lower_block.twice_F]
            if ours_is_lower:
                elements[q + 1][np.ix_([rows[u] for u in uppers], [columns[w] for w in lowers])] = square
            else:
                # <o|d_-q|a> = (-1)^q <a|d_q|o> for real elements.
                at = np.ix_([rows[w] for w in lowers], [columns[u] for u in uppers])
                elements[1 - q][at] = (-1) ** q * square.T
    return elements


@dataclass(frozen=True, slots=True, eq=False)
class Coupled:
    """One line as this level sees it: elements (3, o, a) in e a0 and (E_o - E_a)/h in MHz, shape (o, a)."""

    line: Line
    there: Manifold
    elements: Array
    gap_mhz: Array


def couple(partners: Partners, field_gauss: float) -> tuple[Manifold, list[Coupled]]:
    """Solve a level and everything its lines join it to."""
    here = manifold(partners.level, field_gauss)
    coupled = []
    for line in partners.lines:
        there = manifold(solvable(other_end(partners.level, line))[0], field_gauss)
        gap = signed_frequency_mhz(partners.level, line) + there.energy_mhz[:, None] - here.energy_mhz[None, :]
        coupled.append(Coupled(line, there, dipole_elements(line, here, there), gap))
    return here, coupled


def check_distance(coupled: Sequence[Coupled], light_mhz: float) -> None:
    """Refuse light that is within a few natural widths of a component."""
    for part in coupled:
        closest = float(np.min(np.abs(np.abs(part.gap_mhz) - light_mhz)))
        if closest < clearance_mhz(part.line):
            allowed = f"{closest:.3g} MHz from a component of {part.line.name}; at least {clearance_mhz(part.line):.3g}"
            raise OutsideValidity("wavelength", MHZ_NM / light_mhz, f"{allowed} MHz off, where the light only shifts")


def operator(here: Manifold, coupled: Sequence[Coupled], light: Light, scalar_a03: float = 0.0) -> Complex:
    """Build the light-shift operator in MHz between the sublevels of a level at a field, shape (s, s), Hermitian.

    `scalar_a03` is the polarisability of the remainder, common to all sublevels.
    """
    nu, size = light.frequency_mhz, len(here.labels)
    check_distance(coupled, nu)
    total = np.zeros((size, size), dtype=np.complex128)
    for part in coupled:
        for drive, turning in ((light.drive, -nu), (light.counter_drive, nu)):
            V = np.tensordot(np.array(drive), part.elements, 1)
            weighted = V / (part.gap_mhz + turning)
            total += (weighted.conj().T @ V + V.conj().T @ weighted) / 2
    total += scalar_a03 / HARTREE_MHZ * np.eye(size)
    shift: Complex = -scale_mhz2(light.intensity_mw_per_cm2) * total
    return shift


@dataclass(frozen=True, slots=True, eq=False)
class Dressed:
    """The sublevels under light: H and operator together, in the order of the manifold's labels.

    Each state is matched with the bare sublevel it resembles; `overlap` is |<bare|state>|^2. `energy_mhz` counts from
    the level's centroid, `shift_mhz` from the bare sublevel.
    """

    energy_mhz: Array
    shift_mhz: Array
    overlap: Array

    def ambiguous(self) -> NDArray[np.bool_]:
        """Tell the sublevels whose label no longer says much: another bare sublevel may weigh as much."""
        return self.overlap < 0.5


def dressed(here: Manifold, shift: Complex) -> Dressed:
    """Diagonalise the sublevels' energies and the light-shift operator together."""
    from scipy.optimize import linear_sum_assignment

    energies, states = np.linalg.eigh(np.diag(here.energy_mhz) + shift)
    weight = np.abs(states) ** 2
    bare, which = linear_sum_assignment(-weight)
    energy = energies[which]
    return Dressed(energy, energy - here.energy_mhz[bare], weight[bare, which])


def fictitious_field_gauss(level: Level, vector_a03: float, light: Light) -> Array:
    """Compute the magnetic field (x, y, z in gauss, z along the true field) that acts on J as the vector shift does.

    B = alpha_v/(8 muB g_J J) i (E* x E), Le Kien et al. (2013): the vector shift is muB g_J J.B/h. The frame is that of
    `drive_of`: the beam in the plane of x and z.
    """
    if level.g_J is None or level.twice_J == 0 or level.g_J.value == 0:
        raise NotPublished("g_J", f"{level.atom} {level.name}", "a level with J = 0 has no vector shift")
    minus, none, plus = light.drive
    eps = np.array([(minus - plus) / np.sqrt(2), (minus + plus) / (1j * np.sqrt(2)), none])
    turning = (1j * np.cross(eps.conj(), eps)).real
    per_J = shift_of(vector_a03, light.intensity_mw_per_cm2) / level.twice_J  # MHz per unit of J along -turning
    field: Array = -per_J / (MU_B_MHZ_PER_GAUSS * level.g_J.value) * turning
    return field
