"""How questions describe a magnetic field and the laser beams in it: everything a laboratory may say, in its own units.

Where a thing can be said in several ways exactly one is given; the library refuses others by name (`levels.setup`).
"""

from typing import Annotated, Any, Literal

from pydantic import BeforeValidator, Field, PlainSerializer, WithJsonSchema
from pydantic import Strict as StrictNumber

from levels.beams import LARGEST_INTENSITY, LARGEST_OFFSET_MHZ
from levels.driven import LARGEST_BEAMS
from levels.errors import OutsideValidity
from levels.notation import format_half, parse_component, shown
from service.parameters import NUMBER_OR_TEXT, FieldGauss, Name, PolarisationName, Sublevel, measure
from service.question import Computed, Strict

MOST_PLATES = 10
MOST_SHARES = 400
Number = Annotated[float, StrictNumber(), Field(allow_inf_nan=False)]
Degrees = Annotated[float, measure("angle", "deg", -36000.0, 36000.0), NUMBER_OR_TEXT]
Megahertz = Annotated[float, measure("frequency", "MHz", -LARGEST_OFFSET_MHZ, LARGEST_OFFSET_MHZ), NUMBER_OR_TEXT]
Terahertz = Annotated[float, measure("frequency", "THz", 1e-9, 1e5), NUMBER_OR_TEXT]
Intensity = Annotated[float, measure("intensity", "mW/cm2", 0.0, LARGEST_INTENSITY), NUMBER_OR_TEXT]
Milliwatts = Annotated[float, measure("power", "mW", 0.0, LARGEST_INTENSITY), NUMBER_OR_TEXT]
Millimetres = Annotated[float, measure("length", "mm", 1e-4, 1e5), NUMBER_OR_TEXT]
Triple = Annotated[list[Number], Field(min_length=3, max_length=3)]


def _amplitude(given: Any) -> complex:
    parts = given if isinstance(given, (list, tuple)) else (given, 0.0)
    if len(parts) != 2 or any(isinstance(part, bool) or not isinstance(part, (int, float)) for part in parts):
        raise OutsideValidity("amplitude", shown(str(given)), "a number, or [real, imaginary]")
    return complex(*parts)


def _component(given: Any) -> tuple[int, int]:
    if not isinstance(given, str):
        raise OutsideValidity("component", shown(str(given)), "lower F and upper F such as 2-3")
    return parse_component(given)


def as_field(given: Any) -> Any:
    """A list of three numbers as the vector that it is short for."""
    return {"vector": given} if isinstance(given, list) else given


Amplitude = Annotated[
    complex,
    BeforeValidator(_amplitude),
    PlainSerializer(lambda z: [z.real, z.imag], return_type=list[float]),
    WithJsonSchema(
        {"anyOf": [{"type": "number"}, {"type": "array", "items": {"type": "number"}, "minItems": 2, "maxItems": 2}]}
    ),
]
Component = Annotated[
    tuple[int, int],
    BeforeValidator(_component),
    PlainSerializer(lambda pair: f"{format_half(pair[0])}-{format_half(pair[1])}", return_type=str),
    WithJsonSchema({"type": "string", "description": "lower F and upper F without field, as `2-3` or `3/2-1/2`"}),
]


class FieldVector(Strict):
    """A field in the laboratory frame: three components, or size and direction. A list of three is its components."""

    vector: Annotated[list[FieldGauss], Field(min_length=3, max_length=3)] | None = Field(
        None, description="x, y and z in gauss or with a unit"
    )
    magnitude: FieldGauss | None = Field(None, description="size in gauss or with a unit, with `polar` and `azimuth`")
    polar: Degrees = Field(0.0, description="angle from z, in degrees or with a unit")
    azimuth: Degrees = Field(0.0, description="angle around z, from x towards y")


class Plate(Strict):
    """A wave plate that the light passes."""

    kind: Literal["half", "quarter", "full"] | None = Field(None, description="its retardance, or `waves`")
    waves: Number | None = Field(None, ge=-100, le=100, description="retardance in waves, 0.25 for a quarter")
    angle: Degrees = Field(description="fast axis, from the first transverse axis")


class Polarisation(Strict):
    """A beam's polarisation, in exactly one of the ways: `jones`, `vector`, `linear`, `ellipticity`, `handedness`,
    `polariser` with `plates`, or `best_for`. Angles count from the first transverse axis, counter-clockwise for someone
    who looks into the beam; that axis is the laboratory z made perpendicular to the beam (x for a beam along z)."""

    jones: Annotated[list[Amplitude], Field(min_length=2, max_length=2)] | None = Field(
        None, description="amplitudes on the two transverse axes, each a number or [real, imaginary]"
    )
    vector: Annotated[list[Amplitude], Field(min_length=3, max_length=3)] | None = Field(
        None, description="amplitudes along the laboratory x, y and z, perpendicular to the beam"
    )
    linear: Degrees | None = Field(None, description="angle of linear polarisation")
    ellipticity: Degrees | None = Field(
        None, description="from -45 (helicity -1) through 0 (linear) to 45 degrees (helicity +1), with `azimuth`"
    )
    azimuth: Degrees = Field(0.0, description="long axis of the ellipse")
    handedness: Literal["right", "left"] | None = Field(None, description="circular light, by `convention`")
    convention: Literal["helicity", "optics"] = Field(
        "helicity",
        description="`helicity`: right-handed light carries spin along the beam; `optics`: the opposite, as most optics"
        " texts have it (looking into the beam, right turns clockwise)",
    )
    polariser: Degrees | None = Field(None, description="angle of a linear polariser, then the wave plates")
    plates: list[Plate] = Field([], max_length=MOST_PLATES, description="wave plates after the polariser, in order")
    best_for: PolarisationName | None = Field(
        None, description="the light that drives sigma+, pi or sigma- best in this direction"
    )
    impurity: Number = Field(0.0, ge=0, le=1, description="share of the intensity in the orthogonal polarisation")
    phase: Degrees = Field(0.0, description="phase of the impurity")
    reference: Triple | None = Field(None, description="vector to lay the first transverse axis by, instead of z")


class Aimed(Strict):
    """Direction and polarisation of a beam."""

    name: Name = Field(description="what answers call this beam")
    direction: Triple | None = Field(None, description="laboratory vector that the light runs along; any length")
    angle_to_field: Degrees | None = Field(None, description="instead: angle between beam and field")
    around_field: Degrees = Field(0.0, description="with it: azimuth around the field")
    polarisation: Polarisation


class BeamAsked(Aimed):
    """One beam. The laser's frequency counts from the line's centroid unless a component or frequency is named."""

    line: Name = Field(description="line, as `780`, `D2` or `5s_2S1/2->5p_2P3/2`")
    detuning: Megahertz = Field(0.0, description="laser minus the named component (or centroid), in MHz or with a unit")
    component: Component | None = Field(None, description="hyperfine component without field that the detuning is from")
    lower: Sublevel | None = Field(None, description="with `upper`: Zeeman component at this field, instead")
    upper: Sublevel | None = Field(None, description="its upper sublevel")
    frequency: Terahertz | None = Field(None, description="absolute frequency in THz or with a unit, instead")
    intensity: Intensity | None = Field(None, description="intensity at the atom, in mW/cm2 or with a unit")
    saturation: Number | None = Field(None, ge=0, le=1e12, description="instead: I/I_sat of a component of strength 1")
    power: Milliwatts | None = Field(None, description="instead: power in mW or with a unit, with `waist`")
    waist: Millimetres | None = Field(None, description="1/e2 radius in mm or with a unit; the peak intensity counts")
    linewidth: Annotated[float, measure("frequency", "MHz", 0.0, LARGEST_OFFSET_MHZ), NUMBER_OR_TEXT] = Field(
        0.0, description="full width of the laser's line, in MHz or with a unit"
    )
    wanted: PolarisationName | None = Field(
        None, description="polarisation that the beam is meant to drive; of `lower` and `upper` when left out"
    )
    wanted_component: Component | None = Field(
        None, description="component that it is meant to drive; the one that it is tuned to when left out"
    )


class State(Strict):
    """One sublevel."""

    level: Name = Field(description="level, as `5s_2S1/2`")
    sublevel: Sublevel


class StartShare(Strict):
    """A share of the atoms to start with."""

    level: Name = Field(description="level, as `5s_2S1/2`")
    sublevel: Sublevel | None = Field(None, description="one sublevel; all of the level equally when left out")
    share: Number = Field(ge=0, le=1, description="share of the atoms; all shares add up to 1")


class LightAsked(Computed):
    """An atom in beams and a field."""

    atom: Name = Field(description="isotope and charge, as `87Rb` or `40Ca+`")
    field: Annotated[FieldVector, BeforeValidator(as_field)] = Field(
        description="magnetic field: [x, y, z] in gauss, or an object"
    )
    beams: list[BeamAsked] = Field(min_length=1, max_length=LARGEST_BEAMS, description="the laser beams")


class SchemeAsked(LightAsked):
    """A scheme: beams, field, what it is for and where the atoms start."""

    target: State | None = Field(None, description="sublevel to pump to; without one the scheme should scatter")
    initial: list[StartShare] = Field(
        [], max_length=MOST_SHARES, description="where the atoms start; the lowest level equally when left out"
    )
    model: Literal["auto", "bloch", "rate"] = Field(
        "auto", description="optical Bloch equations where one rotating frame holds all lasers, else rate equations"
    )
