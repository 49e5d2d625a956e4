"""`profile`: the shape of a line in a vapour."""

from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np
from pydantic import Field

from levels.errors import NotPublished, OutsideValidity
from levels.features import Features, centroid_offset
from levels.profile import profile
from service.answers import Answer
from service.context import Context
from service.formats import Column, Table
from service.measures import Megahertz
from service.problems import Problem
from service.question import Question
from service.routes.features import (
    NO_WIDTH,
    OTHER_CENTROID,
    CellAsked,
    cell_of,
    content_of_cell,
    used_of_cell,
    warnings_of_cell,
)
from service.schemas import Numbers, Shape, Tabular, Texts

MOST_POINTS = 20_000
MOST_PROFILES = 40_000_000


class ProfileAsked(CellAsked):
    """The absorption of a vapour over a grid."""

    start: Megahertz | None = Field(
        None,
        description="first offset from the reference centroid, in MHz; two Doppler widths below the line if left out",
    )
    stop: Megahertz | None = Field(None, description="last offset, included")
    points: int = Field(501, ge=2, le=MOST_POINTS, description="how many offsets")


class ProfileColumns(Shape):
    """The shape of the line."""

    offset_MHz: Numbers
    absorption_per_GHz: Numbers = Field(description="area 1 over all frequencies")


class ProfileAnswered(Tabular):
    """The absorption of a vapour over a grid."""

    element: str
    line: str
    reference_isotope: str
    left_out: Texts = Field(description="isotopes that are not part of it, each with the reason")
    columns: ProfileColumns


def answer_profile(context: Context, path: Mapping[str, str], asked: ProfileAsked) -> Answer:
    """The absorption of a vapour on one line as a sum of Voigt profiles, in columns.

    Isotopes whose frequency is not known relative to the reference isotope are left out and named.
    """
    cell = cell_of(context, path["element"], asked, crossovers=False)
    placed = [(item, centroid_offset(item.sample.line, cell.reference)) for item in cell.found]
    parts = [(item, moved[0]) for item, moved in placed if moved is not None and item.natural_mhz is not None]
    left_out = [f"{item.sample.isotope.name}: {OTHER_CENTROID}" for item, moved in placed if moved is None]
    left_out += [f"{item.sample.isotope.name}: {NO_WIDTH}" for item, _ in placed if item.natural_mhz is None]
    if not parts:
        raise NotPublished("frequency and lifetime", f"{cell.element} {cell.reference.name}", "; ".join(left_out))
    lines = sum(len(item.dip) for item, _ in parts)
    if lines * asked.points > MOST_PROFILES:
        bound = f"{MOST_PROFILES // lines} points for {lines} components"
        raise Problem("answer-too-large", f"at most {bound}", parameter="points", given=asked.points, allowed=bound)
    grid = _grid(parts, asked)
    columns: dict[str, Column] = {
        "offset_MHz": grid,
        "absorption_per_GHz": 1e3 * profile(parts, grid, asked.saturation),
    }
    content = {**content_of_cell(cell), "left_out": [*cell.left_out, *left_out]}
    return Answer(content, Table(columns), used=used_of_cell(cell), warnings=warnings_of_cell(cell, asked))


def _grid(parts: Sequence[tuple[Features, float]], asked: ProfileAsked) -> Any:
    margin = 2 * max(item.doppler_mhz for item, _ in parts)
    start, stop = asked.start, asked.stop
    if start is None:
        start = min(moved + float(item.offset_mhz.min()) for item, moved in parts) - margin
    if stop is None:
        stop = max(moved + float(item.offset_mhz.max()) for item, moved in parts) + margin
    if not start < stop:
        raise OutsideValidity("stop", stop, f"above start, which is {start:g} MHz")
    return np.linspace(start, stop, asked.points)


QUESTION = Question(
    name="profile",
    path="/v1/elements/{element}/profile",
    asked=ProfileAsked,
    answered=ProfileAnswered,
    ask=answer_profile,
    summary="The shape of a line in a vapour",
    example="/v1/elements/Rb/profile?line=780&temperature=295&points=201",
    tag="plan",
    heavy=True,
)
