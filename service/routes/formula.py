"""`formula`: a sublevel's energy or a component's frequency as a formula of the field, to take away."""

from collections.abc import Mapping
from typing import Any, Literal

from pydantic import Field, create_model

from levels.components import check_component, component
from levels.errors import NotPublished, OutsideValidity
from levels.fits import Formula, Source, formula
from levels.formulas import coefficients_of, printed
from levels.notation import format_sublevel
from levels.records import Level
from levels.strongfield import term_constants
from levels.sublevels import constants_of, find_sublevel, zero_field_mhz
from levels.terms import Term
from service.answers import Answer
from service.context import Context
from service.formats import Table
from service.models import ANSWERED, MODEL, ModelName, model_of_level, model_of_line
from service.parameters import FieldGauss, Name, Sublevel, ToleranceMhz
from service.question import Computed, Question
from service.routes.shift import NO_CENTROID
from service.schemas import Numbers, Shape, Tabular, Texts

Of = Literal["energy", "offset", "shift", "frequency"]
MEANING = {
    "energy": "energy from the level's hyperfine centroid",
    "offset": "frequency less that of the line's centroid",
    "shift": "change from zero field",
    "frequency": "frequency of the line's component",
}


class FormulaBase(Computed):
    """A formula of a sublevel (`level`, `sublevel`) or of a component (`line`, `lower`, `upper`)."""

    level: Name | None = Field(None, description="level, as `5s_2S1/2`", examples=["5s_2S1/2"])
    sublevel: Sublevel | None = Field(None, description="F,m of the level", examples=["2,1"])
    line: Name | None = Field(None, description="line, as `780` or `D2`")
    lower: Sublevel | None = Field(None, description="F,m of the line's lower sublevel")
    upper: Sublevel | None = Field(None, description="F,m of the line's upper sublevel")
    of: Of | None = Field(
        None,
        description="energy (of a sublevel, the default), offset (of a component, the default), frequency or shift",
    )
    min_field: FieldGauss = Field(0.0, description="smallest field of the formula")
    max_field: FieldGauss = Field(100.0, description="largest field of the formula", examples=["100"])
    tolerance: ToleranceMhz = Field(1e-3, description="error that a fit is to stay below, MHz or with a unit")
    model: ModelName = MODEL


_AS: Any = (
    Literal["python", "c", "javascript", "octave", "latex"],
    Field("python", description="language of the code, or latex", examples=["python"]),
)
FormulaAsked: Any = create_model("FormulaAsked", __base__=FormulaBase, __doc__=FormulaBase.__doc__, **{"as": _AS})


class CoefficientColumns(Shape):
    """One row for each number of the formula."""

    coefficient: Texts
    value: Numbers


class FormulaAnswered(Tabular):
    """A formula of the field. The columns are its numbers, in MHz, gauss and their powers."""

    atom: str
    level: str = Field(description="the level; of a line its upper level")
    line: str = Field(description="the line; empty for a sublevel")
    lower_sublevel: str = Field(description="F,m; empty for a sublevel of a level")
    upper_sublevel: str = Field(description="F,m of the sublevel, or of the line's upper one")
    model: str = ANSWERED
    of: str
    unit: str
    kind: str = Field(description="closed form, polynomial, rational function, or two of them for a line")
    name: str = Field(description="of the function in the code")
    code: str = Field(description="runs as printed; takes gauss, gives MHz")
    min_field_G: float
    max_field_G: float
    largest_error_MHz: float = Field(description="largest difference from this service's own answer that was found")
    checked_fields: int = Field(description="how many fields were compared")
    columns: CoefficientColumns


def answer_formula(context: Context, path: Mapping[str, str], asked: Any) -> Answer:
    """A sublevel's energy or a component's frequency against the field, as LaTeX or as code that runs as printed.

    In closed form where one exists: J = 1/2 with any I (Breit and Rabi), I = 1/2, and every m that one or two states
    share. Else a polynomial or rational fit over the asked range. Its largest difference from the answers of this
    service, over a dense grid of fields, is stated. A closed form holds at any field that its model does.
    """
    if (asked.level is None) == (asked.line is None):
        raise OutsideValidity("level", asked.level or "", "either level and sublevel, or line, lower and upper")
    about = (
        _of_level(context, path["atom"], asked) if asked.level is not None else _of_line(context, path["atom"], asked)
    )
    sources, added, content, rest = about
    found = formula(sources, asked.min_field, asked.max_field, asked.tolerance)
    name = f"{content['of']}_mhz"
    code = printed(found, getattr(asked, "as"), name, _comment(content, found, context.release), added)
    numbers = coefficients_of(found) + ([("added", added)] if added else [])
    return Answer(
        {
            **content,
            "unit": "MHz",
            "kind": found.kind,
            "name": name,
            "code": code,
            "min_field_G": found.low_gauss,
            "max_field_G": found.high_gauss,
            "largest_error_MHz": found.largest_error_mhz,
            "checked_fields": found.checked_points,
        },
        Table({"coefficient": [one for one, _ in numbers], "value": [value for _, value in numbers]}),
        used=rest.used,
        warnings=[*rest.warnings, *_too_far(found, asked.tolerance)],
    )


def _of_level(context: Context, atom: str, asked: Any) -> tuple[tuple[Source, ...], float, dict[str, Any], Any]:
    _needed(asked, ("sublevel",), ("lower", "upper"))
    level = context.level(atom, asked.level)
    constants = constants_of(level)
    find_sublevel(constants, *asked.sublevel)
    of = _kind(asked.of, ("energy", "shift"))
    model = model_of_level(context, atom, asked.level, _largest(asked), asked.model)
    added = -zero_field_mhz(constants, asked.sublevel[0]) if of == "shift" else 0.0
    content = _content(level, "", "", format_sublevel(*asked.sublevel), model.name, of)
    return (_source(1, level, model.term, asked.sublevel),), added, content, model


def _of_line(context: Context, atom: str, asked: Any) -> tuple[tuple[Source, ...], float, dict[str, Any], Any]:
    _needed(asked, ("lower", "upper"), ("sublevel",))
    line = context.line(atom, asked.line)
    check_component(line, asked.lower, asked.upper)
    of = _kind(asked.of, ("offset", "shift", "frequency"))
    model = model_of_line(context, atom, asked.line, _largest(asked), asked.model)
    still = component(line, asked.lower, asked.upper, 0.0)
    added = 0.0
    if of == "shift":
        added = -still.offset_mhz
    elif of == "frequency":
        if still.frequency_mhz is None:
            raise NotPublished("frequency", f"{line.atom} {line.name}", NO_CENTROID)
        added = still.frequency_mhz - still.offset_mhz
    low, up = (None, None) if model.ends is None else (model.ends.lower, model.ends.upper)
    sources = (_source(1, line.upper, up, asked.upper), _source(-1, line.lower, low, asked.lower))
    names = format_sublevel(*asked.lower), format_sublevel(*asked.upper)
    return sources, added, _content(line.upper, line.name, *names, model.name, of), model


def _source(sign: int, level: Level, term: Term | None, label: tuple[int, int]) -> Source:
    return Source(sign, constants_of(level) if term is None else term_constants(term), label)


def _content(level: Level, line: str, lower: str, upper: str, model: str, of: str) -> dict[str, Any]:
    return {
        "atom": level.atom,
        "level": level.name,
        "line": line,
        "lower_sublevel": lower,
        "upper_sublevel": upper,
        "model": model,
        "of": of,
    }


def _kind(asked: str | None, possible: tuple[str, ...]) -> str:
    if asked is not None and asked not in possible:
        raise OutsideValidity("of", asked, f"one of {', '.join(possible)} here")
    return asked or possible[0]


def _needed(asked: Any, names: tuple[str, ...], others: tuple[str, ...]) -> None:
    for name in names:
        if getattr(asked, name) is None:
            raise OutsideValidity(name, "", "F,m such as 2,1: it is needed here")
    for name in others:
        if getattr(asked, name) is not None:
            raise OutsideValidity(name, format_sublevel(*getattr(asked, name)), "nothing: leave it out here")


def _largest(asked: Any) -> float:
    return float(max(abs(asked.min_field), abs(asked.max_field)))


def _comment(content: Mapping[str, Any], found: Formula, release: str) -> str:
    """One line of ours about the formula; names of levels hold nothing that ends a comment."""
    what = (
        f"{content['line']} {content['lower_sublevel']} - {content['upper_sublevel']}"
        if content["line"]
        else (f"{content['level']} {content['upper_sublevel']}")
    )
    text = (
        f"{content['atom']} {what}: {MEANING[content['of']]} in MHz against the field along z in gauss, from "
        f"{found.low_gauss:g} to {found.high_gauss:g} G; {found.kind}; largest error found "
        f"{found.largest_error_mhz:.2g} MHz; model {content['model']}; data release {release}"
    )
    return text.replace("*/", "").replace('"', "").replace("\\", "").replace("\n", " ")


def _too_far(found: Formula, tolerance: float) -> list[str]:
    if found.largest_error_mhz <= tolerance:
        return []
    return [
        f"no fit of the allowed length stays below {tolerance:g} MHz over this range: the largest error is "
        f"{found.largest_error_mhz:.2g} MHz; ask for a shorter range"
    ]


QUESTION = Question(
    name="formula",
    path="/v1/atoms/{atom}/formula",
    asked=FormulaAsked,
    answered=FormulaAnswered,
    ask=answer_formula,
    summary="A formula of the field, as text or code",
    example="/v1/atoms/87Rb/formula?level=5s_2S1/2&sublevel=2,1&max_field=100&as=python",
    tag="field",
    heavy=True,
)
