"""`cooling`: what a line's light does to the motion of an atom, in figures."""

from collections.abc import Mapping
from typing import Any

from pydantic import Field, create_model

from levels.cooling import Cooling, cooling
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
from service.schemas import Answered, Scalar, Shape

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


QUESTION = Question(
    name="cooling",
    path="/v1/atoms/{atom}/cooling",
    asked=CoolingAsked,
    answered=CoolingAnswered,
    ask=answer_cooling,
    summary="Limits, saturation, forces, trap and slower figures of a line",
    example="/v1/atoms/87Rb/cooling?line=780&detuning=-12&intensity=3",
    tag="motion",
)
