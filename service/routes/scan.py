"""`scan`: a scheme over a grid of up to three parameters, in rows as they come."""

from collections.abc import AsyncIterator, Mapping
from typing import Annotated, Any, Literal

import numpy as np
from numpy.typing import NDArray
from pydantic import BeforeValidator, Field

from levels.errors import OutsideValidity
from levels.grid import COLUMNS, Cell, Piece, Scan, check_scan
from levels.notation import shown
from levels.quantity import convert, parse_quantity_input
from levels.units import CANONICAL, UNITS
from levels.vary import MOST_AXES, PARAMETERS, Axis
from service.answers import Answer, unit_suffix
from service.beams import SchemeAsked
from service.context import Context
from service.formats import Column, Table
from service.parameters import NUMBER_OR_TEXT, Name
from service.problems import Problem
from service.question import Question, Strict
from service.routes.scheme import EXAMPLE
from service.scans import Scans
from service.schemas import Answered, Missing, Shape
from service.setups import laboratory, stretched, used_by, without_uncertainty

Array = NDArray[np.float64]
ParameterName = Literal[
    "field_magnitude",
    "field_polar",
    "field_azimuth",
    "misalignment",
    "field_from_polarisation",
    "detuning",
    "intensity",
    "saturation",
    "power",
    "linewidth",
    "linear",
    "ellipticity",
    "azimuth",
    "impurity",
    "polariser",
    "plate",
    "angle_to_field",
]
ColumnName = Literal[
    "scattering_per_s",
    "excited",
    "lost_per_s",
    "fullest",
    "fullest_share",
    "unique",
    "purity",
    "pumping_time_us",
    "pumping_photons",
    "heating_uK",
    "photons_before_loss",
    "time_before_loss_us",
]
MISSING = "does not exist at this point: nothing changes, or nothing leaves"
LISTED = 100_000
CHANGES = "; ".join(f"{row.name} ({row.unit}): {row.meaning}" for row in PARAMETERS.values())
COMPUTES = "; ".join(f"{row.name}: {row.meaning}" for row in COLUMNS.values())


def _value(given: Any) -> float | str:
    if isinstance(given, bool) or not isinstance(given, (int, float, str)):
        raise OutsideValidity("value", shown(str(given)), "a number in the parameter's unit, or text with its unit")
    return given


Value = Annotated[Any, BeforeValidator(_value), NUMBER_OR_TEXT]  # which unit it is in depends on the parameter


class GridAxis(Strict):
    """One axis: a parameter and its values, in its own unit or as text with a unit."""

    parameter: ParameterName = Field(description=f"what changes: {CHANGES}")
    beam: Name | None = Field(None, description="whose it is, where it is a beam's")
    plate: int = Field(1, ge=1, le=10, strict=True, description="of `plate`: which of the beam's wave plates, from 1")
    start: Value | None = Field(None, description="first value")
    stop: Value | None = Field(None, description="last value, included")
    points: int | None = Field(None, ge=1, le=1_000_000, strict=True, description="how many values")
    logarithmic: bool = Field(False, description="equal ratios instead of equal steps")
    values: list[Value] | None = Field(
        None, min_length=1, max_length=LISTED, description="the values themselves, instead"
    )

    def axis(self, where: str) -> Axis:
        """The library's axis."""
        unit = PARAMETERS[self.parameter].unit
        steps = (self.start, self.stop, self.points)
        if self.values is not None and steps == (None, None, None):
            values = np.array([in_unit(value, unit, where) for value in self.values])
        elif self.values is None and self.start is not None and self.stop is not None and self.points is not None:
            values = self._steps(in_unit(self.start, unit, where), in_unit(self.stop, unit, where), where)
        else:
            raise OutsideValidity(where, self.parameter, "either start, stop and points, or values")
        return Axis(self.parameter, values, self.beam or "", self.plate)

    def _steps(self, start: float, stop: float, where: str) -> Array:
        if not self.logarithmic:
            return np.linspace(start, stop, self.points or 1)
        if start * stop <= 0.0:
            raise OutsideValidity(where, f"{start:g} to {stop:g}", "two ends of one sign where steps are logarithmic")
        return np.geomspace(start, stop, self.points or 1)


def in_unit(given: float | str, unit: str, where: str) -> float:
    """A number in a parameter's unit, or text with any unit of its kind."""
    if not isinstance(given, str):
        return float(given)
    dimension = UNITS[unit].dimension
    return convert(parse_quantity_input(given, dimension, unit, where), CANONICAL[dimension], unit)


class ScanAsked(SchemeAsked):
    """A scheme and the grid to solve it on."""

    axes: list[GridAxis] = Field(
        min_length=1, max_length=MOST_AXES, description="up to three axes; the last one runs fastest"
    )
    columns: list[ColumnName] = Field(
        ["scattering_per_s"],
        min_length=1,
        max_length=len(COLUMNS),
        description=f"what to compute at each point: {COMPUTES}",
    )


class AxisRecord(Shape):
    """One axis as it was taken."""

    key: str = Field(description="its column")
    parameter: str
    beam: str
    plate: int
    unit: str
    meaning: str
    points: int


class ScanAnswered(Answered):
    """A row for each point; the columns are the axes, the model, and what was asked for."""

    atom: str
    points: int
    axes: list[AxisRecord]
    columns: dict[str, list[float | str | None]]
    missing: list[Missing]


def scan(context: Context, path: Mapping[str, str], asked: ScanAsked) -> Answer:
    """A scheme over a grid of up to three parameters: fields, detunings, polarisations, wave plates, intensities.

    Ask for NDJSON or CSV to get rows as they are solved. Every line of NDJSON has a `type`: `meta` comes at once, then
    `row` by row with `progress` between them, last `end`, or `error` with a problem; in CSV these stand on lines that
    begin with `#`. Closing the connection ends the scan. JSON comes whole when everything is solved.

    The scheme is set up in its own field first; then each axis changes one thing and leaves the rest of the laboratory
    as it is: lasers tuned to a Zeeman component do not follow the field.
    """
    job = job_of(context, asked)
    settings = context.settings
    if job.size > settings.max_scan_points:
        bound = f"{settings.max_scan_points} points"
        detail = f"the grid has {job.size} points, more than {bound}"
        raise Problem("answer-too-large", detail, parameter="axes", given=job.size, allowed=bound)
    check_scan(job)
    lab = laboratory(context, asked)
    axes = list(zip(keys_of(job), job.axes, strict=True))
    used = used_by(lab.structure)
    return Answer(
        {"atom": lab.setup.atom.isotope.name, "points": job.size, "axes": [_record(key, axis) for key, axis in axes]},
        used=used,
        warnings=list(dict.fromkeys((*lab.structure.notes, *stretched(lab.structure)))),
        uncertainty_excludes=without_uncertainty(used),
    )


def job_of(context: Context, asked: ScanAsked) -> Scan:
    """What is asked for as the library's scan."""
    lab = laboratory(context, asked)
    axes = tuple(axis.axis(f"axes.{place}") for place, axis in enumerate(asked.axes))
    names = tuple(dict.fromkeys(asked.columns))
    return Scan(lab.setup, axes, names, lab.target, lab.initial, asked.model)


def keys_of(job: Scan) -> list[str]:
    """The column of each axis: its parameter and unit, with the axis' number where two axes have the same."""
    names = [axis.parameter for axis in job.axes]
    return [
        f"{name}{'' if names.count(name) == 1 else f'_{place}'}{unit_suffix(PARAMETERS[name].unit)}"
        for place, name in enumerate(names, 1)
    ]


def _record(key: str, axis: Axis) -> dict[str, Any]:
    row = PARAMETERS[axis.parameter]
    return {
        "key": key,
        "parameter": row.name,
        "beam": axis.beam,
        "plate": axis.plate,
        "unit": row.unit,
        "meaning": row.meaning,
        "points": int(axis.values.size),
    }


async def rows(scans: Scans, context: Context, asked: ScanAsked) -> AsyncIterator[Table]:
    """The rows of a scan, piece by piece."""
    job = job_of(context, asked)
    keys = keys_of(job)
    async for piece in scans.pieces(job):
        yield table_of(job, keys, piece)


def table_of(job: Scan, keys: list[str], piece: Piece) -> Table:
    """A piece as columns: where its points are, and what was found there."""
    places = np.unravel_index(np.arange(piece.start, piece.start + piece.size), job.shape)
    columns: dict[str, Column] = {
        key: axis.values[place] for key, axis, place in zip(keys, job.axes, places, strict=True)
    }
    columns.update({name: _column(cells) for name, cells in piece.columns.items()})
    missing = {name: MISSING for name, cells in piece.columns.items() if None in cells}
    return Table(columns, missing)


def _column(cells: list[Cell]) -> Column:
    return np.array(cells) if all(isinstance(cell, float) for cell in cells) else cells


QUESTION = Question(
    name="scan",
    path="/v1/scan",
    asked=ScanAsked,
    answered=ScanAnswered,
    ask=scan,
    summary="A scheme over a grid of up to three parameters",
    example="/v1/scan",
    tag="scheme",
    body_example={
        **EXAMPLE,
        "axes": [
            {"parameter": "field_magnitude", "values": [1, 3]},
            {"parameter": "detuning", "beam": "cooling", "start": -30, "stop": 0, "points": 4},
        ],
    },
    heavy=True,
    pieces=rows,
)
