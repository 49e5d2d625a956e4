"""`trapcheck`: does a magneto-optical trap trap, and does it cool?"""

import math
from collections.abc import Mapping
from typing import Annotated, Any

from pydantic import BeforeValidator, Field

from levels.trapcheck import LARGEST_GRADIENT, AxisCheck, check_trap
from service.answers import Answer
from service.beams import FieldVector, LightAsked, Triple, as_field
from service.context import Context
from service.formats import Table
from service.parameters import NUMBER_OR_TEXT, measure
from service.polarised import columns, plain
from service.question import Question
from service.schemas import Scalar, Shape, Tabular, Texts
from service.setups import laboratory, stretched, used_by, without_uncertainty

LINEAR = "a small-signal slope; uncertainties are not propagated"


class TrapcheckAsked(LightAsked):
    """Beams and coils; the field that is given comes on top of that of the coils."""

    field: Annotated[FieldVector, BeforeValidator(as_field)] = Field(
        FieldVector(vector=[0.0, 0.0, 0.0]), description="field besides that of the coils: [x, y, z] in gauss"
    )
    gradient: Annotated[float, measure("gradient", "G/cm", -LARGEST_GRADIENT, LARGEST_GRADIENT), NUMBER_OR_TEXT] = (
        Field(description="of the field along the coils' axis, in G/cm or with a unit; its sign is the current's sense")
    )
    coil_axis: Triple = Field([0.0, 0.0, 1.0], description="axis of the coils")
    ideal_repump: bool = Field(
        True, description="atoms that decay to levels no beam addresses come back at once; else they stay there"
    )


class AxisRecord(Shape):
    """One axis along which beams run."""

    x: float
    y: float
    z: float
    gradient: Scalar = Field(description="of the field along this axis")
    spring: Scalar = Field(description="acceleration towards the centre per displacement; negative pushes away")
    frequency: Scalar = Field(description="of the oscillation without damping; null where nothing restores")
    damping: Scalar = Field(description="deceleration per velocity; negative heats")
    spring_if_reversed: Scalar = Field(description="the spring with the handedness of this axis' beams reversed")
    traps: bool
    traps_if_reversed: bool
    cools: bool
    advice: str = Field(description="what would make it trap and cool; empty when it does")


class HelicityColumns(Shape):
    """The handedness of each beam."""

    beam: Texts
    axis: list[int] = Field(description="place of its axis in `axes`, from 1")
    helicity: list[float] = Field(description="mean photon spin along the beam, from -1 to 1")


class TrapcheckAnswered(Tabular):
    """Whether a trap traps and cools, axis by axis."""

    atom: str
    traps: bool
    cools: bool
    axes: list[AxisRecord]
    columns: HelicityColumns


def trapcheck(context: Context, path: Mapping[str, str], asked: TrapcheckAsked) -> Answer:
    """Whether a magneto-optical trap traps and cools, from the force of the actual beams on every sublevel, per axis.

    Handedness, current sense, detuning and the signs of both g factors are all in the force; no rule of thumb is used.
    The model is rate equations: sub-Doppler forces are left out, and for F' <= F (type II) dark superpositions, which
    weaken real traps; a warning says so.
    """
    lab = laboratory(context, asked)
    found = check_trap(
        lab.scheme, asked.gradient, (asked.coil_axis[0], asked.coil_axis[1], asked.coil_axis[2]),
        ideal_repump=asked.ideal_repump,
    )  # fmt: skip
    beams = [(name, k, spin) for k, axis in enumerate(found.axes, 1) for name, spin in axis.helicities.items()]
    names, places, spins = (list(column) for column in zip(*beams, strict=True))
    table = columns({"beam": names, "axis": places, "helicity": spins})
    used = used_by(lab.structure)
    return Answer(
        {
            "atom": lab.setup.atom.isotope.name,
            "traps": found.traps,
            "cools": found.cools,
            "axes": [_record(axis) for axis in found.axes],
        },
        Table(table),
        used=used,
        warnings=list(dict.fromkeys((*found.warnings, *lab.structure.notes, *stretched(lab.structure)))),
        uncertainty_excludes=without_uncertainty(used),
    )


def _record(axis: AxisCheck) -> dict[str, Any]:
    x, y, z = (axis.axis + 0.0).tolist()
    spring = axis.frequency_per_s2
    restores = spring > 0.0
    return {
        "x": x,
        "y": y,
        "z": z,
        "gradient": plain(axis.gradient_gauss_per_cm, "G/cm", LINEAR),
        "spring": plain(spring, "1/s2", LINEAR),
        "frequency": plain(
            math.sqrt(spring) / (2 * math.pi) if restores else None, "Hz", LINEAR if restores else "nothing restores"
        ),
        "damping": plain(axis.damping_per_s, "s-1", LINEAR),
        "spring_if_reversed": plain(axis.if_reversed_per_s2, "1/s2", LINEAR),
        "traps": axis.traps,
        "traps_if_reversed": axis.traps_reversed,
        "cools": axis.cools,
        "advice": axis.advice,
    }


def _beam(name: str, direction: list[float], handedness: str) -> dict[str, Any]:
    return {
        "name": name,
        "line": "780",
        "component": "2-3",
        "detuning": -10,
        "direction": direction,
        "polarisation": {"handedness": handedness},
        "saturation": 0.3,
    }


QUESTION = Question(
    name="trapcheck",
    path="/v1/trapcheck",
    asked=TrapcheckAsked,
    answered=TrapcheckAnswered,
    ask=trapcheck,
    summary="Does this magneto-optical trap trap, and does it cool?",
    example="/v1/trapcheck",
    tag="scheme",
    body_example={
        "atom": "87Rb",
        "gradient": 10,
        "beams": [
            _beam("up", [0, 0, 1], "right"),
            _beam("down", [0, 0, -1], "right"),
            _beam("right", [1, 0, 0], "left"),
            _beam("left", [-1, 0, 0], "left"),
            _beam("forward", [0, 1, 0], "left"),
            _beam("back", [0, -1, 0], "left"),
        ],
    },
    heavy=True,
)
