"""`slower`: the field profile that slows a beam of atoms."""

from collections.abc import Mapping

from pydantic import Field

from levels.cooling import slower_profile
from levels.cooling_figures import Setting
from levels.errors import OutsideValidity
from service.answers import Answer
from service.context import Context
from service.formats import Table
from service.parameters import Name, SplittingMhz, VelocityMPerS
from service.question import Computed, Question
from service.routes.cooling import LINE, FigureShape, excludes_of, figure_record, figures_of
from service.schemas import Numbers, Shape, Tabular


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


QUESTION = Question(
    name="slower",
    path="/v1/atoms/{atom}/slower",
    asked=SlowerAsked,
    answered=SlowerAnswered,
    ask=answer_slower,
    summary="The field profile of a slower",
    example="/v1/atoms/87Rb/slower?line=780&initial_speed=300&final_speed=20&points=21",
    tag="motion",
)
