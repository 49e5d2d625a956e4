"""`magic`: where two sublevels shift alike, or one does not shift at all."""

from collections.abc import Mapping
from math import isnan
from typing import Literal

import numpy as np
from pydantic import Field

from levels.magic import Found, Side, Solution, magic_wavelengths, tune_outs
from levels.magicangles import at_insensitive_fields, azimuths, beam_angles, ellipticities, magic_fields
from levels.setting import Setting
from service.answers import Answer
from service.context import Context
from service.formats import Column, Table
from service.light import (
    PolarisedAsked,
    Wavelength,
    light_inputs,
    light_warnings,
    partners,
    setting_of,
)
from service.parameters import Half, LargestField, Name, Sublevel
from service.problems import Problem
from service.question import Question
from service.schemas import MaybeNumbers, Numbers, Shape, Tabular, Texts

NO_SLOPE = "not known for every solution; `reasons` says why"
ANGLES = {"ellipticity": ellipticities, "azimuth": azimuths, "beam_angle": beam_angles}
Unknown = Literal["wavelength", "tune-out", "ellipticity", "azimuth", "beam_angle", "field", "field_and_ellipticity"]


class MagicAsked(PolarisedAsked):
    """What is held, and what is solved for."""

    solve: Unknown = Field(
        "wavelength",
        description="what is solved for, everything else held; tune-out asks for wavelengths at which one sublevel (or "
        "scalar) does not shift",
        examples=["wavelength"],
    )
    level: Name = Field(description="level of the lower sublevel, as `5s_2S1/2`", examples=["5s_2S1/2"])
    lower: Sublevel | None = Field(
        None, description="lower sublevel F,m; without it the scalar polarisability of the level or of F counts"
    )
    F: Half | None = Field(None, description="hyperfine level of a scalar tune-out", examples=["2"])
    upper_level: Name | None = Field(None, description="level of the upper sublevel; the same level when left out")
    upper: Sublevel | None = Field(None, description="upper sublevel F,m; without it the scalar of its level counts")
    wavelength: Wavelength | None = Field(None, description="vacuum wavelength held, in nm or with a unit")
    start: Wavelength | None = Field(None, description="shortest wavelength looked at, when that is solved for")
    stop: Wavelength | None = Field(None, description="longest wavelength looked at")
    max_field: LargestField = Field(2000.0, description="largest field looked at, when that is solved for")


class MagicColumns(Shape):
    """One row for each solution: the whole setting, with what was solved for among it."""

    wavelength_nm: Numbers
    beam_angle_deg: Numbers
    ellipticity_deg: Numbers
    azimuth_deg: Numbers
    field_G: Numbers
    uncertainty: MaybeNumbers = Field(description="of the value solved for, in its unit")
    stated_uncertainty: Numbers = Field(description="the part that inputs with a stated uncertainty make")
    polarisability_a03: Numbers = Field(description="of the lower sublevel there; zero for a tune-out")
    per_nm_a03: Numbers = Field(description="slope of the difference (upper less lower) with the wavelength")
    per_ellipticity_deg_a03: Numbers
    per_azimuth_deg_a03: Numbers
    per_beam_angle_deg_a03: Numbers
    per_G_a03: Numbers
    vector_difference_a03: Numbers = Field(description="half the change of the difference from sigma- to sigma+")
    tensor_difference_a03: Numbers = Field(description="its change from the mean of sigma+ and sigma- to pi")
    insensitive_to_polarisation: list[bool]
    nearest_line: Texts
    detuning_GHz: MaybeNumbers = Field(description="light less the nearest line's centroid")


class MagicAnswered(Tabular):
    """Every solution in the range, or why there is none."""

    atom: str
    level: str
    upper_level: str
    solved_for: str
    unit: str = Field(description="of `uncertainty`")
    why_none: str = Field(
        description="why there is no solution, and whether uncertainty leaves room for one; empty when there is one"
    )
    proved: bool = Field(description="whether every zero that the sums over the catalogue's lines have is listed")
    reasons: Texts = Field(description="why uncertainties are null")
    columns: MagicColumns


UNITS = {"wavelength": "nm", "field": "G"}


def answer_magic(context: Context, path: Mapping[str, str], asked: MagicAsked) -> Answer:
    """Solves for wavelength, ellipticity, azimuth, beam angle or field at which the differential shift vanishes.

    Every solution in the range is listed, with how the difference moves away from zero there; or the answer says why
    there is none. Shifts are first order in the light. A tune-out is where one sublevel, or the scalar part of a level
    or of F, does not shift. `field_and_ellipticity` solves the ellipticity at each field, up to `max_field`, where the
    two sublevels do not move apart: insensitive to field and light at once. What the catalogue's lines leave out moves
    solutions far from resonance by much: look at `uncertainty` and `warnings`.
    """
    lower, upper = _sides(context, path["atom"], asked)
    setting = setting_of(asked, asked.wavelength or asked.start or 1000.0)
    found = _solved(lower, upper, setting, asked)
    solutions = found.solutions
    sides = [side.partners for side in (lower, upper) if side is not None]
    names = list(dict.fromkeys(side.level.name for side in sides))
    largest = asked.max_field if "field" in asked.solve else asked.field
    reasons = dict.fromkeys(reason for one in solutions for reason in one.reasons)
    unknown = {"tune-out": "wavelength", "field_and_ellipticity": "ellipticity"}.get(asked.solve, asked.solve)
    content = {
        "atom": upper.partners.level.atom,
        "level": sides[0].level.name,
        "upper_level": sides[-1].level.name,
        "solved_for": unknown,
        "unit": UNITS.get(unknown, "deg"),
        "why_none": found.why_none if not solutions else "",
        "proved": found.proved,
        "reasons": list(reasons),
    }
    columns, missing = _columns(solutions)
    return Answer(
        content,
        Table(columns, missing),
        used=light_inputs(*sides),
        warnings=[*context.level_grounds(path["atom"], *names).warnings(largest), *light_warnings(*sides)],
        uncertainty_excludes=list(dict.fromkeys(name for one in solutions for name in one.excludes)),
    )


def _sides(context: Context, atom: str, asked: MagicAsked) -> tuple[Side | None, Side]:
    below = partners(context, atom, asked.level)
    lower = Side(below, asked.lower, asked.F if asked.lower is None else None)
    if asked.solve == "tune-out":
        if asked.upper is not None or asked.upper_level is not None:
            detail = "a tune-out is of one sublevel: name it as `lower`"
            raise Problem("invalid-parameter", detail, parameter="upper", allowed="level, lower or F")
        return None, lower
    above = below if asked.upper_level is None else partners(context, atom, asked.upper_level)
    if (asked.lower is None) != (asked.upper is None) or (asked.upper is None and asked.upper_level is None):
        missing = "lower" if asked.lower is None else "upper"
        detail = "two sublevels are compared: name both, or neither and two levels for their scalar polarisabilities"
        raise Problem("missing-parameter", detail, parameter=missing, allowed="F,m such as 2,-1")
    return lower, Side(above, asked.upper)


def _solved(lower: Side | None, upper: Side, setting: Setting, asked: MagicAsked) -> Found:
    for side in (lower, upper):
        if side is not None:
            side.at(asked.field)  # a name that does not exist is told before anything else
    if asked.solve in ("wavelength", "tune-out"):
        if asked.start is None or asked.stop is None:
            missing = "start" if asked.start is None else "stop"
            raise Problem("missing-parameter", f"{missing} of the range is needed", parameter=missing, allowed="nm")
        if lower is None:
            return tune_outs(upper, setting, asked.start, asked.stop)
        return magic_wavelengths(lower, upper, setting, asked.start, asked.stop)
    if asked.wavelength is None:
        detail = f"the wavelength is held when {asked.solve} is solved for"
        raise Problem("missing-parameter", detail, parameter="wavelength", allowed="nm, or with a unit")
    if asked.solve == "field":
        return magic_fields(lower, upper, setting, asked.max_field)
    if asked.solve in ANGLES:
        return ANGLES[asked.solve](lower, upper, setting)
    return _at_insensitive(lower, upper, setting, asked.max_field)


def _at_insensitive(lower: Side | None, upper: Side, setting: Setting, max_field_gauss: float) -> Found:
    entries = [] if lower is None else at_insensitive_fields(lower, upper, setting, max_field_gauss)
    if not entries:
        return Found((), f"these two have no field-insensitive point up to {max_field_gauss:g} G")
    solutions = tuple(one for entry in entries for one in entry.solutions)
    return Found(solutions, "; ".join(entry.why_none for entry in entries if entry.why_none))


def _columns(solutions: tuple[Solution, ...]) -> tuple[dict[str, Column], dict[str, str]]:
    spreads = [one.uncertainty for one in solutions]
    columns: dict[str, Column] = {
        "wavelength_nm": [one.setting.wavelength_nm for one in solutions],
        "beam_angle_deg": [one.setting.beam_angle_deg for one in solutions],
        "ellipticity_deg": [one.setting.ellipticity_deg for one in solutions],
        "azimuth_deg": [one.setting.azimuth_deg for one in solutions],
        "field_G": [one.setting.field_gauss for one in solutions],
        "uncertainty": [None if isnan(spread) else spread for spread in spreads],
        "stated_uncertainty": [0.0 if isnan(one.stated) else one.stated for one in solutions],
        "polarisability_a03": [one.polarisability_a03 for one in solutions],
        "per_nm_a03": [one.slopes["wavelength"] for one in solutions],
        "per_ellipticity_deg_a03": [one.slopes["ellipticity"] for one in solutions],
        "per_azimuth_deg_a03": [one.slopes["azimuth"] for one in solutions],
        "per_beam_angle_deg_a03": [one.slopes["beam_angle"] for one in solutions],
        "per_G_a03": [one.slopes["field"] for one in solutions],
        "vector_difference_a03": [one.vector_a03 for one in solutions],
        "tensor_difference_a03": [one.tensor_a03 for one in solutions],
        "insensitive_to_polarisation": [one.insensitive for one in solutions],
        "nearest_line": [one.nearest_line for one in solutions],
        "detuning_GHz": [None if isnan(one.detuning_mhz) else one.detuning_mhz * 1e-3 for one in solutions],
    }
    missing = {"uncertainty": NO_SLOPE} if any(np.isnan(spreads)) else {}
    return columns, missing


QUESTION = Question(
    name="magic",
    path="/v1/atoms/{atom}/magic",
    asked=MagicAsked,
    answered=MagicAnswered,
    ask=answer_magic,
    summary="Magic conditions and tune-out wavelengths",
    example="/v1/atoms/87Rb/magic?solve=tune-out&level=5s_2S1/2&F=2&start=781&stop=794",
    tag="light",
    heavy=True,
)
