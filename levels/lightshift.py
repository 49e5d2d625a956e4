"""Light shifts of the sublevels of one level: the full second-order operator, and the response of one sublevel.

For light E(t) = E0 Re(eps e^(-i omega t)) the operator on the sublevels a, b of a level is, summed over every
sublevel o that an electric-dipole line of the book joins to it,

    H_ab = -(E0^2/4h) sum_o [ <a|eps*.d|o><o|eps.d|b> / (D_o - nu) + <a|eps.d|o><o|eps*.d|b> / (D_o + nu) ]

with D_o = (E_o - E_a)/h, which is the mean over a and b off the diagonal. Hyperfine and Zeeman energies of both levels
are kept. eps.d = sum_q c_q d_q, where c_q drives m -> m + q: c_q = (-1)^q eps_-q. Core and tail add a common scalar.
Neglected: saturation, so the light must be many linewidths and Rabi frequencies from every line.
Cohen-Tannoudji, Dupont-Roc, Grynberg, Atom-Photon Interactions (1992); Le Kien et al., Eur. Phys. J. D 67, 92 (2013).
"""

from collections.abc import Iterable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from levels.blocks import block_ms
from levels.components import amplitudes
from levels.constants import EA0, EPS0, MHZ_NM, POLARISABILITY_SI, C, H
from levels.errors import OutsideValidity, UnknownName
from levels.polarisability import signed_frequency_mhz, usable
from levels.quantity import Quantity
from levels.records import Level, Line
from levels.sublevels import Eigen, as_fields, constants_of, labels_of, solve_block

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]
Label = tuple[int, int]
QS = (-1, 0, 1)
CLOSEST_MHZ = 1.0


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


def field_amplitude_squared(intensity_mw_per_cm2: float) -> float:
    """Compute E0^2 in (V/m)^2 from the intensity of a travelling wave, I = c eps0 E0^2 / 2."""
    return 2 * intensity_mw_per_cm2 * 10 / (C * EPS0)


def scale_mhz2(intensity_mw_per_cm2: float) -> float:
    """Compute (e a0 E0 / h)^2 / 4 in MHz^2: the shift is minus this, times d^2 in (e a0)^2, over a detuning in MHz."""
    return float((EA0 / H) ** 2 * field_amplitude_squared(intensity_mw_per_cm2) / 4 * 1e-12)


def scalar_shift_mhz(polarisability_a03: float, intensity_mw_per_cm2: float) -> float:
    """Compute the shift -alpha E0^2/4h in MHz of a scalar polarisability in a0^3."""
    energy = polarisability_a03 * POLARISABILITY_SI * field_amplitude_squared(intensity_mw_per_cm2) / 4
    return float(-energy / H * 1e-6)


@dataclass(frozen=True, slots=True, eq=False)
class Manifold:
    """Every sublevel of a level at one field, in the order of `labels_of`: energies (s,) and blocks by 2m."""

    level: Level
    labels: tuple[Label, ...]
    energy_mhz: Array
    blocks: dict[int, Eigen]


def manifold(level: Level, field_gauss: float) -> Manifold:
    """Solve a level at one field with its states."""
    constants, fields = constants_of(level), as_fields(field_gauss)
    labels = labels_of(constants)
    blocks = {m: solve_block(constants, m, fields) for m in block_ms(constants.twice_J, constants.twice_I)}
    energy = np.array([blocks[m].energy_mhz[0, blocks[m].twice_F.index(F)] for F, m in labels])
    return Manifold(level, tuple(labels), energy, blocks)


def dipole_elements(line: Line, here: Manifold, there: Manifold) -> Array:
    """Build <o|d_q|a> in e a0 between the sublevels o of the other level and a of this one, shape (3, o, a).

    q = m_o - m_a is the first index in the order of `QS`; the line's reduced element must be known.
    """
    ours_is_lower = line.lower.name == here.level.name
    low, up = (here, there) if ours_is_lower else (there, here)
    scale = (line.reduced_dipole.value if line.reduced_dipole else 0.0) / np.sqrt(line.upper.twice_J + 1)
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


def couple(level: Level, lines: Iterable[Line], field_gauss: float) -> tuple[Manifold, list[Coupled], tuple[str, ...]]:
    """Solve a level and everything its lines join it to; also the names of lines left out for want of a constant."""
    here = manifold(level, field_gauss)
    good, left_out = usable(level, lines)
    coupled = []
    for line in good:
        there = manifold(line.upper if line.lower.name == level.name else line.lower, field_gauss)
        gap = signed_frequency_mhz(level, line) + there.energy_mhz[:, None] - here.energy_mhz[None, :]
        coupled.append(Coupled(line, there, dipole_elements(line, here, there), gap))
    return here, coupled, left_out


def _off_resonance(gap: Array, light_mhz: float, line: Line) -> None:
    closest = float(np.min(np.abs(np.abs(gap) - light_mhz)))
    if closest < CLOSEST_MHZ:
        raise OutsideValidity(
            "wavelength",
            MHZ_NM / light_mhz,
            f"{closest:.3g} MHz from a component of {line.name}; the light must be far off",
        )


def operator(here: Manifold, coupled: Sequence[Coupled], light: Light, scalar_a03: float = 0.0) -> Complex:
    """Build the light-shift operator in MHz between the sublevels of a level at a field, shape (s, s), Hermitian.

    `scalar_a03` is the polarisability of core and tail, common to all sublevels.
    """
    nu, size = light.frequency_mhz, len(here.labels)
    total = np.zeros((size, size), dtype=np.complex128)
    for part in coupled:
        _off_resonance(part.gap_mhz, nu, part.line)
        for drive, turning in ((light.drive, -nu), (light.counter_drive, nu)):
            V = np.tensordot(np.array(drive), part.elements, 1)
            weighted = V / (part.gap_mhz + turning)
            total += (weighted.conj().T @ V + V.conj().T @ weighted) / 2
    shift = -scale_mhz2(light.intensity_mw_per_cm2) * total
    shift += scalar_shift_mhz(scalar_a03, light.intensity_mw_per_cm2) * np.eye(size)
    return shift


@dataclass(frozen=True, slots=True, eq=False)
class Response:
    """The diagonal shift of one sublevel as a function of wavelength and polarisation.

    shift / scale_mhz2 = -sum_i |c_q(i)|^2 weight_i / (pole_i - nu), with poles in MHz (negative ones are the counter-
    rotating terms) and weights in (e a0)^2; `constant_a03` is the scalar of core and tail.
    """

    label: Label
    q: NDArray[np.int64]
    pole_mhz: Array
    weight: Array
    line: tuple[str, ...]
    constant_a03: float

    def shift_mhz(self, light_mhz: ArrayLike, fractions: ArrayLike, intensity_mw_per_cm2: float = 1.0) -> Array:
        """Evaluate the shift at n light frequencies for |c_q|^2 of shape (3,) or (n, 3), in MHz."""
        nu = np.atleast_1d(np.asarray(light_mhz, dtype=np.float64))
        share = np.broadcast_to(np.asarray(fractions, dtype=np.float64), (nu.size, 3))
        total = np.zeros(nu.size)
        for q in QS:
            chosen = self.q == q
            total += share[:, q + 1] * (self.weight[chosen] / (self.pole_mhz[chosen] - nu[:, None])).sum(axis=1)
        shift: Array = -scale_mhz2(intensity_mw_per_cm2) * total
        return shift + scalar_shift_mhz(self.constant_a03, intensity_mw_per_cm2)

    def slope_per_mhz(self, light_mhz: float, fractions: Sequence[float], intensity_mw_per_cm2: float = 1.0) -> float:
        """Evaluate how the shift changes with the light's frequency, MHz per MHz."""
        share = np.asarray(fractions)[self.q + 1]
        total = float((share * self.weight / (self.pole_mhz - light_mhz) ** 2).sum())
        return -scale_mhz2(intensity_mw_per_cm2) * total


def response(here: Manifold, coupled: Sequence[Coupled], label: Label, scalar_a03: float = 0.0) -> Response:
    """Collect the poles and weights of one sublevel (2F, 2m)."""
    if label not in here.labels:
        raise UnknownName("sublevel", str(label), hint=f"{here.level.name} has no such F and m")
    column = here.labels.index(label)
    q_all, poles, weights, names = [], [], [], []
    for part in coupled:
        for q in QS:
            rows = np.nonzero(part.elements[q + 1, :, column])[0]
            square = part.elements[q + 1, rows, column] ** 2
            gap = part.gap_mhz[rows, column]
            # |c'_q|^2 = |c_-q|^2, and w/(D + nu) = -w/(-D - nu).
            for sign, owner in ((1, q), (-1, -q)):
                q_all.append(np.full(rows.size, owner))
                poles.append(sign * gap)
                weights.append(sign * square)
                names += [part.line.name] * rows.size
    empty = np.empty(0)
    return Response(
        label,
        np.concatenate(q_all).astype(np.int64) if q_all else empty.astype(np.int64),
        np.concatenate(poles) if poles else empty,
        np.concatenate(weights) if weights else empty,
        tuple(names),
        scalar_a03,
    )


def core_and_tail(core: Quantity | None, tail: Quantity | None) -> float:
    """Add what is published of the core's and the higher levels' scalar polarisability, in a0^3."""
    return sum(part.value for part in (core, tail) if part is not None)
