"""Which model of the field answers: each level by itself with its neighbours to second order, or its whole term.

`auto` takes the level by itself up to 1 % of fine-structure mixing and the whole term beyond, where the catalogue has
what that needs; where it has not, the level answers with a warning that says what is missing.
"""

from dataclasses import dataclass
from typing import Any, Literal

from pydantic import Field

from levels.errors import NotPublished, OutsideValidity
from levels.multiplet import quiet_field_gauss
from levels.quantity import Quantity
from levels.records import Atom, Level
from levels.strongfield import term_constants
from levels.strongfield_lines import Ends
from levels.sublevels import cautions
from levels.terms import Term, alone, term_notes, term_of
from service.answers import Basis, Used
from service.context import Context
from service.inputs import Grounds, level_inputs, line_cautions, line_inputs

ModelName = Literal["auto", "level", "multiplet"]
MODEL: Any = Field(
    "auto",
    description="`level`: fine-structure neighbours to second order; `multiplet`: the whole LS term in one matrix, "
    "without the hyperfine interaction between different J; `auto`: multiplet where the field mixes more than 1 %",
    examples=["auto"],
)
ANSWERED: Any = Field(description="which model answered: level or multiplet")


@dataclass(frozen=True, slots=True)
class LevelModel:
    """The model of a level: its term, or None for the level by itself; what it rests on and its warnings."""

    term: Term | None
    used: Used
    warnings: list[str]

    @property
    def name(self) -> str:
        """What the answer calls it."""
        return "level" if self.term is None else "multiplet"


@dataclass(frozen=True, slots=True)
class LineModel:
    """The model of a line: the terms of both ends, or None for the levels by themselves."""

    ends: Ends | None
    used: Used
    warnings: list[str]

    @property
    def name(self) -> str:
        """What the answer calls it."""
        return "level" if self.ends is None else "multiplet"


def model_of_level(context: Context, atom: str, name: str, largest_field: float, model: ModelName) -> LevelModel:
    """Choose the model of a level for fields up to the largest."""
    grounds = context.level_grounds(atom, name)
    if is_quiet(grounds, largest_field, model):
        return LevelModel(None, grounds.basis, grounds.warnings(largest_field))
    level = context.level(atom, name)
    try:
        term = term_of(context.atom(atom), level)
        term_constants(term)
    except (NotPublished, OutsideValidity) as missing:
        if model == "multiplet":
            raise
        return LevelModel(None, grounds.basis, [*grounds.warnings(largest_field), _would(missing)])
    return LevelModel(term, Basis(tuple(term_inputs(term)), context.publications), term_warnings(term))


def model_of_line(context: Context, atom: str, name: str, largest_field: float, model: ModelName) -> LineModel:
    """Choose the model of a line for fields up to the largest: one of its levels is enough to ask for whole terms."""
    grounds = context.line_grounds(atom, name)
    if is_quiet(grounds, largest_field, model):
        return LineModel(None, grounds.basis, grounds.warnings(largest_field))
    line, isotope = context.line(atom, name), context.atom(atom)
    try:
        lower, upper = (_end(isotope, level, largest_field, model) for level in (line.lower, line.upper))
        ends = Ends(line, lower, upper)
        term_constants(ends.lower), term_constants(ends.upper)
    except (NotPublished, OutsideValidity) as missing:
        if model == "multiplet":
            raise
        return LineModel(None, grounds.basis, [*grounds.warnings(largest_field), _would(missing)])
    if len(ends.lower.levels) == len(ends.upper.levels) == 1:
        term_of(isotope, line.upper)  # says that there is no multiplet here
    used = dict([*line_inputs(line), *term_inputs(ends.lower), *term_inputs(ends.upper)])
    said = (*line_cautions(line), *term_warnings(ends.lower), *term_warnings(ends.upper))
    return LineModel(ends, Basis(tuple(used.items()), context.publications), list(dict.fromkeys(said)))


def is_quiet(grounds: Grounds, largest_field: float, model: ModelName) -> bool:
    """Say whether the levels answer by themselves."""
    return model == "level" or (model == "auto" and abs(largest_field) <= grounds.quiet_field_gauss)


def _end(atom: Atom, level: Level, largest_field: float, model: ModelName) -> Term:
    """The term of one end of a line; a level that mixes little, or has no partners, stays by itself."""
    if not level.neighbours or (model == "auto" and abs(largest_field) <= quiet_field_gauss(level)):
        return alone(level)
    return term_of(atom, level)


def term_inputs(term: Term) -> list[tuple[str, Quantity]]:
    """The constants of every level of a term and the intervals between them."""
    gaps = [
        (f"interval of {one.name} and {term.level.name}", gap)
        for one, gap in zip(term.levels, term.gaps, strict=True)
        if one.twice_J != term.level.twice_J
    ]
    return [*(item for one in term.levels for item in level_inputs(one)), *gaps]


def term_warnings(term: Term) -> list[str]:
    """What the model of a whole term leaves out, and what its levels do."""
    return list(dict.fromkeys((*(text for one in term.levels for text in cautions(one)), *term_notes(term))))


def _would(missing: Exception) -> str:
    return f"the whole term would answer here, but {missing}"
