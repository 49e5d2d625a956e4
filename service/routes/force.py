"""`force`: scattering rate and force of a line's light against velocity, detuning or intensity."""

from collections.abc import Mapping
from typing import Any, Literal

import numpy as np
from pydantic import Field

from levels.cooling import Cooling, force_curve
from levels.cooling_figures import Setting
from levels.errors import OutsideValidity
from service.answers import Answer
from service.context import Context
from service.formats import Column, Table
from service.question import Question
from service.routes.cooling import Lit, component_asked, figures_of
from service.schemas import MaybeNumbers, Shape, Tabular


class ForceAsked(Lit):
    """Rates and forces against one of three."""

    against: Literal["velocity", "detuning", "intensity"] = Field(
        "velocity", description="what varies; the other two are held"
    )
    start: float | None = Field(None, description="first value, in m/s, MHz or mW/cm2 (default: twice the scale below)")
    stop: float | None = Field(None, description="last value; the defaults span the resonance")
    points: int = Field(101, ge=2, le=10_000, description="how many values")


class ForceColumns(Shape):
    """One row for each value."""

    detuning_MHz: MaybeNumbers
    intensity_mW_per_cm2: MaybeNumbers
    velocity_m_per_s: MaybeNumbers
    scattering_rate_per_s: MaybeNumbers = Field(description="of one beam")
    acceleration_m_per_s2: MaybeNumbers = Field(description="by one beam, along it")
    molasses_acceleration_m_per_s2: MaybeNumbers = Field(description="by two opposite beams of this intensity each")


class ForceAnswered(Tabular):
    """Rates and forces."""

    atom: str
    line: str
    columns: ForceColumns


def answer_force(context: Context, path: Mapping[str, str], asked: ForceAsked) -> Answer:
    """Scattering rate and acceleration of a line's light against velocity, detuning or intensity.

    By one beam, and by two opposite beams that saturate the atom independently of each other (small saturation).
    Without `start` and `stop` the values span the resonance.
    """
    setting = Setting(asked.detuning, asked.intensity, asked.velocity)
    found = figures_of(context, path["atom"], asked.line, setting, component_asked(asked))
    values = _values(found, asked)
    curve = force_curve(found, asked.against, values)
    names = tuple(ForceColumns.model_fields)
    if curve is None:
        reason = found.figures["force"].reason
        columns: dict[str, Column] = {name: [None] * asked.points for name in names}
        table = Table(columns, dict.fromkeys(names, reason))
    else:
        attributes = (
            curve.detuning_mhz,
            curve.intensity_mw_per_cm2,
            curve.velocity_m_per_s,
            curve.scattering_rate_per_s,
            curve.acceleration_m_per_s2,
            curve.molasses_acceleration_m_per_s2,
        )
        table = Table(dict(zip(names, attributes, strict=True)))
    content = {"atom": found.line.atom, "line": found.line.name}
    return Answer(content, table, used=found.used, warnings=found.notes)


def _values(found: Cooling, asked: ForceAsked) -> Any:
    scale = {"velocity": found.figures["molasses_velocity"].value, "detuning": found.figures["doppler_detuning"].value}
    if asked.against == "intensity":
        low, high = 0.0, 10 * (found.figures["saturation_intensity"].value or 1.0)
    else:
        high = 6 * abs(scale[asked.against] or 1.0)
        low = -high
    low = low if asked.start is None else asked.start
    high = high if asked.stop is None else asked.stop
    for name, value in (("start", low), ("stop", high)):
        if abs(value) > 1e9 or (asked.against == "intensity" and value < 0):
            raise OutsideValidity(name, value, "within 1e9, and not below zero for an intensity")
    return np.linspace(low, high, asked.points)


QUESTION = Question(
    name="force",
    path="/v1/atoms/{atom}/force",
    asked=ForceAsked,
    answered=ForceAnswered,
    ask=answer_force,
    summary="Scattering rate and force against velocity, detuning or intensity",
    example="/v1/atoms/87Rb/force?line=780&against=velocity&points=41",
    tag="motion",
)
