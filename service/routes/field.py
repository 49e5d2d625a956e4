"""`field`: the field that a measured splitting tells."""

from collections.abc import Mapping

from pydantic import Field

from levels.insensitive import FieldFound, difference, fields_from_splitting
from levels.records import Level
from service.answers import DOUBTED, Answer
from service.context import Context
from service.formats import Column, Table
from service.parameters import LargestField, Name, SplittingMhz, SpreadMhz, Sublevel
from service.question import Computed, Question
from service.schemas import MaybeNumbers, Numbers, Shape, Tabular

NO_SPREAD = f"at a turning point the splitting tells nothing to first order; elsewhere {DOUBTED}"


class FieldAsked(Computed):
    """A splitting between two sublevels of one level, or of two."""

    level: Name = Field(description="level of the lower sublevel, as `5s_2S1/2`", examples=["5s_2S1/2"])
    upper_level: Name | None = Field(None, description="level of the upper sublevel; the same level when left out")
    lower: Sublevel = Field(description="F,m of the one sublevel", examples=["1,0"])
    upper: Sublevel = Field(description="F,m of the other sublevel", examples=["2,1"])
    splitting: SplittingMhz = Field(
        description="measured splitting, in MHz or with a unit; between two levels the offset from the line's centroid",
        examples=["6840.1"],
    )
    uncertainty: SpreadMhz = Field(
        0.0, description="its standard uncertainty, in MHz or with a unit", examples=["1kHz"]
    )
    max_field: LargestField = Field(2000.0, description="largest field, in gauss or with a unit", examples=["2000"])


class FieldColumns(Shape):
    """One row for each field that gives the splitting, rising."""

    field_G: Numbers
    field_uncertainty_G: MaybeNumbers = Field(description="null at a turning point and where it is not known")
    slope_MHz_per_G: Numbers = Field(description="how fast the splitting moves there")


class FieldAnswered(Tabular):
    """Every field that gives the splitting."""

    atom: str
    level: str
    upper_level: str
    columns: FieldColumns


def field(context: Context, path: Mapping[str, str], asked: FieldAsked) -> Answer:
    """Every field between 0 and `max_field` at which two sublevels differ by a measured splitting.

    The uncertainty joins that of the measurement and that of the constants. Within one level the sign of the splitting
    does not matter.
    """
    names = dict.fromkeys((asked.level, asked.upper_level or asked.level))
    level, upper = (
        context.level(path["atom"], asked.level),
        context.level(path["atom"], asked.upper_level or asked.level),
    )
    grounds = context.level_grounds(path["atom"], *names)
    found = fields_from_splitting(
        level, asked.lower, upper, asked.upper, asked.splitting, asked.max_field, asked.uncertainty
    )
    return Answer(
        {"atom": level.atom, "level": level.name, "upper_level": upper.name},
        Table(_columns(found), {"field_uncertainty_G": NO_SPREAD} if _unknown(found) else {}),
        used=grounds.basis,
        warnings=[*grounds.warnings(asked.max_field), *([] if found else [_nothing(level, upper, asked)])],
        uncertainty_excludes=list(dict.fromkeys(name for one in found for name in one.excludes)),
    )


def _unknown(found: list[FieldFound]) -> bool:
    return any(one.uncertainty_gauss is None for one in found)


def _columns(found: list[FieldFound]) -> dict[str, Column]:
    return {
        "field_G": [one.field_gauss for one in found],
        "field_uncertainty_G": [one.uncertainty_gauss for one in found],
        "slope_MHz_per_G": [one.slope_mhz_per_gauss for one in found],
    }


def _nothing(level: Level, upper: Level, asked: FieldAsked) -> str:
    ends = [difference(level, asked.lower, upper, asked.upper, at).difference_mhz for at in (0.0, asked.max_field)]
    return (
        f"no field from 0 to {asked.max_field:g} G gives this splitting: "
        f"it is {ends[0]:.9g} MHz at 0 and {ends[1]:.9g} MHz at {asked.max_field:g} G"
    )


QUESTION = Question(
    name="field",
    path="/v1/atoms/{atom}/field",
    asked=FieldAsked,
    answered=FieldAnswered,
    ask=field,
    summary="The field that a measured splitting tells",
    example="/v1/atoms/87Rb/field?level=5s_2S1/2&lower=1,0&upper=2,1&splitting=6840.1",
    tag="field",
    heavy=True,
)
