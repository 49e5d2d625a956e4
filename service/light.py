"""What questions about light share: wavelength, beam and polarisation, and what their answers rest on and leave out."""

from collections.abc import Iterable, Mapping
from math import isnan
from typing import Annotated, Any

from pydantic import Field

from levels.errors import NotPublished
from levels.lightshift import LARGEST_INTENSITY, solvable
from levels.notation import format_polarisation
from levels.partners import Doubt, Partners, other_end, partners_of
from levels.polarisability import LONGEST_NM, SHORTEST_NM
from levels.setting import Setting, make_setting
from service.answers import Used, scalar
from service.context import Context
from service.inputs import level_inputs
from service.parameters import NUMBER_OR_TEXT, FieldGauss, PolarisationName, measure
from service.problems import Problem
from service.question import Computed
from service.schemas import Scalar, Shape, Texts

Wavelength = Annotated[float, measure("length", "nm", SHORTEST_NM, LONGEST_NM), NUMBER_OR_TEXT]
BeamAngle = Annotated[float, measure("angle", "deg", 0.0, 180.0), NUMBER_OR_TEXT]
Ellipticity = Annotated[float, measure("angle", "deg", -45.0, 45.0), NUMBER_OR_TEXT]
Azimuth = Annotated[float, measure("angle", "deg", -360.0, 360.0), NUMBER_OR_TEXT]
Intensity = Annotated[float, measure("intensity", "mW/cm2", 0.0, LARGEST_INTENSITY), NUMBER_OR_TEXT]
Power = Annotated[float, measure("power", "mW", 0.0, 1e8), NUMBER_OR_TEXT]
Waist = Annotated[float, measure("length", "um", 0.1, 1e5), NUMBER_OR_TEXT]
NAMED = {1: (0.0, 45.0), 0: (90.0, 0.0), -1: (0.0, -45.0)}  # beam angle and ellipticity of each polarisation
ANGLES = ("beam_angle", "ellipticity", "azimuth")
A03 = "a0^3"


class PolarisedAsked(Computed):
    """One beam's direction and polarisation, and the field that it refers to."""

    beam_angle: BeamAngle = Field(90.0, description="angle between the beam and the field's axis z, in degrees")
    ellipticity: Ellipticity = Field(
        0.0, description="from -45 (helicity -1) through 0 (linear) to 45 degrees (helicity +1)"
    )
    azimuth: Azimuth = Field(
        0.0, description="angle of the long axis from the plane of beam and field, in degrees; 0 and linear is pi light"
    )
    polarisation: PolarisationName | None = Field(
        None, description="sigma+, pi or sigma- instead of the three angles", examples=["pi"]
    )
    field: FieldGauss = Field(0.0, description="magnetic field along z, in gauss or with a unit", examples=["1"])


class LightAsked(PolarisedAsked):
    """One light."""

    wavelength: Wavelength = Field(description="vacuum wavelength, in nm or with a unit", examples=["1064"])


class Fractions(Shape):
    """How the light's intensity is shared among the polarisations along the field."""

    sigma_minus: float
    pi: float
    sigma_plus: float


class LeftOut(Shape):
    """What a sum over lines leaves out."""

    level: str
    lines: Texts = Field(description="lines of the catalogue without a strength or a frequency")
    remainder: Scalar = Field(
        description="scalar polarisability beyond the lines, at zero frequency: core and higher levels"
    )
    remainder_of: str = Field(description="static: the whole static value less the lines; else what is published of it")
    complete: bool = Field(description="whether what the lines leave out is known")


def setting_of(asked: PolarisedAsked, wavelength_nm: float) -> Setting:
    """The light and field that were asked for."""
    angle, ellipticity, azimuth = asked.beam_angle, asked.ellipticity, asked.azimuth
    if asked.polarisation is not None:
        given = [name for name in ANGLES if getattr(asked, name) != PolarisedAsked.model_fields[name].default]
        if given:
            detail = f"polarisation says it all: leave out {' and '.join(given)}"
            named = format_polarisation(asked.polarisation)
            raise Problem(
                "invalid-parameter", detail, parameter="polarisation", given=named, allowed="one or the other"
            )
        (angle, ellipticity), azimuth = NAMED[asked.polarisation], 0.0
    return make_setting(wavelength_nm, angle, ellipticity, azimuth, asked.field)


def partners(context: Context, atom: str, level: str) -> Partners:
    """A level with its lines, of which at least one has a strength; or a remainder."""
    found = partners_of(context.atom(atom), context.level(atom, level))
    if not found.lines and not found.remainder.inputs:
        names = ", ".join(line.name for line in found.left_out) or "any electric-dipole line"
        hint = "light shifts are summed over lines; a lab overlay can supply strengths"
        raise NotPublished(f"the strength of {names}", f"{found.level.atom} {found.level.name}", hint)
    return found


def light_inputs(*sides: Partners) -> Used:
    """Every curated constant that light shifts of these levels rest on."""
    used: dict[str, Any] = {}
    for side in sides:
        used.update(level_inputs(side.level))
        for line in side.lines:
            named = ((f"strength of {line.name}", line.reduced_dipole), (f"frequency of {line.name}", line.centroid))
            used.update((name, value) for name, value in named if value is not None)
            used.update(level_inputs(other_end(side.level, line)))
        used.update(side.remainder.inputs)
    return list(used.items())


def light_warnings(*sides: Partners) -> list[str]:
    """What the sums leave out, and which structure they do not know."""
    texts = []
    for side in sides:
        name = side.level.name
        if side.left_out:
            lines = ", ".join(line.name for line in side.left_out)
            held = "they are within the remainder" if side.remainder.anchored else "they are not in the sum"
            texts.append(f"the strength of {lines} from {name} is not in the catalogue: {held}")
        if not side.complete:
            texts.append(f"what the lines of {name} leave out is not known: shifts have no uncertainty")
        for line in side.lines:
            other, missing = solvable(other_end(side.level, line))
            if missing:
                lacking = " and ".join(missing)
                texts.append(
                    f"{lacking} of {other.name} not in the catalogue and taken as zero: matters near {line.name}"
                )
    return list(dict.fromkeys(texts))


def left_out(side: Partners) -> dict[str, Any]:
    """The record of what a sum leaves out."""
    rest = side.remainder
    kind = "static" if rest.anchored else " and ".join(name.partition(" ")[0] for name, _ in rest.inputs)
    reason = "" if rest.uncertainty is not None else "not all of it is in the catalogue with its uncertainty"
    return {
        "level": side.level.name,
        "lines": [line.name for line in side.left_out],
        "remainder": scalar(rest.value, rest.uncertainty, A03, reason),
        "remainder_of": kind or "nothing",
        "complete": side.complete,
    }


def doubted(value: float, doubt: Doubt, unit: str, at: int = 0, scale: float = 1.0) -> dict[str, Any]:
    """A number with its uncertainty, or null and why it has none; `scale` takes the doubt into the number's unit."""
    if isnan(value):
        return scalar(None, None, unit, "the light is within a line, where the formula stops")
    spread, stated = float(doubt.uncertainty[at]) * scale, float(doubt.stated[at]) * scale
    if isnan(spread):
        return scalar(value, None, unit, f"{'; '.join(doubt.reasons)}; the other inputs make {stated:.2g} {unit}")
    return scalar(value, spread, unit)


def excludes_of(doubts: Iterable[Doubt]) -> list[str]:
    """The inputs without a stated uncertainty that matter."""
    return list(dict.fromkeys(name for doubt in doubts for name in doubt.excludes))


def fractions_of(setting: Setting) -> Mapping[str, float]:
    """The record of the fractions along the field."""
    minus, none, plus = (max(0.0, float(part)) for part in setting.fractions)
    return {"sigma_minus": minus, "pi": none, "sigma_plus": plus}
