"""Scalar, vector and tensor polarisability of a level, summed over the book's electric-dipole lines.

With omega the light's angular frequency and omega_k that of a line, signed (negative where the other level lies below),
the sum over lines, counter-rotating term included, is

    a_K = (-1)^(K+J+1) sqrt(2K+1) sum_k (-1)^J' {1 K 1; J J' J} |<J'||d||J>|^2 R_K
    R_K = 1/(omega_k - omega) + (-1)^K / (omega_k + omega)
    scalar = a_0 / sqrt(3(2J+1)),  vector = -sqrt(2J/((J+1)(2J+1))) a_1,
    tensor = -sqrt(2J(2J-1)/(3(J+1)(2J+1)(2J+3))) a_2

Le Kien, Schneeweiss, Rauschenbeutel, Eur. Phys. J. D 67, 92 (2013). All in atomic units (a0^3). The shift of a sublevel
in light of amplitude E is then -(E^2/4)[scalar + C vector m/2J + D tensor (3m^2 - J(J+1))/2J(2J-1)] with C the degree
of circularity and D = (3|eps_z|^2 - 1)/2. The formula stops where the light is within some widths of a line.
"""

from collections.abc import Iterable
from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import ArrayLike, NDArray

from levels.angular import six_j
from levels.constants import HARTREE_MHZ, MHZ_NM
from levels.errors import NotPublished, OutsideValidity
from levels.quantity import Quantity
from levels.records import Level, Line

Array = NDArray[np.float64]
RANKS = (0, 1, 2)


@dataclass(frozen=True, slots=True, eq=False)
class Share:
    """What one line adds: (3, n) numbers in a0^3 for scalar, vector, tensor, and their standard uncertainty."""

    line: Line
    other: str
    numbers: Array
    uncertainty: Array | None


@dataclass(frozen=True, slots=True, eq=False)
class Polarisability:
    """Polarisability of one level at n wavelengths, (3, n) in a0^3, and what its sum is made of.

    `uncertainty` joins the stated ones of strengths, core and tail; `unstated` names the inputs without one and
    `left_out` the lines that the book has without a strength or frequency. Lines that the book does not have at all are
    left out too, and so is the core where none is published: then `complete` is False.
    """

    level: Level
    wavelength_nm: Array
    numbers: Array
    uncertainty: Array
    shares: tuple[Share, ...]
    core: Quantity | None
    tail: Quantity | None
    unstated: tuple[str, ...]
    left_out: tuple[str, ...]

    @property
    def complete(self) -> bool:
        """Whether core and tail were published, so that nothing large is missing by construction."""
        return self.core is not None and self.tail is not None


@lru_cache(maxsize=1024)
def rank_weights(twice_J: int, twice_J_other: int) -> tuple[float, float, float]:
    """Compute the factors that take |d|^2 (1/(w_k - w) +- 1/(w_k + w)) to scalar, vector and tensor shares."""
    J = twice_J / 2
    ends = (
        1 / np.sqrt(3 * (2 * J + 1)),
        -np.sqrt(2 * J / ((J + 1) * (2 * J + 1))),
        -np.sqrt(max(2 * J * (2 * J - 1), 0) / (3 * (J + 1) * (2 * J + 1) * (2 * J + 3))),
    )
    weights = []
    for K, end in zip(RANKS, ends, strict=True):
        sign = (-1) ** ((2 * K + twice_J + 2 + twice_J_other) // 2)
        symbol = float(six_j(2, 2 * K, 2, twice_J, twice_J_other, twice_J))
        weights.append(float(sign * np.sqrt(2 * K + 1) * symbol * end))
    return weights[0], weights[1], weights[2]


def signed_frequency_mhz(level: Level, line: Line) -> float:
    """Return the line's frequency as seen from a level: positive upwards, negative downwards."""
    if line.centroid is None:
        raise NotPublished("frequency", f"{line.atom} {line.name}")
    return line.centroid.value if line.lower.name == level.name else -line.centroid.value


def usable(level: Level, lines: Iterable[Line]) -> tuple[list[Line], tuple[str, ...]]:
    """Split the electric-dipole lines of a level into those with strength and frequency, and the names of the rest."""
    good, left_out = [], []
    for line in lines:
        if level.name in (line.lower.name, line.upper.name) and line.multipole == "E1" and not line.induced:
            if line.reduced_dipole is None or line.centroid is None:
                left_out.append(line.name)
            else:
                good.append(line)
    return good, tuple(left_out)


def as_wavelengths(wavelength_nm: ArrayLike) -> Array:
    """Check vacuum wavelengths in nm and return them as shape (n,)."""
    wavelengths = np.atleast_1d(np.asarray(wavelength_nm, dtype=np.float64))
    if not np.all((wavelengths >= 50) & (wavelengths <= 1e6)):
        raise OutsideValidity("wavelength", float(wavelengths[0]), "a vacuum wavelength from 50 nm to 1000000 nm")
    return wavelengths


def share_of(level: Level, line: Line, light_mhz: Array, below_mhz: float = 0.0) -> Array:
    """Compute what one line adds at n light frequencies, shape (3, n), in a0^3.

    `below_mhz` is by how much the state in question lies above its level's centroid (a ground hyperfine shift): the
    line's frequency is shorter by that.
    """
    other = line.upper if line.lower.name == level.name else line.lower
    omega_k = (signed_frequency_mhz(level, line) - below_mhz) / HARTREE_MHZ
    omega = light_mhz / HARTREE_MHZ
    dipole = line.reduced_dipole.value if line.reduced_dipole is not None else 0.0
    with np.errstate(divide="ignore"):
        near, far = 1 / (omega_k - omega), 1 / (omega_k + omega)
    if not np.all(np.isfinite(near) & np.isfinite(far)):
        raise OutsideValidity("wavelength", MHZ_NM / abs(omega_k * HARTREE_MHZ), "off resonance with every line")
    # E/h over the Hartree energy is omega in atomic units.
    weights = rank_weights(level.twice_J, other.twice_J)
    return dipole**2 * np.stack([w * (near + (-1) ** K * far) for K, w in zip(RANKS, weights, strict=True)])


def polarisability(
    level: Level,
    lines: Iterable[Line],
    wavelength_nm: ArrayLike,
    core: Quantity | None = None,
    tail: Quantity | None = None,
    below_mhz: float = 0.0,
) -> Polarisability:
    """Sum the polarisability of a level over its lines at n vacuum wavelengths (nm); see `Polarisability`."""
    wavelengths = as_wavelengths(wavelength_nm)
    light = MHZ_NM / wavelengths
    good, left_out = usable(level, lines)
    shares = []
    for line in good:
        numbers = share_of(level, line, light, below_mhz)
        dipole = line.reduced_dipole
        relative = None if dipole is None or dipole.uncertainty is None else 2 * dipole.uncertainty / dipole.value
        other = line.upper if line.lower.name == level.name else line.lower
        shares.append(Share(line, other.name, numbers, None if relative is None else np.abs(numbers) * relative))
    total = np.sum([share.numbers for share in shares], axis=0) if shares else np.zeros((3, wavelengths.size))
    variance = sum((share.uncertainty**2 for share in shares if share.uncertainty is not None), np.zeros_like(total))
    unstated = [f"strength of {share.line.name}" for share in shares if share.uncertainty is None]
    for name, constant in (("core", core), ("tail", tail)):
        if constant is not None:
            total[0] += constant.value
            if constant.uncertainty is None:
                unstated.append(name)
            else:
                variance[0] += constant.uncertainty**2
    uncertainty: Array = np.sqrt(variance)
    return Polarisability(level, wavelengths, total, uncertainty, tuple(shares), core, tail, tuple(unstated), left_out)
