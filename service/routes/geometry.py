"""`geometry`: polarisations resolved along the field, without an atom."""

from collections.abc import Mapping
from typing import Annotated, Any, Literal

import numpy as np
from pydantic import BeforeValidator, Field

from levels.driven import LARGEST_BEAMS
from levels.errors import OutsideValidity
from levels.geometry import Axes, axes_of, polarisation_vector, resolve, transverse_basis
from levels.setup import direction_of, jones_of
from service.answers import Answer
from service.beams import Aimed, FieldVector, as_field
from service.context import Context
from service.formats import Table
from service.polarised import field_record, joined, light_members, polarisation_columns, xyz
from service.question import Computed, Question
from service.schemas import Scalar, Shape, Tabular
from service.scheme_shapes import FieldRecord, PolarisationColumns
from service.setups import field_gauss, optics_of, triple


class GeometryAsked(Computed):
    """Beams in a field."""

    field: Annotated[FieldVector, BeforeValidator(as_field)] = Field(
        description="magnetic field: [x, y, z] in gauss, or an object; only its direction counts"
    )
    beams: list[Aimed] = Field(min_length=1, max_length=LARGEST_BEAMS, description="directions and polarisations")
    multipole: Literal["E1", "M1", "E2", "E3"] = Field("E1", description="multipole of the line that is meant")


class AimRecord(Shape):
    """One beam's direction and light."""

    name: str
    direction_x: float
    direction_y: float
    direction_z: float
    angle_to_field: Scalar
    helicity: Scalar = Field(description="mean photon spin along the beam, from -1 to 1")
    ellipticity: Scalar = Field(description="from -45 (helicity -1) to 45 degrees")
    azimuth: Scalar = Field(description="long axis of the ellipse, from the first transverse axis")
    first_axis_x: float = Field(description="the first transverse axis, that angles of the polarisation count from")
    first_axis_y: float
    first_axis_z: float


class GeometryAnswered(Tabular):
    """What each beam looks like along the field."""

    multipole: str
    field: FieldRecord
    beams: list[AimRecord]
    columns: PolarisationColumns


def geometry(context: Context, path: Mapping[str, str], asked: GeometryAsked) -> Answer:
    """Each beam's sigma+, pi and sigma- along the field: fractions, complex amplitudes, and what is attainable.

    A beam across the field can never be pure sigma; `attainable` says how much this direction allows, and the plate
    angles (fast axes, half-wave plate first, after the beam's polariser or one along the first transverse axis) reach
    it. q = m' - m; positive helicity along the field is sigma+.
    """
    axes = axes_of(field_gauss(asked.field))
    records, parts = [], []
    for place, beam in enumerate(asked.beams):
        try:
            record, part = _beam(beam, axes, asked.multipole)
        except OutsideValidity as error:
            raise OutsideValidity(f"beams.{place}.{error.parameter}", error.given, error.allowed) from None
        records.append(record)
        parts.append(part)
    content = {"multipole": asked.multipole, "field": field_record(axes), "beams": records}
    return Answer(content, Table(joined(parts, PolarisationColumns.model_fields)))


def _beam(beam: Aimed, axes: Axes, multipole: str) -> tuple[dict[str, Any], dict[str, Any]]:
    optics = optics_of(beam.polarisation)
    direction = direction_of(triple(beam.direction), beam.angle_to_field, beam.around_field, axes)
    first, second = jones_of(optics, direction, axes, multipole)
    resolved = resolve(direction, polarisation_vector(direction, (first, second), optics.reference), axes, multipole)
    reference = None if optics.reference is None else np.array(optics.reference)
    basis = transverse_basis(direction, reference)
    record = {
        "name": beam.name,
        **xyz("direction", direction),
        **light_members(resolved, (first, second)),
        **xyz("first_axis", basis[0]),
    }
    return record, polarisation_columns(beam.name, resolved, direction, axes, optics)


QUESTION = Question(
    name="geometry",
    path="/v1/geometry",
    asked=GeometryAsked,
    answered=GeometryAnswered,
    ask=geometry,
    summary="Polarisations resolved along the field",
    example="/v1/geometry",
    tag="scheme",
    body_example={
        "field": [0, 0, 3.2],
        "beams": [
            {"name": "pump", "angle_to_field": 8.7, "polarisation": {"handedness": "right"}},
            {
                "name": "probe",
                "direction": [1, 0, 0],
                "polarisation": {
                    "polariser": 0,
                    "plates": [{"kind": "half", "angle": 22.5}, {"kind": "quarter", "angle": 0}],
                },
            },
        ],
    },
)
