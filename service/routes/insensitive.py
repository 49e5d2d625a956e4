"""`insensitive`: fields where the difference of two sublevels does not move."""

from collections.abc import Mapping, Sequence

from pydantic import Field

from levels.insensitive import Insensitive, insensitive
from levels.sensitivity import ENERGY, QUADRATIC
from service.answers import Answer, uncertainty_columns
from service.context import Context
from service.formats import Column, Table
from service.parameters import LargestField, Name
from service.question import Computed, Question
from service.schemas import Labels, MaybeNumbers, Numbers, Shape, Tabular


class InsensitiveAsked(Computed):
    """Pairs within one level, or between two."""

    level: Name = Field(description="level of the lower sublevel, as `5s_2S1/2`", examples=["5s_2S1/2"])
    upper_level: Name | None = Field(None, description="level of the upper sublevel; the same level when left out")
    max_field: LargestField = Field(2000.0, description="largest field, in gauss or with a unit", examples=["2000"])
    max_dm: int = Field(2, ge=0, le=20, description="largest difference of m between the two")


class InsensitiveColumns(Shape):
    """One row for each pair and field, by field."""

    lower_F: Labels
    lower_m: Labels
    upper_F: Labels
    upper_m: Labels
    field_G: Numbers
    field_uncertainty_G: MaybeNumbers
    frequency_MHz: Numbers = Field(description="E(upper) - E(lower), between two levels less that of the centroids")
    frequency_uncertainty_MHz: MaybeNumbers
    quadratic_Hz_per_G2: Numbers = Field(description="coefficient of (B - field)^2")
    quadratic_uncertainty_Hz_per_G2: MaybeNumbers


class InsensitiveAnswered(Tabular):
    """Field-insensitive pairs."""

    atom: str
    level: str
    upper_level: str
    columns: InsensitiveColumns


def answer_insensitive(context: Context, path: Mapping[str, str], asked: InsensitiveAsked) -> Answer:
    """Every pair of sublevels whose difference does not move at some field between 0 and `max_field`.

    Within one level the sublevel of lower energy is `lower`. Pairs of two m = 0 sublevels are stationary at zero field
    and are listed there.
    """
    names = dict.fromkeys((asked.level, asked.upper_level or asked.level))
    level, upper = (
        context.level(path["atom"], asked.level),
        context.level(path["atom"], asked.upper_level or asked.level),
    )
    grounds = context.level_grounds(path["atom"], *names)
    points = insensitive(level, upper, asked.max_field, 2 * asked.max_dm)
    return Answer(
        {"atom": level.atom, "level": level.name, "upper_level": upper.name},
        _table(points),
        used=grounds.basis,
        warnings=[*grounds.warnings(asked.max_field), *nothing_stationary(points, asked.max_field, asked.max_dm)],
        uncertainty_excludes=list(dict.fromkeys(name for point in points for name in point.spread.excludes)),
    )


def nothing_stationary(points: Sequence[object], max_field_gauss: float, max_dm: int) -> list[str]:
    """Say in words what an empty table says."""
    if points:
        return []
    return [
        f"no pair with m differing by {max_dm} at most is stationary from 0 to {max_field_gauss:g} G: "
        "each moves all the way, or there is only one sublevel"
    ]


def _table(points: list[Insensitive]) -> Table:
    sigma, doubted = uncertainty_columns(
        {
            "field_uncertainty_G": [point.field_uncertainty_gauss for point in points],
            "frequency_uncertainty_MHz": [float(point.spread.uncertainty[ENERGY, 0, 0]) for point in points],
            "quadratic_uncertainty_Hz_per_G2": [float(point.spread.uncertainty[QUADRATIC, 0, 0]) for point in points],
        }
    )
    columns: dict[str, Column] = {
        "lower_F": [point.lower[0] / 2 for point in points],
        "lower_m": [point.lower[1] / 2 for point in points],
        "upper_F": [point.upper[0] / 2 for point in points],
        "upper_m": [point.upper[1] / 2 for point in points],
        "field_G": [point.field_gauss for point in points],
        "field_uncertainty_G": sigma["field_uncertainty_G"],
        "frequency_MHz": [point.difference_mhz for point in points],
        "frequency_uncertainty_MHz": sigma["frequency_uncertainty_MHz"],
        "quadratic_Hz_per_G2": [point.quadratic_hz_per_gauss2 for point in points],
        "quadratic_uncertainty_Hz_per_G2": sigma["quadratic_uncertainty_Hz_per_G2"],
    }
    return Table(columns, doubted)


QUESTION = Question(
    name="insensitive",
    path="/v1/atoms/{atom}/insensitive",
    asked=InsensitiveAsked,
    answered=InsensitiveAnswered,
    ask=answer_insensitive,
    summary="Field-insensitive pairs of sublevels",
    example="/v1/atoms/87Rb/insensitive?level=5s_2S1/2&max_field=2000",
    tag="field",
    heavy=True,
)
