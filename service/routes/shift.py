"""`shift`: what one component of a line does in a field."""

from collections.abc import Mapping
from functools import lru_cache

from pydantic import Field

from levels.components import Component, strength_model
from levels.notation import format_polarisation
from levels.records import Line
from levels.sensitivity import ENERGY, QUADRATIC, SHIFT, SLOPE
from levels.strongfield_lines import term_component
from service.answers import DOUBTED, Answer, scalar, uncertain
from service.context import Context
from service.models import ANSWERED, MODEL, ModelName, model_of_line
from service.parameters import FieldGauss, Name, Sublevel
from service.question import Computed, Question
from service.schemas import Answered, Half, Scalar

NO_CENTROID = "the frequency of this line's centroid is not in the catalogue"
NO_STRENGTH = "the line is opened by the field alone: its strength is not in this model"
NO_RATIO = "the field mixes levels of different J and no coupling scheme gives the ratio of their strengths here"
NO_UNCERTAINTY = "the uncertainty of this line's centroid is not stated"


_polarisation = lru_cache(16)(format_polarisation)


class ShiftAsked(Computed):
    """One component at one field."""

    line: Name = Field(description="line, as `780`, `D2` or `5s_2S1/2->5p_2P3/2`", examples=["780"])
    lower: Sublevel = Field(description="F,m of the lower sublevel", examples=["2,2"])
    upper: Sublevel = Field(description="F,m of the upper sublevel", examples=["3,3"])
    field: FieldGauss = Field(description="magnetic field along z, in gauss or with a unit", examples=["3.2"])
    model: ModelName = MODEL


class ShiftAnswered(Answered):
    """One component at one field."""

    atom: str
    line: str
    lower_level: str
    lower_F: Half
    lower_m: Half
    upper_level: str
    upper_F: Half
    upper_m: Half
    polarisation: str = Field(description="sigma+, pi or sigma- for m' - m = 1, 0, -1; q=+2 and the like beyond")
    model: str = ANSWERED
    frequency: Scalar = Field(description="frequency to set a laser to")
    offset: Scalar = Field(description="frequency less that of the line's centroid")
    shift: Scalar = Field(description="offset less that of the same component at zero field")
    slope: Scalar = Field(description="how fast the frequency moves at this field")
    quadratic: Scalar = Field(description="half the second derivative at this field")
    strength: Scalar = Field(
        description="share of this component in the decays of the upper sublevel to the lower level"
    )
    strength_at_zero_field: str = Field(description="the same at zero field, as an exact fraction")


def shift(context: Context, path: Mapping[str, str], asked: ShiftAsked) -> Answer:
    """The frequency of one component, its offset from the line's centroid, and how both move with the field.

    Fine-structure mixing is kept to second order, and to all orders in the whole LS term where it is more than 1 %.
    Neglected: the diamagnetic shift.
    """
    atom, name = path["atom"], asked.line
    model = model_of_line(context, atom, name, asked.field, asked.model)
    if model.ends is None:
        found = context.component(atom, name, asked.lower, asked.upper).at(asked.field)
    else:
        found = term_component(model.ends, asked.lower, asked.upper, asked.field)
    return Answer(
        {**labels(found.line, found), "model": model.name, **numbers(found)},
        used=model.used,
        warnings=model.warnings,
        uncertainty_excludes=found.spread.excludes,
    )


def labels(line: Line, found: Component) -> dict[str, str | float]:
    """What names the component."""
    return {
        "atom": line.atom,
        "line": line.name,
        "lower_level": line.lower.name,
        "lower_F": found.lower[0] / 2,
        "lower_m": found.lower[1] / 2,
        "upper_level": line.upper.name,
        "upper_F": found.upper[0] / 2,
        "upper_m": found.upper[1] / 2,
        "polarisation": _polarisation(found.q),
    }


def numbers(found: Component) -> dict[str, object]:
    """What the component does."""
    spread, stated = (array.ravel().tolist() for array in (found.spread.uncertainty, found.spread.stated))
    known = found.strength_known
    return {
        "frequency": _frequency(found),
        "offset": uncertain(found.offset_mhz, spread[ENERGY], stated[ENERGY], "MHz"),
        "shift": uncertain(found.shift_mhz, spread[SHIFT], stated[SHIFT], "MHz"),
        "slope": uncertain(found.slope_mhz_per_gauss, spread[SLOPE], stated[SLOPE], "MHz/G"),
        "quadratic": uncertain(found.quadratic_hz_per_gauss2, spread[QUADRATIC], stated[QUADRATIC], "Hz/G2"),
        "strength": scalar(
            found.strength if known else None,
            None,
            "1",
            "uncertainty not computed" if known else no_strength(found.line),
        ),
        "strength_at_zero_field": str(found.zero_field_strength) if known else "",
    }


def _frequency(found: Component) -> dict[str, object]:
    frequency, spread = found.frequency_mhz, found.frequency_uncertainty_mhz
    if frequency is None:
        return scalar(None, None, "THz", NO_CENTROID)
    if spread is None:
        return scalar(frequency * 1e-6, None, "THz", no_frequency_spread(found.line))
    return scalar(frequency * 1e-6, spread * 1e-6, "THz")


def no_strength(line: Line) -> str:
    """Why a strength is not known."""
    return NO_RATIO if strength_model(line) else NO_STRENGTH


def no_frequency_spread(line: Line) -> str:
    """Why a frequency has no uncertainty."""
    return DOUBTED if line.centroid is not None and line.centroid.uncertainty is not None else NO_UNCERTAINTY


QUESTION = Question(
    name="shift",
    path="/v1/atoms/{atom}/shift",
    asked=ShiftAsked,
    answered=ShiftAnswered,
    ask=shift,
    summary="One component of a line in a field",
    example="/v1/atoms/87Rb/shift?line=780&lower=2,2&upper=3,3&field=3.2",
    tag="field",
)
