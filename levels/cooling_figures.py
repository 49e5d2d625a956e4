"""The table of cooling figures: each row's formula, unit, source and where it holds.

Formulas take constants in SI units (kg, m, Hz, s-1), the slope of the component in muB/h, the dipole strengths of the
case and the setting that was asked for.
"""

import math
from collections.abc import Callable, Mapping
from dataclasses import dataclass, field

from scipy.constants import g as STANDARD_GRAVITY

from levels.constants import KB, MU_B_MHZ_PER_GAUSS, C, H
from levels.forces import (
    acceleration,
    damping_constant,
    doppler_temperature_product,
    largest_acceleration,
    scattering_rate,
    slower_field,
    spring_constant,
    stopping_distance,
)

HZ_PER_TESLA = MU_B_MHZ_PER_GAUSS * 1e10  # muB/h
TESLA_PER_METRE = 1e-2  # of one G/cm
SI_INTENSITY = 10.0  # W/m2 of one mW/cm2
Constants = Mapping[str, float]
Shares = Mapping[str, float]

TEXTBOOK = "Metcalf and van der Straten, Laser Cooling and Trapping (Springer, 1999)"
MOLASSES = "Lett et al., J. Opt. Soc. Am. B 6, 2084 (1989)"
NARROW_LIMIT = "Castin, Wallis and Dalibard, J. Opt. Soc. Am. B 6, 2046 (1989)"
NARROW_MOT = "Loftus et al., Phys. Rev. A 70, 063413 (2004)"
D_LINES = "Steck, Rubidium 87 D Line Data"
SLOWER = "Foot, Atomic Physics (Oxford, 2005), eq. 9.12"


@dataclass(frozen=True, slots=True)
class Setting:
    """What is asked for: detuning (red is negative; None is half a linewidth to the red), intensity of each beam (None
    is the component's saturation intensity), velocity along the beam, gradient, stopping distance, slower's speeds and
    detuning, and the share of the largest deceleration that the slower is designed for.
    """

    detuning_mhz: float | None = None
    intensity_mw_per_cm2: float | None = None
    velocity_m_per_s: float = 0.0
    gradient_gauss_per_cm: float = 10.0
    distance_cm: float = 1.0
    initial_speed_m_per_s: float = 300.0
    final_speed_m_per_s: float = 20.0
    slower_detuning_mhz: float = 0.0
    slower_share: float = 0.5

    def detuning_hz(self, width: float) -> float:
        """The detuning in Hz."""
        return -width / 2 if self.detuning_mhz is None else self.detuning_mhz * 1e6

    def saturation(self, saturation_intensity: float) -> float:
        """I/I_sat of one beam, for a saturation intensity in W/m2."""
        asked = self.intensity_mw_per_cm2
        return 1.0 if asked is None else asked * SI_INTENSITY / saturation_intensity


@dataclass(frozen=True, slots=True)
class Case:
    """What a line cannot have, by what a row needs, with the reason; and its dipole strengths."""

    missing: Mapping[str, str]
    shares: Shares


Value = Callable[[Constants, float, Shares, Setting], float]


@dataclass(frozen=True, slots=True)
class Row:
    """One figure: `scale` takes SI to `unit`; `needs` are checked in this order."""

    name: str
    unit: str
    scale: float
    value: Value
    formula: str
    validity: str
    source: str
    needs: tuple[str, ...] = field(default=())


@dataclass(frozen=True, slots=True)
class Figure:
    """One figure of one line; `reason` says why the value, or failing that its uncertainty, is None."""

    value: float | None
    uncertainty: float | None
    unit: str
    reason: str
    row: Row


def saturation_intensity(c: Constants, share: float) -> float:
    """Return I_sat in W/m2 for a dipole strength S: pi h c Gamma/(3 lambda^3 S) over the line's branching fraction."""
    gamma = 2 * math.pi * c["width"]
    branching = c["branching"] if "branching" in c else c["rate"] / gamma
    return math.pi * H * C * gamma / (3 * c["wavelength"] ** 3 * branching * share)


def recoil_frequency(c: Constants) -> float:
    """Return E_r/h in Hz, h/(2 m lambda^2)."""
    return H / (2 * c["mass"] * c["wavelength"] ** 2)


def _saturated(c: Constants, shares: Shares, asked: Setting) -> float:
    return asked.saturation(saturation_intensity(c, shares["component"]))


def _rate(c: Constants, slope: float, shares: Shares, asked: Setting) -> float:
    detuning = asked.detuning_hz(c["width"]) - asked.velocity_m_per_s / c["wavelength"]
    return scattering_rate(c["width"], _saturated(c, shares, asked), detuning)


def _acceleration(c: Constants, slope: float, shares: Shares, asked: Setting) -> float:
    saturation, detuning = _saturated(c, shares, asked), asked.detuning_hz(c["width"])
    return acceleration(c["mass"], c["wavelength"], c["width"], saturation, detuning, asked.velocity_m_per_s)


def _resonant(c: Constants, shares: Shares, asked: Setting) -> float:
    """The acceleration on resonance at the asked intensity."""
    return acceleration(c["mass"], c["wavelength"], c["width"], _saturated(c, shares, asked), 0.0, 0.0)


def _damping(c: Constants, shares: Shares, asked: Setting) -> float:
    return damping_constant(c["wavelength"], c["width"], _saturated(c, shares, asked), asked.detuning_hz(c["width"]))


def _spring(c: Constants, slope: float, shares: Shares, asked: Setting) -> float:
    gradient = asked.gradient_gauss_per_cm * TESLA_PER_METRE
    return spring_constant(_damping(c, shares, asked), c["wavelength"], slope * HZ_PER_TESLA, gradient)


def _trap_frequency(c: Constants, slope: float, shares: Shares, asked: Setting) -> float:
    ratio = _spring(c, slope, shares, asked) / c["mass"]
    return math.copysign(math.sqrt(abs(ratio)), ratio) / (2 * math.pi)


def _deceleration(c: Constants, asked: Setting) -> float:
    return asked.slower_share * largest_acceleration(c["mass"], c["wavelength"], c["width"])


def _slower_field(c: Constants, slope: float, asked: Setting, speed: float) -> float:
    return slower_field(c["wavelength"], slope * HZ_PER_TESLA, asked.slower_detuning_mhz * 1e6, speed)


def _slower_span(c: Constants, slope: float, asked: Setting) -> float:
    span = asked.initial_speed_m_per_s - asked.final_speed_m_per_s
    return span / (c["wavelength"] * slope * HZ_PER_TESLA)


def _slower_length(c: Constants, asked: Setting) -> float:
    return stopping_distance(asked.initial_speed_m_per_s, asked.final_speed_m_per_s, _deceleration(c, asked))


RECOIL = ("one photon", "mass", "wavelength")
WIDTH = ("width",)
SATURATION = ("dipole", "wavelength", "width", "rate")
DRIVEN = (*SATURATION, "component", "mass")
TRAP = ("neutral", *DRIVEN)
MAGNETIC = (*TRAP, "slope")
ANY = "any atom and line"
WEAK = "two-level atom; beams of s well below 1; many recoils per linewidth"
ONE_DIMENSION = "along one axis, two-level atom, small s, small velocity and displacement"

FIGURES: tuple[Row, ...] = (
    Row("recoil_velocity", "mm/s", 1e3, lambda c, g, w, a: H / (c["mass"] * c["wavelength"]),
        "h/(m lambda)", ANY, TEXTBOOK, RECOIL),
    Row("recoil_frequency", "kHz", 1e-3, lambda c, g, w, a: recoil_frequency(c),
        "E_r/h = h/(2 m lambda^2)", ANY, TEXTBOOK, RECOIL),
    Row("recoil_shift", "kHz", 1e-3, lambda c, g, w, a: 2 * recoil_frequency(c),
        "Doppler shift of one recoil: v_r/lambda = 2 E_r/h", ANY, TEXTBOOK, RECOIL),
    Row("recoil_temperature", "uK", 1e6, lambda c, g, w, a: 2 * H * recoil_frequency(c) / KB,
        "k_B T = m v_r^2 = (hbar k)^2/m = 2 E_r", "convention: rms velocity along one axis is one recoil", TEXTBOOK,
        RECOIL),
    Row("recoil_energy_temperature", "uK", 1e6, lambda c, g, w, a: H * recoil_frequency(c) / KB,
        "k_B T = E_r = (hbar k)^2/2m", "convention: half of recoil_temperature", TEXTBOOK, RECOIL),
    Row("linewidth_to_recoil", "1", 1.0, lambda c, g, w, a: c["width"] / recoil_frequency(c),
        "Gamma/(2 pi) over E_r/h", "below 4 the Doppler limit lies below the recoil temperature", NARROW_LIMIT,
        (*RECOIL, "width")),
    Row("doppler_temperature", "uK", 1e6, lambda c, g, w, a: H * c["width"] / (2 * KB),
        "k_B T = hbar Gamma/2", "at doppler_detuning, s well below 1, linewidth well above recoil_shift",
        MOLASSES, WIDTH),
    Row("doppler_detuning", "MHz", 1e-6, lambda c, g, w, a: -c["width"] / 2,
        "delta = -Gamma/2", "where the Doppler limit holds", MOLASSES, WIDTH),
    Row("doppler_velocity", "m/s", 1.0, lambda c, g, w, a: math.sqrt(H * c["width"] / (2 * c["mass"])),
        "rms along one axis: sqrt(hbar Gamma/2m)", "at the Doppler limit", MOLASSES, ("mass", "width")),
    Row("molasses_temperature", "uK", 1e6,
        lambda c, g, w, a: doppler_temperature_product(c["width"], a.detuning_hz(c["width"])) / KB,
        "k_B T = (hbar Gamma/8)(1 + 4 delta^2/Gamma^2)/|delta/Gamma|",
        "at the asked detuning, red, s well below 1; no sub-Doppler mechanism", MOLASSES, ("red", *WIDTH)),
    Row("narrow_line_temperature", "uK", 1e6,
        lambda c, g, w, a: H * c["width"] * math.sqrt(1 + _saturated(c, w, a)) / (2 * KB),
        "k_B T = hbar Gamma sqrt(1+s)/2", "narrow lines with s well above 1; never below about the recoil", NARROW_MOT,
        ("narrow", *DRIVEN)),
    Row("saturation_intensity", "mW/cm2", 1 / SI_INTENSITY,
        lambda c, g, w, a: saturation_intensity(c, w["component"]),
        "pi h c Gamma^2/(3 lambda^3 A S) of the component; pi h c Gamma/(3 lambda^3) where it cycles",
        "resonant light of the component's own polarisation", D_LINES, (*SATURATION, "component")),
    Row("saturation_intensity_isotropic", "mW/cm2", 1 / SI_INTENSITY,
        lambda c, g, w, a: saturation_intensity(c, w["isotropic"]),
        "the same with S averaged over sublevels and polarisations of F -> F'",
        "resonant light of all polarisations, atoms spread over all m of the component's F", D_LINES,
        (*SATURATION, "component")),
    Row("saturation_intensity_far_detuned", "mW/cm2", 1 / SI_INTENSITY,
        lambda c, g, w, a: saturation_intensity(c, w["far_detuned"]),
        "the same with S = (2J'+1)/(3(2J+1))",
        "pi light detuned far beyond the upper hyperfine structure; average over m_J where J is above 1/2", D_LINES,
        SATURATION),
    Row("saturation_parameter", "1", 1.0, lambda c, g, w, a: _saturated(c, w, a),
        "s = I/I_sat", "one beam", TEXTBOOK, (*SATURATION, "component")),
    Row("scattering_rate", "s-1", 1.0, _rate, "(Gamma/2) s/(1 + s + 4 (delta - v/lambda)^2/Gamma^2)",
        "one beam, two-level atom", TEXTBOOK, (*SATURATION, "component")),
    Row("largest_scattering_rate", "s-1", 1.0, lambda c, g, w, a: math.pi * c["width"],
        "Gamma/2", "two-level atom, s far above 1", TEXTBOOK, WIDTH),
    Row("force", "N", 1.0, lambda c, g, w, a: c["mass"] * _acceleration(c, g, w, a),
        "hbar k times the scattering rate", "one beam, along it", TEXTBOOK, DRIVEN),
    Row("acceleration", "m/s2", 1.0, _acceleration, "force/m", "one beam, along it", TEXTBOOK, DRIVEN),
    Row("largest_acceleration", "m/s2", 1.0,
        lambda c, g, w, a: largest_acceleration(c["mass"], c["wavelength"], c["width"]),
        "hbar k Gamma/2m", "two-level atom, s far above 1", TEXTBOOK, (*RECOIL, "width")),
    Row("acceleration_to_gravity", "1", 1.0,
        lambda c, g, w, a: largest_acceleration(c["mass"], c["wavelength"], c["width"]) / STANDARD_GRAVITY,
        "hbar k Gamma/(2 m g)", "below some 10 gravity shapes the trap", NARROW_MOT, (*RECOIL, "width")),
    Row("capture_velocity", "m/s", 1.0,
        lambda c, g, w, a: math.sqrt(2 * _resonant(c, w, a) * a.distance_cm * 1e-2),
        "sqrt(2 a d), a = (hbar k Gamma/2m) s/(1+s)",
        "estimate: the atom stays resonant over the asked distance", TEXTBOOK, TRAP),
    Row("capture_distance", "cm", 1e2,
        lambda c, g, w, a: stopping_distance(a.initial_speed_m_per_s, 0.0, _resonant(c, w, a)),
        "v^2/2a from the asked initial speed", "the same estimate", TEXTBOOK, TRAP),
    Row("molasses_velocity", "m/s", 1.0,
        lambda c, g, w, a: abs(a.detuning_hz(c["width"])) * c["wavelength"],
        "|delta| lambda", "velocity resonant with the beam it runs against: about the largest friction force", TEXTBOOK,
        ("wavelength", "width")),
    Row("damping_constant", "kg/s", 1.0, lambda c, g, w, a: _damping(c, w, a),
        "beta = -8 hbar k^2 (delta/Gamma) s/(1 + s + 4 delta^2/Gamma^2)^2", ONE_DIMENSION, TEXTBOOK, DRIVEN),
    Row("damping_rate", "s-1", 1.0, lambda c, g, w, a: _damping(c, w, a) / c["mass"],
        "beta/m: velocity decays as exp(-beta t/m)", ONE_DIMENSION, TEXTBOOK, DRIVEN),
    Row("spring_constant", "N/m", 1.0, _spring, "kappa = beta slope gradient lambda", ONE_DIMENSION, TEXTBOOK,
        MAGNETIC),
    Row("trap_frequency", "Hz", 1.0, _trap_frequency, "sqrt(kappa/m)/2 pi, negative where the force repels",
        ONE_DIMENSION, TEXTBOOK, MAGNETIC),
    Row("resonance_radius", "mm", 1e3,
        lambda c, g, w, a: abs(a.detuning_hz(c["width"])) / abs(g * HZ_PER_TESLA * a.gradient_gauss_per_cm
                                                               * TESLA_PER_METRE),
        "|delta|/(slope gradient)", "where an atom at rest is resonant", TEXTBOOK, MAGNETIC),
    Row("zeeman_slope", "MHz/G", 1e-10, lambda c, g, w, a: g * HZ_PER_TESLA,
        "(muB/h)(g_F' m' - g_F m)", "at weak field; at any field for stretched sublevels", TEXTBOOK,
        ("component", "slope")),
    Row("slower_length", "cm", 1e2, lambda c, g, w, a: _slower_length(c, a),
        "(v_i^2 - v_f^2)/2a, a = share of hbar k Gamma/2m", "constant deceleration; share 0.5 is common practice",
        SLOWER, ("neutral", "component", *RECOIL, "width")),
    Row("slower_field_span", "G", 1e4, lambda c, g, w, a: abs(_slower_span(c, g, a)),
        "h (v_i - v_f)/(lambda slope)", "whatever the detuning", SLOWER,
        ("neutral", "component", "slope", "wavelength")),
    Row("slower_field_start", "G", 1e4, lambda c, g, w, a: _slower_field(c, g, a, a.initial_speed_m_per_s),
        "(delta + v_i/lambda)/slope", "beam against the atoms, at the asked slower detuning", SLOWER,
        ("neutral", "component", "slope", "wavelength")),
    Row("slower_field_end", "G", 1e4, lambda c, g, w, a: _slower_field(c, g, a, a.final_speed_m_per_s),
        "(delta + v_f/lambda)/slope", "beam against the atoms, at the asked slower detuning", SLOWER,
        ("neutral", "component", "slope", "wavelength")),
    Row("slower_largest_gradient", "G/cm", 1e2,
        lambda c, g, w, a: _deceleration(c, a)
        / (abs(g * HZ_PER_TESLA) * c["wavelength"] * max(a.final_speed_m_per_s, 1e-3)),
        "a/(slope lambda v_f)", "at the end, where the field changes fastest", SLOWER,
        ("neutral", "component", "slope", *RECOIL, "width")),
)  # fmt: skip
