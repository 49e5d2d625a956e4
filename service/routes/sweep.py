"""`sweep`: sublevels or components over a grid of fields."""

import time
from collections.abc import Iterator, Mapping, Sequence
from functools import partial
from typing import Any, Literal

import numpy as np
from numpy.typing import NDArray
from pydantic import Field

from levels.components import components, pairs_of, strength_model
from levels.errors import OutsideValidity, UnknownName
from levels.notation import format_polarisation, format_sublevel
from levels.records import Line
from levels.strongfield import term_sublevels
from levels.strongfield_lines import pair_ratios, term_components
from levels.sublevels import constants_of, labels_of, sublevels
from service.answers import Answer
from service.context import Context
from service.formats import Column, Table
from service.models import ANSWERED, MODEL, ModelName, model_of_level, model_of_line
from service.parameters import FieldGauss, Name, PolarisationName, Sublevel
from service.problems import Problem
from service.question import Computed, Question, Strict
from service.routes.shift import NO_CENTROID, no_strength
from service.schemas import Answered, Missing

Array = NDArray[np.float64]
Label = tuple[int, int]
SOLVED_AT_ONCE = 2_000_000  # numbers that a piece of a long grid may hold while it is solved
OF_LEVEL = {
    "energy_MHz": "energy_mhz",
    "shift_MHz": "shift_mhz",
    "slope_MHz_per_G": "slope_mhz_per_gauss",
    "quadratic_Hz_per_G2": "quadratic_hz_per_gauss2",
    "moment_muB": "moment_mu_b",
}
OF_LINE = {
    "offset_MHz": "offset_mhz",
    "frequency_THz": "frequency_mhz",
    "shift_MHz": "shift_mhz",
    "slope_MHz_per_G": "slope_mhz_per_gauss",
    "quadratic_Hz_per_G2": "quadratic_hz_per_gauss2",
    "strength": "strength",
}
Quantity = Literal[
    "energy_MHz",
    "offset_MHz",
    "frequency_THz",
    "shift_MHz",
    "slope_MHz_per_G",
    "quadratic_Hz_per_G2",
    "moment_muB",
    "strength",
]


class FieldGrid(Strict):
    """Fields in equal steps (start, stop, points), or listed (values)."""

    start: FieldGauss | None = Field(None, description="first field, in gauss or with a unit")
    stop: FieldGauss | None = Field(None, description="last field, included")
    points: int | None = Field(None, ge=1, le=1_000_000, strict=True, description="how many fields")
    values: list[FieldGauss] | None = Field(None, min_length=1, max_length=100_000, description="the fields themselves")

    def gauss(self) -> Array:
        """The fields of the grid."""
        steps = (self.start, self.stop, self.points)
        if self.values is not None and steps == (None, None, None):
            return np.array(self.values, dtype=np.float64)
        if self.values is not None or self.start is None or self.stop is None or self.points is None:
            raise OutsideValidity("fields", "", "either start, stop and points, or values")
        return np.linspace(self.start, self.stop, self.points)


class SweepAsked(Computed):
    """A level or a line over a grid of fields."""

    atom: Name = Field(description="isotope and charge, as `87Rb` or `40Ca+`")
    level: Name | None = Field(None, description="level whose sublevels are asked; either this or `line`")
    line: Name | None = Field(None, description="line whose components are asked; either this or `level`")
    fields: FieldGrid
    columns: list[Quantity] | None = Field(
        None,
        min_length=1,
        max_length=len(OF_LINE),
        description="which numbers; of a level by default energy and slope, of a line offset, slope and strength",
    )
    sublevels: list[Sublevel] | None = Field(
        None, min_length=1, max_length=1000, description="of a level: only these sublevels, each as F,m"
    )
    lower: Sublevel | None = Field(None, description="of a line: only components from this sublevel")
    upper: Sublevel | None = Field(None, description="of a line: only components to this sublevel")
    polarisation: PolarisationName | None = Field(None, description="of a line: only components of this polarisation")
    model: ModelName = MODEL


class SweepAnswered(Answered):
    """Rows by field, then by sublevel or component. The columns are the labels and what was asked for."""

    atom: str
    level: str = Field(description="the level; of a line its upper level")
    line: str = Field(description="the line; empty for a level")
    model: str = ANSWERED
    columns: dict[str, list[float | str | None]] = Field(
        description="field_G; labels (F, m or lower_F, lower_m, upper_F, upper_m, polarisation); the numbers asked for"
    )
    missing: list[Missing] = Field(description="columns that hold null, with the reason")


def sweep(context: Context, path: Mapping[str, str], asked: SweepAsked) -> Answer:
    """Sublevels of a level, or components of a line, over a grid of fields: one row for each field and state.

    An answer holds at most a million numbers; above some hundred thousand it is streamed. One model answers for the
    whole grid: that of its largest field.
    """
    if (asked.level is None) == (asked.line is None):
        raise OutsideValidity("level", asked.level or "", "either level or line, not both")
    fields = asked.fields.gauss()
    if asked.level is not None:
        return _of_level(context, asked, asked.level, fields)
    return _of_line(context, asked, str(asked.line), fields)


def _of_level(context: Context, asked: SweepAsked, name: str, fields: Array) -> Answer:
    level = context.level(asked.atom, name)
    model = model_of_level(context, asked.atom, name, float(np.abs(fields).max()), asked.model)
    _refuse(asked, ("lower", "upper", "polarisation"), "of a line, not of a level")
    names = _names(asked, OF_LEVEL, ("energy_MHz", "slope_MHz_per_G"))
    labels = labels_of(constants_of(level))
    chosen = asked.sublevels or labels
    for label in chosen:
        if label not in labels:
            raise UnknownName("sublevel", format_sublevel(*label), [format_sublevel(*known) for known in labels[:6]])
    at = [labels.index(label) for label in chosen]
    _check_size(context, fields.size * len(at) * (3 + len(names)))
    quadratic = "quadratic_Hz_per_G2" in names
    pieces = _pieces(fields, len(labels) * (4 if quadratic else 3), context.settings.max_seconds)
    solve = partial(sublevels, level) if model.term is None else partial(term_sublevels, model.term)
    solved = [_taken(solve(piece, quadratic=quadratic), OF_LEVEL, names, at) for piece in pieces]
    columns: dict[str, Column] = {
        "field_G": np.repeat(fields, len(at)),
        "F": np.tile([label[0] / 2 for label in chosen], fields.size),
        "m": np.tile([label[1] / 2 for label in chosen], fields.size),
        **_joined(solved, names),
    }
    return Answer(
        {"atom": level.atom, "level": level.name, "line": "", "model": model.name},
        Table(columns),
        used=model.used,
        warnings=model.warnings,
    )


def _of_line(context: Context, asked: SweepAsked, name: str, fields: Array) -> Answer:
    line = context.line(asked.atom, name)
    model = model_of_line(context, asked.atom, name, float(np.abs(fields).max()), asked.model)
    _refuse(asked, ("sublevels",), "of a level, not of a line")
    names = _names(asked, OF_LINE, ("offset_MHz", "slope_MHz_per_G", "strength"))
    pairs = pairs_of(line, asked.polarisation)
    wanted = [(asked.lower in (None, low)) and (asked.upper in (None, up)) for low, up in pairs]
    at = [place for place, one in enumerate(wanted) if one]
    if not at:
        given = " -> ".join("any" if label is None else format_sublevel(*label) for label in (asked.lower, asked.upper))
        raise UnknownName("component", given, hint=f"{line.name} has no component between these sublevels")
    _check_size(context, fields.size * len(at) * (6 + len(names)))
    pieces = _pieces(fields, 5 * len(pairs), context.settings.max_seconds)
    # Without a published frequency the column is emptied below; the offsets only hold its place.
    taken = OF_LINE if line.centroid is not None else {**OF_LINE, "frequency_THz": "offset_mhz"}
    solve = partial(components, line) if model.ends is None else partial(term_components, model.ends)
    solved = [_taken(solve(piece, asked.polarisation), taken, names, at) for piece in pieces]
    labels = [pairs[place] for place in at]
    columns: dict[str, Column] = {
        "field_G": np.repeat(fields, len(at)),
        "lower_F": np.tile([low[0] / 2 for low, _ in labels], fields.size),
        "lower_m": np.tile([low[1] / 2 for low, _ in labels], fields.size),
        "upper_F": np.tile([up[0] / 2 for _, up in labels], fields.size),
        "upper_m": np.tile([up[1] / 2 for _, up in labels], fields.size),
        "polarisation": [format_polarisation((up[1] - low[1]) // 2) for low, up in labels] * fields.size,
        **_joined(solved, names),
    }
    known = model.ends is None or bool(pair_ratios(model.ends))
    missing = _complete(line, columns, known)
    return Answer(
        {"atom": line.atom, "level": line.upper.name, "line": line.name, "model": model.name},
        Table(columns, missing),
        used=model.used,
        warnings=model.warnings,
    )


def _complete(line: Line, columns: dict[str, Column], strength_known: bool) -> dict[str, str]:
    """Write frequencies in THz; empty what the catalogue or the model does not have, and say why."""
    missing: dict[str, str] = {}
    if "frequency_THz" in columns:
        if line.centroid is None:
            missing["frequency_THz"] = NO_CENTROID
        else:
            columns["frequency_THz"] = np.asarray(columns["frequency_THz"]) * 1e-6
    if "strength" in columns and not (strength_known and strength_model(line)):
        missing["strength"] = no_strength(line)
    for name in missing:
        columns[name] = [None] * len(columns["field_G"])
    return missing


def _names(asked: SweepAsked, known: Mapping[str, str], usual: Sequence[str]) -> list[str]:
    names = list(dict.fromkeys(asked.columns or usual))
    for name in names:
        if name not in known:
            raise OutsideValidity("columns", name, f"some of {', '.join(known)}")
    return names


def _refuse(asked: SweepAsked, names: Sequence[str], whose: str) -> None:
    for name in names:
        if getattr(asked, name) is not None:
            raise OutsideValidity(name, "given", f"this is a choice {whose}: leave it out")


def _check_size(context: Context, numbers: int) -> None:
    bound = context.settings.max_numbers
    if numbers > bound:
        detail = f"the answer would hold {numbers} numbers, more than {bound}"
        raise Problem("answer-too-large", detail, parameter="fields", given=numbers, allowed=f"{bound} numbers")


def _pieces(fields: Array, numbers_per_field: int, seconds: float) -> Iterator[Array]:
    """Cut a long grid so that little is held at a time; stop when the seconds are over."""
    until = time.monotonic() + seconds
    count = -(-fields.size * numbers_per_field // SOLVED_AT_ONCE)
    for piece in np.array_split(fields, count):
        if time.monotonic() > until:
            bound = f"{seconds:g} s"
            raise Problem("took-too-long", f"the sweep took more than {bound}", parameter="fields", allowed=bound)
        yield piece


def _taken(found: Any, attributes: Mapping[str, str], names: Sequence[str], at: list[int]) -> list[Array]:
    return [getattr(found, attributes[name])[:, at] for name in names]


def _joined(solved: list[list[Array]], names: Sequence[str]) -> dict[str, Column]:
    return {
        name: np.concatenate([part.ravel() for part in parts])
        for name, parts in zip(names, zip(*solved, strict=True), strict=True)
    }


QUESTION = Question(
    name="sweep",
    path="/v1/sweep",
    asked=SweepAsked,
    answered=SweepAnswered,
    ask=sweep,
    summary="Sublevels or components over a grid of fields",
    example="/v1/sweep",
    tag="field",
    body_example={
        "atom": "87Rb",
        "level": "5s_2S1/2",
        "fields": {"start": 0, "stop": 1000, "points": 11},
        "columns": ["energy_MHz", "slope_MHz_per_G"],
        "sublevels": ["1,-1", "2,1"],
    },
    heavy=True,
)
