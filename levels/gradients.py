"""Polarisation-gradient cooling: whether it can work on a line, how deep the light shifts are, how cold it may get.

Two waves run against each other along z with orthogonal polarisations: linear across linear, whose sum changes from
linear to circular over an eighth of a wavelength, or sigma+ against sigma-, whose sum is linear everywhere and turns.
The light shift operator of one lower hyperfine level F is

    S(z) = sum over upper states |u>: Omega_u^+(z) Omega_u(z) Delta_u/(4 Delta_u^2 + Gamma^2),

with every F' at its own detuning and no field; its eigenvalues along z are the potentials. Low saturation is assumed.

Temperatures are those of Dalibard and Cohen-Tannoudji, J. Opt. Soc. Am. B 6, 2023 (1989), with Omega the Rabi frequency
of one wave for a component of unit strength:

    lin perp lin, J = 1/2 - 3/2:  kB T = hbar Omega^2/(8 |delta|)                    for |delta| well above Gamma
    sigma+ sigma-, J = 1 - 2:     kB T = (hbar Omega^2/|delta|) [29/300 + (254/75) (Gamma^2/4)/(delta^2 + Gamma^2/4)]

Other F are estimated by the same formulae, and the answer says so.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from levels.angular import hyperfine_shares
from levels.beams import offset_of_hyperfine, reference_rabi_mhz
from levels.constants import KB, MU_B_MHZ_PER_GAUSS, C, H, U
from levels.decays import driven_decay, frequency_mhz_of
from levels.errors import OutsideValidity
from levels.notation import format_half
from levels.quantity import in_unit
from levels.records import Atom, Line
from levels.structure import Structure, structure_of
from levels.sublevels import constants_of

Array = NDArray[np.float64]
Complex = NDArray[np.complex128]
CONFIGURATIONS = ("lin-perp-lin", "sigma+sigma-")
STEPS = 96  # over half a wavelength
UK_PER_MHZ = H * 1e6 / KB * 1e6
LOW_SATURATION = 0.1
FEWEST_RECOILS = 2.0  # kB T in recoil energies hbar^2 k^2/2m that even the coldest clouds need


@dataclass(frozen=True, slots=True, eq=False)
class GradientCheck:
    """What polarisation gradients can do on one hyperfine component.

    `works` is False with the reason in `reasons`. `depth_mhz` is how far a stretched sublevel's potential goes up and
    down along z (the U0 of the literature; zero for sigma+ against sigma-), `spread_mhz` the largest difference of
    light shifts at one place. `temperature_uk` is the formula's value, `lowest_uk` that of `FEWEST_RECOILS`,
    `largest_field_gauss` the field whose Larmor frequency equals the spread. Numbers that do not exist are None.
    """

    configuration: str
    works: bool
    reasons: tuple[str, ...]
    depth_mhz: float
    spread_mhz: float
    saturation: float
    temperature_uk: float | None
    lowest_uk: float | None
    largest_field_gauss: float | None
    cautions: tuple[str, ...]

    @property
    def depth_uk(self) -> float:
        """The depth as a temperature."""
        return self.depth_mhz * UK_PER_MHZ


def wave(configuration: str, phase: float) -> Complex:
    """Return the spherical amplitudes (q = -1, 0, 1) of both waves together, each of unit amplitude, at k z = phase."""
    forward, back = np.exp(1j * phase), np.exp(-1j * phase)
    minus, plus = np.array([1, -1j]) / np.sqrt(2), np.array([-1, -1j]) / np.sqrt(2)  # e_q in x, y
    if configuration == "lin-perp-lin":
        field = np.array([forward, back])
    elif configuration == "sigma+sigma-":
        field = forward * plus + back * minus
    else:
        raise OutsideValidity("configuration", configuration, f"one of {', '.join(CONFIGURATIONS)}")
    return np.array([minus.conj() @ field, 0.0, plus.conj() @ field], dtype=np.complex128)


def potentials(
    structure: Structure, line: Line, twice_F: int, offset_mhz: float, rabi_mhz: float, configuration: str
) -> Array:
    """Compute the light shifts in MHz along half a wavelength, shape (places, sublevels), rising at each place.

    `rabi_mhz` is the reference Rabi frequency of one wave; the structure is that of no field.
    """
    lower, upper = structure.slice_of(line.lower), structure.slice_of(line.upper)
    inside = structure.twice_F[lower] == twice_F
    amplitude = structure.amplitudes[line.name][:, inside]
    q = (structure.twice_m[upper][:, None] - structure.twice_m[lower][inside][None, :]) // 2
    energy = structure.energy_mhz[upper] - structure.energy_mhz[lower][inside][0]
    detuning = offset_mhz - energy
    weight = detuning / (4 * detuning**2 + structure.width_mhz[upper] ** 2)
    found = []
    for phase in np.linspace(0.0, np.pi, STEPS, endpoint=False):
        light = wave(configuration, float(phase))
        rabi = rabi_mhz * np.where(np.abs(q) <= 1, light[np.clip(q, -1, 1) + 1], 0.0) * amplitude
        found.append(np.linalg.eigvalsh(rabi.conj().T @ (weight[:, None] * rabi)))
    return np.array(found)


def check_gradients(
    atom: Atom,
    line: Line,
    component: tuple[int, int],
    detuning_mhz: float,
    intensity_mw_per_cm2: float,
    configuration: str,
) -> GradientCheck:
    """Check polarisation-gradient cooling on a component (doubled F, F'); detuning from it, intensity of one wave."""
    if not np.isfinite(detuning_mhz) or detuning_mhz == 0.0:
        raise OutsideValidity("detuning", detuning_mhz, "a number of MHz different from zero")
    if line.multipole != "E1":
        raise OutsideValidity("line", line.name, "an electric-dipole line")
    twice_F, twice_F_up = component
    decay = driven_decay(atom, line)
    offset = offset_of_hyperfine(line, twice_F, twice_F_up, detuning_mhz)
    rabi = reference_rabi_mhz(line, decay, intensity_mw_per_cm2)
    shifts = potentials(structure_of(atom, [line], 0.0), line, twice_F, offset, rabi, configuration)
    modulated = float(np.ptp(shifts, axis=0).max()) > 1e-9 * float(np.abs(shifts).max())
    spread = float((shifts[:, -1] - shifts[:, 0]).max())
    reasons = _obstacles(line, twice_F, twice_F_up, detuning_mhz, configuration)
    saturation = 2 * rabi**2 / (decay.width_mhz**2 + 4 * detuning_mhz**2)
    temperature = None
    if not reasons and twice_F_up > twice_F:
        temperature = _temperature_uk(configuration, rabi, detuning_mhz, decay.width_mhz)
    g_F = _g_factor(line, twice_F)
    return GradientCheck(
        configuration,
        not reasons,
        reasons,
        float(np.ptp(shifts)) if modulated else 0.0,
        spread,
        saturation,
        temperature,
        _lowest_uk(atom, line) if not reasons else None,
        spread / (abs(g_F) * MU_B_MHZ_PER_GAUSS) if g_F and spread > 0 else None,
        _cautions(line, component, detuning_mhz, saturation, decay.width_mhz, configuration),
    )


def _obstacles(line: Line, twice_F: int, twice_F_up: int, detuning_mhz: float, configuration: str) -> tuple[str, ...]:
    """Say what rules sub-Doppler cooling out, or nothing."""
    reasons = []
    smallest = 1 if configuration == "lin-perp-lin" else 2
    if twice_F < smallest:
        need = format_half(smallest)
        reasons.append(f"F = {format_half(twice_F)} has too few sublevels: {configuration} needs F of {need} or more")
    if twice_F_up > twice_F and detuning_mhz > 0:
        reasons.append("F -> F + 1 cools below the Doppler limit with red detuning only")
    if twice_F_up <= twice_F and detuning_mhz < 0:
        reasons.append("F -> F and F -> F - 1 cool below the Doppler limit with blue detuning only (gray molasses)")
    return tuple(reasons)


def _temperature_uk(configuration: str, rabi_mhz: float, detuning_mhz: float, width_mhz: float) -> float:
    scale = rabi_mhz**2 / abs(detuning_mhz) * UK_PER_MHZ
    if configuration == "lin-perp-lin":
        return scale / 8
    quarter = width_mhz**2 / 4
    return scale * (29 / 300 + 254 / 75 * quarter / (detuning_mhz**2 + quarter))


def _lowest_uk(atom: Atom, line: Line) -> float | None:
    mass = atom.isotope.mass
    if mass is None:
        return None
    momentum = H * frequency_mhz_of(line) * 1e6 / C
    return float(FEWEST_RECOILS * momentum**2 / (2 * in_unit(mass, "u").value * U) / KB * 1e6)


def _g_factor(line: Line, twice_F: int) -> float:
    constants = constants_of(line.lower)
    of_J, of_I = hyperfine_shares(twice_F, constants.twice_J, constants.twice_I)
    return float(of_J) * constants.g_J + float(of_I) * constants.g_I


def _cautions(
    line: Line, component: tuple[int, int], detuning_mhz: float, saturation: float, width_mhz: float, configuration: str
) -> tuple[str, ...]:
    """Say where the estimates stop."""
    found = []
    textbook = (1, 3) if configuration == "lin-perp-lin" else (2, 4)
    if component[1] <= component[0]:
        found.append(
            "no closed formula gives the temperature of gray molasses; a few recoil energies are common practice"
        )
    elif component != textbook:
        found.append(
            f"the temperature formula is that of F = {format_half(textbook[0])} -> {format_half(textbook[1])};"
            " for other F it is an estimate within a factor of about two (common practice)"
        )
    if saturation > LOW_SATURATION:
        found.append(f"saturation {saturation:.2g} per wave: the formulae hold for low saturation")
    if abs(detuning_mhz) < 3 * width_mhz:
        found.append("the detuning is below three natural widths, where the formulae begin to fail")
    neighbour = _nearest_neighbour(line, component)
    if neighbour is not None and abs(detuning_mhz) > 0.2 * neighbour:
        found.append(f"the next upper hyperfine level is {neighbour:.4g} MHz away and comparable with the detuning")
    return tuple(found)


def _nearest_neighbour(line: Line, component: tuple[int, int]) -> float | None:
    """Return the distance in MHz of the nearest other upper F that the lower F reaches."""
    twice_F, twice_F_up = component
    twice_J, twice_I = line.upper.twice_J, line.upper.twice_I
    here = offset_of_hyperfine(line, twice_F, twice_F_up)
    others = [
        abs(offset_of_hyperfine(line, twice_F, other) - here)
        for other in range(abs(twice_J - twice_I), twice_J + twice_I + 1, 2)
        if other != twice_F_up and abs(other - twice_F) <= 2
    ]
    return min(others, default=None)
