"""How often far-off light is scattered: Rayleigh and Raman rates of every sublevel of a level.

Light that shifts a sublevel i also scatters from it. With the induced dipole (Kramers and Heisenberg; Loudon, The
Quantum Theory of Light, section 8.7)

    D_q = (E0/2h) sum_o [ <f|d_q+|o><o|eps.d|i>/(D_oi - nu) + <f|eps.d|o><o|d_q+|i>/(D_of + nu) ]

the rate into f is omega_s^3 |D|^2/(3 pi eps0 hbar c^3), omega_s = omega + (E_i - E_f)/hbar. Rayleigh scattering ends
where it began (f = i); Raman scattering in another sublevel of the same level, or in another level that the book's
lines reach. The remainder of the polarisability scatters elastically. Within one level the lines' amplitudes interfere
with known signs. Ways into another level through the lines of one multiplet (same configuration and LS term in between)
interfere with the signs of LS coupling; ways through different multiplets are added without interference, since the
book has no signs for them. Neglected: natural widths beside the detunings, and two-photon processes.
"""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from levels.angular import six_j
from levels.constants import EA0, EPS0, HARTREE_MHZ, HBAR, C
from levels.lightshift import (
    QS,
    Coupled,
    Light,
    Manifold,
    check_distance,
    dipole_elements,
    manifold,
    scale_mhz2,
    solvable,
)
from levels.notation import term_quantum_numbers
from levels.partners import Partners, other_end, partners_of, signed_frequency_mhz, strength_uncertainty
from levels.records import Atom, Level, Line

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]


@dataclass(frozen=True, slots=True, eq=False)
class Scattering:
    """Rates in s-1 of each sublevel, in the order of the manifold's labels, shape (s,).

    `raman` ends in another sublevel of the same level, `elsewhere` in the other levels by name. `uncertainty` is the
    standard uncertainty of rayleigh and raman, (2, s), from the stated strengths; NaN where one is not stated. `table`
    (s, s) has the rate from the column's sublevel to the row's, within the level.
    """

    rayleigh: Array
    raman: Array
    elsewhere: dict[str, Array]
    uncertainty: Array
    table: Array
    without_interference: tuple[str, ...]

    @property
    def total(self) -> Array:
        """Everything that a sublevel scatters."""
        return self.rayleigh + self.raman + sum(self.elsewhere.values(), np.zeros_like(self.raman))


def rate_factor(light: Light, scattered_mhz: Array) -> Array:
    """Compute the rate in s-1 that a sum of one (e a0)^2 per MHz makes at scattered frequencies in MHz."""
    omega = 2e6 * np.pi * np.maximum(scattered_mhz, 0.0)
    per_dipole: Array = omega**3 * EA0**2 / (3 * np.pi * EPS0 * HBAR * C**3)
    return per_dipole * scale_mhz2(light.intensity_mw_per_cm2)


def scattering(atom: Atom, partners: Partners, here: Manifold, coupled: Sequence[Coupled], light: Light) -> Scattering:
    """Compute what every sublevel of a level scatters of one light; `here` and `coupled` are those of `couple`."""
    nu = light.frequency_mhz
    check_distance(coupled, nu)
    by_line = [amplitude(part, part, light, 1.0) for part in coupled]
    own = sum(by_line, np.zeros((3, len(here.labels), len(here.labels)), dtype=np.complex128))
    core = partners.remainder.value / HARTREE_MHZ
    own += core * np.array(light.drive)[:, None, None] * np.eye(len(here.labels))
    factor = rate_factor(light, nu + here.energy_mhz[None, :] - here.energy_mhz[:, None])
    table = factor * (np.abs(own) ** 2).sum(axis=0)
    rayleigh = np.diag(table).copy()
    elsewhere, mixed = _elsewhere(atom, here, coupled, light)
    uncertainty = _uncertainty(coupled, by_line, own, factor)
    return Scattering(rayleigh, table.sum(axis=0) - rayleigh, elsewhere, uncertainty, table, mixed)


def amplitude(first: Coupled, second: Coupled, light: Light, sign: float) -> Complex:
    """Sum over the sublevels o of one level: (q, f, i) in (e a0)^2 per MHz.

    `first` joins o to the initial level, `second` joins the same o to the final one. q is the component of the
    scattered light's dipole, d_q+ = (-1)^q d_-q.
    """
    nu = light.frequency_mhz
    absorbed = np.tensordot(np.array(light.drive), first.elements, 1) / (first.gap_mhz - nu)
    emitted = np.tensordot(np.array(light.counter_drive), second.elements, 1) / (second.gap_mhz + nu)
    total = np.empty((3, second.elements.shape[2], first.elements.shape[2]), dtype=np.complex128)
    for q in QS:
        after = second.elements[q + 1].T @ absorbed
        total[q + 1] = after + (-1) ** q * (emitted.conj().T @ first.elements[1 - q])
    return sign * total


def _uncertainty(coupled: Sequence[Coupled], by_line: Sequence[Complex], own: Complex, factor: Array) -> Array:
    """Propagate the strengths' relative uncertainties to the Rayleigh and Raman rates, (2, s)."""
    size = own.shape[1]
    variance = np.zeros((2, size))
    for part, share in zip(coupled, by_line, strict=True):
        moved = factor * 2 * (own.conj() * share).real.sum(axis=0)
        relative = strength_uncertainty(part.line)
        same = np.diag(moved)
        rows = np.stack([same, moved.sum(axis=0) - same])
        variance += np.where(rows == 0, 0.0, rows * (np.nan if relative is None else relative)) ** 2
    return np.sqrt(variance)


# Into other levels


def lande_sign(line: Line) -> int | None:
    """Return the sign of <upper||d||lower> over that of its multiplet in LS coupling; None where it is not LS.

    It is that of (-1)^(L'+S+J+1) {L' J' S; J L 1}.
    """
    if line.lower.coupling != "LS" or line.upper.coupling != "LS":
        return None
    low, up = term_quantum_numbers(line.lower.term), term_quantum_numbers(line.upper.term)
    if low["S"] != up["S"]:
        return None
    reason = abs(low["L"] - up["L"]) > 2 or low["L"] + up["L"] < 2
    symbol = 0.0 if reason else float(six_j(up["L"], line.upper.twice_J, low["S"], line.lower.twice_J, low["L"], 2))
    phase = (up["L"] + low["S"] + line.lower.twice_J + 2) // 2
    return int(np.sign(symbol)) * (-1) ** phase or None


@dataclass(frozen=True, slots=True, eq=False)
class _Way:
    """Two lines that lead from our level over another to a final one, and the key of what they interfere with."""

    first: Coupled
    second: Line
    sign: float
    key: tuple[str, ...]


def _ways(atom: Atom, level: Level, coupled: Sequence[Coupled]) -> dict[str, list[_Way]]:
    """List, for each final level, the ways there over levels that our lines reach."""
    ways: dict[str, list[_Way]] = {}
    for part in coupled:
        middle = other_end(level, part.line)
        for line in partners_of(atom, middle).lines:
            final = other_end(middle, line)
            if final.name == level.name:
                continue
            signs = lande_sign(part.line), lande_sign(line)
            sure = signs[0] is not None and signs[1] is not None
            key = (middle.configuration, middle.term) if sure and middle.configuration else (middle.name,)
            way = _Way(part, line, float(signs[0] * signs[1]) if signs[0] and signs[1] else 1.0, key)
            ways.setdefault(final.name, []).append(way)
    return ways


def _elsewhere(
    atom: Atom, here: Manifold, coupled: Sequence[Coupled], light: Light
) -> tuple[dict[str, Array], tuple[str, ...]]:
    """Compute the Raman rates into the other levels that one more line reaches; name those without interference."""
    rates: dict[str, Array] = {}
    mixed = []
    for name, ways in _ways(atom, here.level, coupled).items():
        final = other_end(other_end(here.level, ways[0].first.line), ways[0].second)
        there = manifold(solvable(final)[0], here.field_gauss)
        above = signed_frequency_mhz(here.level, ways[0].first.line) - signed_frequency_mhz(final, ways[0].second)
        scattered = light.frequency_mhz - above + here.energy_mhz[None, :] - there.energy_mhz[:, None]
        sums: dict[tuple[str, ...], Complex] = {}
        for way in ways:
            second = _onwards(way, final, there)
            sums[way.key] = sums.get(way.key, 0.0) + amplitude(way.first, second, light, way.sign)
        strength = sum(((np.abs(total) ** 2).sum(axis=0) for total in sums.values()), np.zeros_like(scattered))
        if np.all(scattered <= 0):
            continue
        rates[name] = (rate_factor(light, scattered) * strength).sum(axis=0)
        if len(sums) > 1:
            mixed.append(name)
    return rates, tuple(mixed)


def _onwards(way: _Way, final: Level, there: Manifold) -> Coupled:
    """See the second line of a way from the final level, over the very states that the first line reached."""
    middle = way.first.there
    gap = signed_frequency_mhz(final, way.second) + middle.energy_mhz[:, None] - there.energy_mhz[None, :]
    return Coupled(way.second, middle, dipole_elements(way.second, there, middle), gap)
