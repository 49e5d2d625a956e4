"""`strengths`: the hyperfine components of a line at zero field, exactly."""

from collections.abc import Callable, Mapping

from pydantic import Field

from levels.errors import NotPublished
from levels.hyperfine import Estimate, Hyperfine, g_F, hyperfine_components, offset
from levels.records import Line
from service.answers import Answer
from service.context import Context
from service.formats import Column, Table
from service.parameters import Name
from service.question import Computed, Question
from service.routes.shift import NO_STRENGTH
from service.schemas import Labels, MaybeNumbers, Shape, Tabular, Texts

NO_FACTOR = "a level with F = 0 has no g_F"
NOT_STATED = "a constant that enters has no stated uncertainty"


class StrengthsAsked(Computed):
    """The hyperfine components of a line."""

    line: Name = Field(description="line, as `780`, `D2` or `5s_2S1/2->5p_2P3/2`", examples=["780"])


class StrengthColumns(Shape):
    """One row for each hyperfine component, by F and then F'."""

    lower_F: Labels
    upper_F: Labels
    strength_exact: Texts = Field(description="share of F' in all the absorption from F, as an exact fraction")
    strength: MaybeNumbers = Field(description="the same as a decimal")
    offset_MHz: MaybeNumbers = Field(description="zero-field frequency less that of the line's centroid")
    offset_uncertainty_MHz: MaybeNumbers
    lower_g_F: MaybeNumbers = Field(description="weak-field factor of the lower F; null for F = 0")
    lower_g_F_uncertainty: MaybeNumbers
    upper_g_F: MaybeNumbers = Field(description="weak-field factor of the upper F; null for F = 0")
    upper_g_F_uncertainty: MaybeNumbers


class StrengthsAnswered(Tabular):
    """The hyperfine components of a line."""

    atom: str
    line: str
    lower_level: str
    upper_level: str
    columns: StrengthColumns


def strengths(context: Context, path: Mapping[str, str], asked: StrengthsAsked) -> Answer:
    """S(F,F') of every hyperfine component as an exact fraction, with the offset and the g_F of both ends.

    S is the share of F' in all the absorption from F: it sums to 1 over F' for each F.
    """
    line, grounds = context.line(path["atom"], asked.line), context.line_grounds(path["atom"], asked.line)
    found = hyperfine_components(line)
    missing: dict[str, str] = {}
    columns: dict[str, Column] = {
        "lower_F": [part.twice_F / 2 for part in found],
        "upper_F": [part.twice_F_up / 2 for part in found],
        "strength_exact": ["" if part.strength is None else str(part.strength) for part in found],
        "strength": [None if part.strength is None else float(part.strength) for part in found],
        **_pair("offset{}_MHz", found, lambda part: offset(line, part), missing),
        **_pair("lower_g_F{}", found, lambda part: g_F(line.lower, part.twice_F), missing),
        **_pair("upper_g_F{}", found, lambda part: g_F(line.upper, part.twice_F_up), missing),
    }
    if any(part.strength is None for part in found):
        missing["strength"] = NO_STRENGTH
    return Answer(_content(line), Table(columns, missing), used=grounds.basis, warnings=grounds.warnings(0.0))


def _content(line: Line) -> dict[str, str]:
    return {"atom": line.atom, "line": line.name, "lower_level": line.lower.name, "upper_level": line.upper.name}


def _pair(
    template: str,
    found: list[Hyperfine],
    estimate: Callable[[Hyperfine], Estimate | None],
    missing: dict[str, str],
) -> dict[str, Column]:
    """A column of numbers and that of their uncertainties; a constant that is not published leaves both empty."""
    names = (template.format(""), template.format("_uncertainty"))
    try:
        numbers = [estimate(part) for part in found]
    except NotPublished as error:
        missing.update(dict.fromkeys(names, str(error)))
        return {name: [None] * len(found) for name in names}
    if any(number is not None and number.uncertainty is None for number in numbers):
        missing[names[1]] = NOT_STATED
    if None in numbers:
        missing[names[0]] = NO_FACTOR
        missing.setdefault(names[1], NO_FACTOR)
    return {
        names[0]: [None if number is None else number.value for number in numbers],
        names[1]: [None if number is None else number.uncertainty for number in numbers],
    }


QUESTION = Question(
    name="strengths",
    path="/v1/atoms/{atom}/strengths",
    asked=StrengthsAsked,
    answered=StrengthsAnswered,
    ask=strengths,
    summary="Exact relative strengths of a line's hyperfine components",
    example="/v1/atoms/87Rb/strengths?line=780",
    tag="field",
)
