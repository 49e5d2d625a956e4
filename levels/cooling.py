"""What a line's light does to the motion of an atom: recoil, limits, saturation, forces, trap and slower.

Each figure is a row of a table: name, unit, formula, where it holds, where the formula stands. What a line cannot have
(saturation of a quadrupole line, a cycling component where J' is not J + 1, a slower for an ion) is None with a reason.

Saturation is s = I/I_sat = 2 Omega^2/Gamma^2. For a component of strength S (share in the decays of the upper sublevel
to the lower level) I_sat = pi h c Gamma^2/(3 lambda^3 A S), with A the line's own rate: pi h c Gamma/(3 lambda^3) for a
cycling component where nothing leaks.
"""

from collections.abc import Mapping
from dataclasses import dataclass, replace
from fractions import Fraction

import numpy as np
from numpy.typing import NDArray

from levels.angular import hyperfine_shares, line_strength
from levels.components import check_component, strength_model, zero_field_strength
from levels.constants import M_E_U
from levels.cooling_figures import FIGURES, Case, Figure, Row, Setting, recoil_frequency
from levels.errors import UnknownName
from levels.forces import acceleration, molasses_acceleration, scattering_rate, slower_field
from levels.notation import format_sublevel
from levels.propagate import propagate
from levels.quantity import Quantity, derived, in_unit
from levels.records import Atom, Line

Array = NDArray[np.float64]
Label = tuple[int, int]
LEAST_DETUNING_MHZ = 1e-9  # nearer to resonance there is no red or blue
FROM_RATE = "computed: partial rate"
NARROW = 4.0  # recoil frequencies: below it the Doppler limit is below the recoil temperature


@dataclass(frozen=True, slots=True)
class Cooling:
    """Every figure of a line by name, the component they are about (None without one) and remarks on the regime."""

    line: Line
    component: tuple[Label, Label] | None
    setting: Setting
    figures: Mapping[str, Figure]
    regime: str
    notes: tuple[str, ...]
    used: tuple[tuple[str, Quantity], ...]
    constants: Mapping[str, float]

    @property
    def slope_hz_per_tesla(self) -> float:
        """The slope of the component, zero where it is not known."""
        return (self.figures["zeeman_slope"].value or 0.0) * 1e10


@dataclass(frozen=True, slots=True, eq=False)
class Curve:
    """Scattering rate of one beam and accelerations, against detuning, intensity or velocity; shape (n,) each."""

    detuning_mhz: Array
    intensity_mw_per_cm2: Array
    velocity_m_per_s: Array
    scattering_rate_per_s: Array
    acceleration_m_per_s2: Array
    molasses_acceleration_m_per_s2: Array


@dataclass(frozen=True, slots=True, eq=False)
class Profile:
    """A slower along its way: position from its start, speed and field of the resonant atom; shape (n,) each."""

    position_cm: Array
    speed_m_per_s: Array
    field_gauss: Array


def cycling_component(line: Line) -> tuple[Label, Label] | None:
    """Return the stretched component (2F, 2m), (2F', 2m') of a line with J' = J + 1, driven by sigma+; else None."""
    if line.upper.twice_J != line.lower.twice_J + 2 or strength_model(line) != "J" or line.rank != 1:
        return None
    low, up = line.lower.twice_J + line.lower.twice_I, line.upper.twice_J + line.upper.twice_I
    return (low, low), (up, up)


def constants_of_line(atom: Atom, line: Line) -> tuple[dict[str, Quantity], dict[str, str], tuple[str, ...]]:
    """Collect what the figures are made of, in SI units; what is missing with its reason; and notes."""
    found: dict[str, Quantity] = {}
    notes = []
    if atom.isotope.mass is not None:
        mass = atom.isotope.mass
        bare = replace(mass, value=mass.value - atom.isotope.charge * M_E_U, text=mass.text)
        found["mass"] = in_unit(bare, "kg")
    wavelength = line.wavelength
    if wavelength is None and line.nominal_nm > 0:
        wavelength = derived(line.nominal_nm, None, "nm", "nominal wavelength")
        notes.append(f"the frequency of {line.name} is not in the catalogue: its nominal wavelength is used")
    if wavelength is not None:
        found["wavelength"] = in_unit(wavelength, "m")
    if line.upper.width is not None:
        found["width"] = in_unit(line.upper.width, "Hz")
    found.update(_share_of_decays(line))
    names = {"mass": "mass", "wavelength": "wavelength", "width": "width of the upper level"}
    missing = {key: f"the {name} is not in the catalogue" for key, name in names.items() if key not in found}
    if not found.keys() & {"rate", "branching"}:
        missing["rate"] = "neither Einstein A nor branching fraction is in the catalogue"
    return found, missing, tuple(notes)


def _share_of_decays(line: Line) -> dict[str, Quantity]:
    """Return the branching fraction, or the rate where that is what was published: each uncertainty enters once.

    A rate that is larger than the upper level's whole rate, from another publication, is taken as all of it.
    """
    fraction, rate = line.branching, line.einstein_A
    if fraction is not None and fraction.value > 1:
        return {"branching": replace(in_unit(fraction, "1"), value=1.0)}
    if fraction is not None and not (rate is not None and fraction.note.startswith(FROM_RATE)):
        exact = fraction.value == 1 and fraction.evidence == "computed"
        return {"branching": replace(fraction, uncertainty=0.0) if exact else in_unit(fraction, "1")}
    return {} if rate is None else {"rate": in_unit(rate, "s-1")}


def slope_constants(line: Line, component: tuple[Label, Label]) -> tuple[dict[str, Quantity], dict[str, float], str]:
    """Return the g factors that make a component's slope at weak field, their weights in it, and what is missing."""
    found: dict[str, Quantity] = {}
    weights: dict[str, float] = {}
    for sign, level, (F, m) in ((-1, line.lower, component[0]), (1, line.upper, component[1])):
        shares = hyperfine_shares(F, level.twice_J, level.twice_I)
        for name, constant, share in zip(("g_J", "g_I"), (level.g_J, level.g_I), shares, strict=True):
            weight = sign * float(share) * m / 2
            if not weight:
                continue
            if constant is None:
                return {}, {}, f"{name} of {level.name} is not in the catalogue"
            key = next((k for k, held in found.items() if held == constant), f"{name} of {level.name}")
            found[key] = constant
            weights[key] = weights.get(key, 0.0) + weight
    return found, weights, ""


def isotropic_share(line: Line, component: tuple[Label, Label]) -> Fraction:
    """Return the dipole strength of F -> F' averaged over sublevels and polarisations, relative to S = 1."""
    (F, _), (F_up, _) = component
    returned = line_strength(line.upper.twice_J, line.lower.twice_J, line.lower.twice_I, F_up, F, line.rank)
    return returned * Fraction(F_up + 1, 3 * (F + 1))


def far_detuned_share(line: Line) -> Fraction:
    """Return the dipole strength for pi light far off the hyperfine structure: the average over m_J."""
    return Fraction(line.upper.twice_J + 1, 3 * (line.lower.twice_J + 1))


def _check(line: Line, component: tuple[Label, Label]) -> None:
    for level, (F, m) in zip((line.lower, line.upper), component, strict=True):
        if not abs(level.twice_J - level.twice_I) <= F <= level.twice_J + level.twice_I or abs(m) > F:
            raise UnknownName("sublevel", format_sublevel(F, m), hint=f"{level.name} has no such sublevel")
        if (F - level.twice_J - level.twice_I) % 2:
            raise UnknownName("sublevel", format_sublevel(F, m), hint=f"{level.name} has no such F")
    check_component(line, *component)


def cooling(
    atom: Atom, line: Line, setting: Setting | None = None, component: tuple[Label, Label] | None = None
) -> Cooling:
    """Work out every figure of a line; of the cycling component where no other is named."""
    setting = setting or Setting()
    if component is not None:
        _check(line, component)
    component = component or cycling_component(line)
    constants, missing, notes = constants_of_line(atom, line)
    case = _case(atom, line, component, missing, setting)
    g_factors, weights, no_slope = slope_constants(line, component) if component else ({}, {}, "")
    if no_slope or not any(weights.values()):
        case = replace(
            case, missing={**case.missing, "slope": no_slope or "the component does not move with the field"}
        )
    ratio = _linewidth_to_recoil(constants)
    regime = "" if ratio is None else "narrow" if ratio < NARROW else "broad"
    if regime != "narrow":
        case = replace(case, missing={**case.missing, "narrow": "the line is not narrow"})
    inputs = {**constants, **g_factors}
    figures = {row.name: _figure(row, case, setting, inputs, weights) for row in FIGURES}
    if regime == "narrow" and ratio is not None:
        notes = (
            *notes,
            f"narrow line: the linewidth is {ratio:.3g} recoil frequencies, so that single photons move an atom out of "
            "resonance; the Doppler limit lies below the recoil temperature and is not reached",
        )
    used = tuple((f"{name} of {line.name}" if name in constants else name, value) for name, value in inputs.items())
    numbers = {name: quantity.value for name, quantity in constants.items()}
    return Cooling(line, component, setting, figures, regime, notes, used, numbers)


def force_curve(found: Cooling, against: str, values: Array) -> Curve | None:
    """Compute rate and accelerations against "detuning" (MHz), "intensity" (mW/cm2) or "velocity" (m/s).

    The other two are those of the setting. None where the figures have no force.
    """
    saturation = found.figures["saturation_intensity"].value
    if found.figures["force"].value is None or saturation is None:
        return None
    c, asked, one = found.constants, found.setting, np.ones_like(values)
    held = {
        "detuning": asked.detuning_hz(c["width"]) * 1e-6 * one,
        "intensity": (saturation if asked.intensity_mw_per_cm2 is None else asked.intensity_mw_per_cm2) * one,
        "velocity": asked.velocity_m_per_s * one,
        against: values * one,
    }
    s, detuning, velocity = held["intensity"] / saturation, held["detuning"] * 1e6, held["velocity"]
    atom = (c["mass"], c["wavelength"], c["width"], s, detuning, velocity)
    return Curve(
        held["detuning"],
        held["intensity"],
        velocity,
        scattering_rate(c["width"], s, detuning - velocity / c["wavelength"]),
        acceleration(*atom),
        molasses_acceleration(*atom),
    )


def slower_profile(found: Cooling, points: int) -> Profile | None:
    """Compute the field of a slower of constant deceleration at equally spaced positions; None where there is none."""
    length = found.figures["slower_length"].value
    if length is None or found.figures["slower_field_span"].value is None:
        return None
    asked, c = found.setting, found.constants
    position: Array = np.linspace(0.0, length, points)
    squares = asked.initial_speed_m_per_s**2 + (asked.final_speed_m_per_s**2 - asked.initial_speed_m_per_s**2) * (
        position / length
    )
    speed = np.sqrt(np.maximum(squares, 0.0))
    field = slower_field(c["wavelength"], found.slope_hz_per_tesla, asked.slower_detuning_mhz * 1e6, speed)
    return Profile(position, speed, field * 1e4)


def _linewidth_to_recoil(constants: Mapping[str, Quantity]) -> float | None:
    values = {name: quantity.value for name, quantity in constants.items()}
    known = {"mass", "wavelength", "width"} <= values.keys()
    return values["width"] / recoil_frequency(values) if known else None


def _case(
    atom: Atom, line: Line, component: tuple[Label, Label] | None, missing: dict[str, str], setting: Setting
) -> Case:
    """Say what kind of line this is: the strengths that enter, and what it cannot have, each with its reason."""
    reasons = dict(missing)
    if line.multipole != "E1" or line.photons != 1 or line.induced or strength_model(line) != "J":
        reasons["dipole"] = "defined here for electric-dipole lines of one photon"
    if setting.detuning_mhz is not None and setting.detuning_mhz > -LEAST_DETUNING_MHZ:
        reasons["red"] = "only red detuning (below zero) cools here"
    if component is None:
        reasons["component"] = "the line has no cycling component (J' is not J + 1): name lower and upper"
    if atom.isotope.charge:
        reasons["neutral"] = "an ion is held and slowed by electric fields"
    if line.photons != 1:
        reasons["one photon"] = "the recoil of several photons depends on their directions"
    shares = {"far_detuned": float(far_detuned_share(line))}
    if component is not None and "dipole" not in reasons:
        shares["component"] = float(zero_field_strength(line, *component))
        shares["isotropic"] = float(isotropic_share(line, component))
        if not shares["component"]:
            reasons["component"] = "this component has no strength at zero field"
    return Case(reasons, shares)


def _figure(
    row: Row, case: Case, setting: Setting, inputs: Mapping[str, Quantity], weights: Mapping[str, float]
) -> Figure:
    reason = next((case.missing[need] for need in row.needs if need in case.missing), "")
    if reason:
        return Figure(None, None, row.unit, reason, row)

    def value(given: Mapping[str, float]) -> float:
        slope = sum(weight * given[name] for name, weight in weights.items())
        return row.value(given, slope, case.shares, setting) * row.scale

    estimate = propagate(value, inputs)
    lacking = f"no uncertainty is stated of: {', '.join(estimate.lacking)}" if estimate.lacking else ""
    return Figure(estimate.value, estimate.uncertainty, row.unit, lacking, row)
