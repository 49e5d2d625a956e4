"""`cooling`, `force` and `slower`: what a line's light does to the motion of an atom."""

from collections.abc import Mapping
from typing import Any, Literal

import numpy as np
from pydantic import Field, create_model

from levels.cooling import Cooling, cooling, force_curve, slower_profile
from levels.cooling_figures import FIGURES, Figure, Setting
from levels.errors import OutsideValidity
from levels.notation import format_sublevel
from service.answers import Answer, scalar
from service.context import Context
from service.formats import Column, Table
from service.parameters import (
    GradientGaussPerCm,
    IntensityMwPerCm2,
    LengthCm,
    Name,
    SplittingMhz,
    Sublevel,
    VelocityMPerS,
)
from service.question import Computed, Question
from service.schemas import Answered, MaybeNumbers, Numbers, Scalar, Shape, Tabular

LINE = Field(description="line, as `780`, `D2` or `5s_2S1/2->5p_2P3/2`", examples=["780"])


class Lit(Computed):
    """A line and the component of it that is driven."""

    line: Name = LINE
    lower: Sublevel | None = Field(None, description="F,m of the lower sublevel; with `upper` (default: stretched)")
    upper: Sublevel | None = Field(None, description="F,m of the upper sublevel; default: the cycling component")
    detuning: SplittingMhz | None = Field(
        None,
        description="laser less atom at rest in no field, MHz; red is negative (default: half a linewidth to the red)",
    )
    intensity: IntensityMwPerCm2 | None = Field(
        None, description="of each beam, mW/cm2 (default: the component's saturation intensity)"
    )
    velocity: VelocityMPerS = Field(0.0, description="along the beam, m/s")


class CoolingAsked(Lit):
    """Every figure of a line."""

    gradient: GradientGaussPerCm = Field(10.0, description="field gradient of the trap along the beams, G/cm")
    distance: LengthCm = Field(1.0, description="way over which atoms are to be stopped, cm")
    initial_speed: VelocityMPerS = Field(300.0, description="of atoms that enter the slower, m/s")
    final_speed: VelocityMPerS = Field(20.0, description="of atoms that leave the slower, m/s")
    slower_detuning: SplittingMhz = Field(0.0, description="slower's laser less atom at rest in no field, MHz")
    slower_share: float = Field(0.5, gt=0, le=1, description="share of the largest deceleration that is planned for")


class FigureShape(Scalar):
    """A computed number with what it means."""

    formula: str
    validity: str = Field(description="where it holds")
    formula_source: str


_MEMBERS: dict[str, Any] = {
    row.name: (FigureShape, Field(description=f"{row.formula}; {row.validity}")) for row in FIGURES
}
Figures: Any = create_model("Figures", __base__=Shape, **_MEMBERS)


class CoolingAnswered(Answered):
    """Every figure of a line. As CSV and NDJSON: a row for each figure."""

    atom: str
    line: str
    lower_sublevel: str = Field(description="F,m of the component; empty without one")
    upper_sublevel: str
    regime: str = Field(description="broad, narrow (linewidth below four recoil frequencies), or empty when not known")
    figures: Figures


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


class SlowerAsked(Computed):
    """A slower between two speeds."""

    line: Name = LINE
    initial_speed: VelocityMPerS = Field(300.0, description="of atoms that enter, m/s", examples=["300"])
    final_speed: VelocityMPerS = Field(20.0, description="of atoms that leave, m/s", examples=["20"])
    detuning: SplittingMhz = Field(0.0, description="laser less atom at rest in no field, MHz")
    share: float = Field(0.5, gt=0, le=1, description="share of the largest deceleration that is planned for")
    points: int = Field(101, ge=2, le=10_000, description="how many positions")


class SlowerColumns(Shape):
    """One row for each position."""

    position_cm: Numbers = Field(description="from the slower's start")
    speed_m_per_s: Numbers
    field_G: Numbers = Field(description="along the beam's quantisation axis, for the sigma+ cycling component")


class SlowerAnswered(Tabular):
    """A slower between two speeds."""

    atom: str
    line: str
    length: FigureShape
    field_span: FigureShape
    largest_gradient: FigureShape
    columns: SlowerColumns


def answer_cooling(context: Context, path: Mapping[str, str], asked: CoolingAsked) -> Answer:
    """Recoil, Doppler limit, saturation intensities, scattering rate, force, trap and slower figures of a line.

    Of the cycling component unless `lower` and `upper` name another. Each figure says its formula, where it holds and
    where the formula stands; what a line cannot have is null with a reason. A two-level atom in one dimension: no
    sub-Doppler cooling, no optical pumping (ask `scheme` about that).

    Laser light can blind: local rules and the laser safety officer decide how it is used.
    """
    setting = Setting(
        asked.detuning,
        asked.intensity,
        asked.velocity,
        asked.gradient,
        asked.distance,
        asked.initial_speed,
        asked.final_speed,
        asked.slower_detuning,
        asked.slower_share,
    )
    found = figures_of(context, path["atom"], asked.line, setting, component_asked(asked))
    low, up = found.component or ((0, 0), (0, 0))
    figures = {name: figure_record(figure) for name, figure in found.figures.items()}
    return Answer(
        {
            "atom": found.line.atom,
            "line": found.line.name,
            "lower_sublevel": format_sublevel(*low) if found.component else "",
            "upper_sublevel": format_sublevel(*up) if found.component else "",
            "regime": found.regime,
            "figures": figures,
        },
        Table(_rows(figures)),
        columnar=False,
        used=found.used,
        warnings=found.notes,
        uncertainty_excludes=excludes_of(found),
    )


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


def answer_slower(context: Context, path: Mapping[str, str], asked: SlowerAsked) -> Answer:
    """The field that keeps atoms resonant with the beam they run against while they slow down evenly.

    B(z) = (detuning + v(z)/lambda)/slope, for the sigma+ cycling component. The field may pass through zero or start
    below it, as the detuning has it.

    Magnets and their supplies store energy, and slowing beams leave the vacuum: follow local rules and the laser
    safety officer.
    """
    if not asked.initial_speed > asked.final_speed >= 0:
        raise OutsideValidity("final_speed", asked.final_speed, "from 0 to below initial_speed")
    setting = Setting(
        initial_speed_m_per_s=asked.initial_speed,
        final_speed_m_per_s=asked.final_speed,
        slower_detuning_mhz=asked.detuning,
        slower_share=asked.share,
    )
    found = figures_of(context, path["atom"], asked.line, setting, None)
    profile = slower_profile(found, asked.points)
    if profile is None:
        reason = next(
            found.figures[name].reason
            for name in ("slower_field_span", "slower_length")
            if found.figures[name].value is None
        )
        raise OutsideValidity("line", found.line.name, f"a line that slows this atom: {reason}")
    return Answer(
        {
            "atom": found.line.atom,
            "line": found.line.name,
            "length": figure_record(found.figures["slower_length"]),
            "field_span": figure_record(found.figures["slower_field_span"]),
            "largest_gradient": figure_record(found.figures["slower_largest_gradient"]),
        },
        Table(
            {
                "position_cm": profile.position_cm,
                "speed_m_per_s": profile.speed_m_per_s,
                "field_G": profile.field_gauss,
            }
        ),
        used=found.used,
        warnings=found.notes,
        uncertainty_excludes=excludes_of(found),
    )


def figures_of(context: Context, atom: str, line: str, setting: Setting, component: Any) -> Cooling:
    """The figures of a line found by name."""
    if setting.final_speed_m_per_s > setting.initial_speed_m_per_s or setting.final_speed_m_per_s < 0:
        raise OutsideValidity("final_speed", setting.final_speed_m_per_s, "from 0 to initial_speed")
    return cooling(context.atom(atom), context.line(atom, line), setting, component)


def component_asked(asked: Lit) -> Any:
    """Both sublevels, or None for neither."""
    if (asked.lower is None) != (asked.upper is None):
        name = "upper" if asked.upper is None else "lower"
        raise OutsideValidity(name, "", "`lower` and `upper` together, or neither")
    return None if asked.lower is None else (asked.lower, asked.upper)


def figure_record(figure: Figure) -> dict[str, Any]:
    """One figure as the wire has it."""
    row = figure.row
    number = scalar(figure.value, figure.uncertainty, figure.unit, figure.reason)
    return {**number, "formula": row.formula, "validity": row.validity, "formula_source": row.source}


def excludes_of(found: Cooling) -> list[str]:
    """The constants that leave figures without an uncertainty."""
    lost = [figure.reason.partition(": ")[2] for figure in found.figures.values() if figure.value is not None]
    return list(dict.fromkeys(name for text in lost for name in text.split(", ") if name))


def _rows(figures: Mapping[str, dict[str, Any]]) -> dict[str, Column]:
    names = ("figure", "value", "uncertainty", "unit", "reason", "formula", "validity", "formula_source")
    rows = [{"figure": name, **record} for name, record in figures.items()]
    return {name: [row[name] for row in rows] for name in names}


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


QUESTIONS = (
    Question(
        name="cooling",
        path="/v1/atoms/{atom}/cooling",
        asked=CoolingAsked,
        answered=CoolingAnswered,
        ask=answer_cooling,
        summary="Limits, saturation, forces, trap and slower figures of a line",
        example="/v1/atoms/87Rb/cooling?line=780&detuning=-12&intensity=3",
        tag="motion",
    ),
    Question(
        name="force",
        path="/v1/atoms/{atom}/force",
        asked=ForceAsked,
        answered=ForceAnswered,
        ask=answer_force,
        summary="Scattering rate and force against velocity, detuning or intensity",
        example="/v1/atoms/87Rb/force?line=780&against=velocity&points=41",
        tag="motion",
    ),
    Question(
        name="slower",
        path="/v1/atoms/{atom}/slower",
        asked=SlowerAsked,
        answered=SlowerAnswered,
        ask=answer_slower,
        summary="The field profile of a slower",
        example="/v1/atoms/87Rb/slower?line=780&initial_speed=300&final_speed=20&points=21",
        tag="motion",
    ),
)
