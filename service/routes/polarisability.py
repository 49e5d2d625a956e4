"""`polarisability`: scalar, vector and tensor polarisability of a level against wavelength."""

from collections.abc import Mapping
from typing import Any

import numpy as np
from pydantic import Field

from levels.partners import Partners, other_end, static_scalar
from levels.polarisability import polarisability
from service.answers import Answer
from service.context import Context
from service.formats import Column, Table
from service.light import Wavelength, excludes_of, left_out, light_inputs, light_warnings, partners
from service.lightshift_shapes import PolarisabilityAnswered
from service.parameters import Half, Name
from service.problems import Problem
from service.question import Computed, Question
from service.routes.lightshift import NAMES, three

WITHIN = "the light is within a line, where the formula stops"


class PolarisabilityAsked(Computed):
    """A curve, or one wavelength."""

    level: Name = Field(description="level, as `5s_2S1/2`", examples=["5s_2S1/2"])
    F: Half | None = Field(None, description="one hyperfine level; the whole level when left out", examples=["2"])
    start: Wavelength = Field(description="first vacuum wavelength, in nm or with a unit", examples=["700"])
    stop: Wavelength | None = Field(None, description="last wavelength, included; only `start` when left out")
    points: int = Field(201, ge=2, le=100_000, description="wavelengths, in equal steps of wavelength")


def answer_polarisability(context: Context, path: Mapping[str, str], asked: PolarisabilityAsked) -> Answer:
    """The polarisability, summed over the catalogue's lines with both rotating terms, and what the sum leaves out.

    The shift of a sublevel in linear or circular light follows from it: -(E^2/4) [scalar + C vector m/2F + D tensor
    (3m^2 - F(F+1))/F(2F-1)], C the circularity along the field, D = (3p - 1)/2 with p the share of the light along the
    field. For a whole level F is J, and hyperfine structure is not resolved; with `F` every component of every line is
    at its own frequency.
    """
    side = partners(context, path["atom"], asked.level)
    found = polarisability(side, _wavelengths(asked, context), asked.F)
    still = polarisability(side, np.inf, asked.F)
    columns: dict[str, Column] = {"wavelength_nm": found.wavelength_nm}
    missing: dict[str, str] = {}
    for name, numbers, doubt in zip(NAMES, found.numbers, found.doubts, strict=True):
        spread = np.where(found.close, np.nan, doubt.uncertainty)
        columns[f"{name}_a03"] = _null(numbers)
        columns[f"{name}_uncertainty_a03"] = _null(spread)
        if found.close.any():
            missing[f"{name}_a03"] = WITHIN
        if np.isnan(spread).any():
            missing[f"{name}_uncertainty_a03"] = "; ".join(doubt.reasons) or WITHIN
    content = {
        "atom": side.level.atom,
        "level": side.level.name,
        "static": three(still),
        "shares": _shares(side),
        "left_out": left_out(side),
    }
    return Answer(
        content,
        Table(columns, missing),
        used=light_inputs(side),
        warnings=light_warnings(side),
        uncertainty_excludes=excludes_of(found.doubts),
    )


def _wavelengths(asked: PolarisabilityAsked, context: Context) -> Any:
    if asked.stop is None:
        return [asked.start]
    if asked.points * 7 > context.settings.max_numbers:
        bound = str(context.settings.max_numbers // 7)
        raise Problem(
            "answer-too-large", "the curve would be too long", parameter="points", given=asked.points, allowed=bound
        )
    return np.linspace(asked.start, asked.stop, asked.points)


def _null(numbers: Any) -> Column:
    return [None if np.isnan(item) else item for item in numbers.tolist()] if np.isnan(numbers).any() else numbers


def _shares(side: Partners) -> list[dict[str, Any]]:
    records = []
    for line in side.lines:
        assert line.reduced_dipole is not None
        records.append(
            {
                "line": line.name,
                "other_level": other_end(side.level, line).name,
                "wavelength_nm": line.wavelength.value if line.wavelength else line.nominal_nm,
                "dipole_ea0": line.reduced_dipole.value,
                "strength_evidence": line.reduced_dipole.evidence,
                "static_a03": static_scalar(side.level, line),
            }
        )
    return records


QUESTION = Question(
    name="polarisability",
    path="/v1/atoms/{atom}/polarisability",
    asked=PolarisabilityAsked,
    answered=PolarisabilityAnswered,
    ask=answer_polarisability,
    summary="Polarisability of a level against wavelength",
    example="/v1/atoms/87Rb/polarisability?level=5s_2S1/2&start=700&stop=900&points=201",
    tag="light",
    heavy=True,
)
