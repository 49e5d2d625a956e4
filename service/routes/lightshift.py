"""`lightshift`: what one light does to every sublevel of a level."""

from collections.abc import Mapping
from typing import Any

import numpy as np
from numpy.typing import NDArray
from pydantic import Field

from levels.dipoletrap import GaussianBeam, dipole_trap, make_beam
from levels.errors import NotPublished, OutsideValidity, UnknownName
from levels.lightshift import (
    Dressed,
    Light,
    Manifold,
    couple,
    dressed,
    fictitious_field_gauss,
    operator,
    shift_of,
)
from levels.notation import format_sublevel
from levels.partners import Partners, other_end
from levels.polarisability import Polarisability, hyperfine_levels, polarisability
from levels.records import Atom
from levels.scattering import Scattering, scattering
from levels.shiftspread import Diagonal, diagonal
from service.answers import Answer, uncertainty_columns
from service.context import Context
from service.formats import Column, Table
from service.light import (
    A03,
    Intensity,
    LightAsked,
    Power,
    Waist,
    doubted,
    excludes_of,
    fractions_of,
    left_out,
    light_inputs,
    light_warnings,
    partners,
    setting_of,
)
from service.lightshift_shapes import LightshiftAnswered, Trap
from service.parameters import Name, Sublevel
from service.problems import Problem
from service.question import Question

Complex = NDArray[np.complex128]
NAMES = ("scalar", "vector", "tensor")
NOTABLE_EXCITATION = 0.01
MOST_ELEMENTS = 20_000
NO_BEAM = "no power and waist were given"


class LightshiftAsked(LightAsked):
    """One light on one level."""

    level: Name = Field(description="level, as `5s_2S1/2`", examples=["5s_2S1/2"])
    intensity: Intensity | None = Field(
        None, description="intensity in mW/cm2 or with a unit; 1 mW/cm2 without intensity, power and waist"
    )
    power: Power | None = Field(None, description="power of a Gaussian beam, in mW or with a unit", examples=["1 W"])
    waist: Waist | None = Field(None, description="its 1/e2 radius at the focus, in um or with a unit", examples=["50"])
    waist_y: Waist | None = Field(None, description="the radius in the other direction; the same when left out")
    retro_reflected: bool = Field(False, description="whether the beam comes back on itself: a lattice, peak times 4")
    sublevel: Sublevel | None = Field(None, description="sublevel that the trap is for; the mean of all when left out")
    elements: bool = Field(False, description="whether the operator's off-diagonal elements are listed")


def answer_lightshift(context: Context, path: Mapping[str, str], asked: LightshiftAsked) -> Answer:
    """The shift of every sublevel, how much it scatters, and what the light makes of the level.

    Shifts are second order in the light, with both rotating terms, the hyperfine and Zeeman energies of both levels,
    and the remainder of the polarisability that the catalogue's lines leave out. `shift` is the diagonal of the
    effective operator; `dressed_shift` diagonalises it together with the sublevels' own energies, which matters where
    the light couples sublevels by more than they are apart. Uncertainties hold those of strengths, frequencies and
    remainder, not that of the intensity. With `power` and `waist` the answer has the trap at the focus.
    """
    whole, grounds = context.atom(path["atom"]), context.level_grounds(path["atom"], asked.level)
    side = partners(context, path["atom"], asked.level)
    setting, (intensity, beam) = setting_of(asked, asked.wavelength), _intensity(asked)
    light = setting.light(intensity)
    here, coupled = couple(side, asked.field)
    shift = operator(here, coupled, light, side.remainder.value)
    under, sums = dressed(here, shift), diagonal(side, here, coupled, light)
    spread = scattering(whole, side, here, coupled, light)
    of_level = polarisability(side, asked.wavelength)
    per_F = {F: polarisability(side, asked.wavelength, F) for F in hyperfine_levels(side.level)}
    at = _row(here, asked)
    columns, missing = _columns(here, shift, under, sums, spread, intensity)
    content = {
        "atom": side.level.atom,
        "level": side.level.name,
        "intensity_mW_per_cm2": intensity,
        "fractions": fractions_of(setting),
        "circularity": light.circularity,
        "polarisability": three(of_level),
        "hyperfine": [{"F": F / 2, **three(one)} for F, one in per_F.items()],
        "shares": _shares(side, of_level),
        "left_out": left_out(side),
        "fictitious_field": _fictitious(side, of_level, light),
        "trap": _trap(whole, beam, light, sums, spread, at, asked.sublevel),
        "elsewhere": [
            {"level": name, "rate_per_s": _of(rates, at), "interference": name not in spread.without_interference}
            for name, rates in spread.elsewhere.items()
        ],
        "elements": _elements(here, shift) if asked.elements else {key: [] for key in ELEMENTS},
    }
    return Answer(
        content,
        Table(columns, missing),
        used=light_inputs(side),
        warnings=[*grounds.warnings(asked.field), *light_warnings(side), *_cautions(under, sums, here)],
        uncertainty_excludes=excludes_of([sums.doubt, *of_level.doubts]),
    )


def _intensity(asked: LightshiftAsked) -> tuple[float, GaussianBeam | None]:
    """The intensity that the shifts are for, and the beam that makes it."""
    if asked.power is None and asked.waist is None:
        return 1.0 if asked.intensity is None else asked.intensity, None
    if asked.power is None or asked.waist is None:
        lacking = "power" if asked.power is None else "waist"
        raise Problem("missing-parameter", f"a beam needs power and waist; {lacking} is missing", parameter=lacking)
    if asked.intensity is not None:
        detail = "power and waist make the intensity"
        raise Problem("invalid-parameter", detail, parameter="intensity", allowed="intensity, or power and waist")
    beam = make_beam(asked.power, asked.waist, asked.waist_y, asked.retro_reflected)
    return beam.peak_intensity_mw_per_cm2, beam


def _row(here: Manifold, asked: LightshiftAsked) -> int | None:
    if asked.sublevel is None:
        return None
    if asked.sublevel not in here.labels:
        known = ", ".join(format_sublevel(*label) for label in here.labels[:3])
        given = format_sublevel(*asked.sublevel)
        raise UnknownName("sublevel", given, hint=f"{here.level.name} has {known} and so on")
    return here.labels.index(asked.sublevel)


def _of(rates: NDArray[np.float64], at: int | None) -> float:
    return float(rates.mean() if at is None else rates[at])


def three(found: Polarisability, at: int = 0) -> dict[str, Any]:
    """Scalar, vector and tensor at one wavelength."""
    rows = zip(NAMES, found.numbers[:, at], found.doubts, strict=True)
    return {name: doubted(float(number), doubt, A03, at) for name, number, doubt in rows}


def _shares(side: Partners, found: Polarisability) -> list[dict[str, Any]]:
    records = []
    for row, line in enumerate(side.lines):
        numbers = [None if np.isnan(part) else float(part) for part in found.shares[row, :, 0]]
        assert line.reduced_dipole is not None
        records.append(
            {
                "line": line.name,
                "other_level": other_end(side.level, line).name,
                "wavelength_nm": line.wavelength.value if line.wavelength else line.nominal_nm,
                "dipole_ea0": line.reduced_dipole.value,
                "strength_evidence": line.reduced_dipole.evidence,
                **{f"{name}_a03": number for name, number in zip(NAMES, numbers, strict=True)},
            }
        )
    return records


def _fictitious(side: Partners, found: Polarisability, light: Light) -> dict[str, Any]:
    vector = float(found.numbers[1, 0])
    reason = "the light is within a line" if np.isnan(vector) else ""
    try:
        field = fictitious_field_gauss(side.level, vector, light)
    except NotPublished as error:
        reason = error.hint if side.level.twice_J == 0 else str(error)
    if reason:
        return {"x_G": None, "y_G": None, "z_G": None, "reason": reason}
    return {"x_G": float(field[0]), "y_G": float(field[1]), "z_G": float(field[2]), "reason": ""}


def _trap(
    whole: Atom,
    beam: GaussianBeam | None,
    light: Light,
    sums: Diagonal,
    spread: Scattering,
    at: int | None,
    label: tuple[int, int] | None,
) -> dict[str, Any]:
    """The trap of one sublevel, or of the mean of all."""
    nothing: dict[str, Any] = dict.fromkeys(Trap.model_fields)
    of = "mean" if label is None else format_sublevel(*label)
    mass = whole.isotope.mass
    if beam is None or mass is None:
        return {**nothing, "of": of, "reason": NO_BEAM if beam is None else "the mass is not in the catalogue"}
    shift = shift_of(_of(sums.polarisability_a03, at), light.intensity_mw_per_cm2)
    rate = _of(spread.total, at)
    trap = dipole_trap(beam, light.wavelength_nm, shift, rate, mass.value)
    return {
        "of": of,
        "trapped": trap.trapped,
        "depth_MHz": trap.depth_mhz,
        "depth_uK": trap.depth_uk,
        "depth_recoils": trap.depth_recoils,
        "frequency_x_Hz": trap.frequency_x_hz,
        "frequency_y_Hz": trap.frequency_y_hz,
        "frequency_axial_Hz": trap.frequency_axial_hz,
        "rayleigh_range_um": trap.rayleigh_range_um,
        "sag_um": trap.sag_um,
        "opened_by_gravity": trap.tilted,
        "recoil_Hz": trap.recoil_hz,
        "scattering_per_s": rate,
        "heating_uK_per_s": trap.heating_uk_per_s,
        "reason": "" if trap.trapped else "the shift is positive: the focus repels",
    }


ELEMENTS = ("row_F", "row_m", "column_F", "column_m", "real_MHz", "imaginary_MHz")


def _elements(here: Manifold, shift: Complex) -> dict[str, Any]:
    """The off-diagonal elements above the diagonal that are more than rounding."""
    least = 1e-12 * float(np.abs(shift).max())
    rows, columns = np.nonzero(np.triu(np.abs(shift) > least, 1))
    if rows.size > MOST_ELEMENTS:
        raise OutsideValidity("elements", f"{rows.size} elements", f"at most {MOST_ELEMENTS}; leave elements out")
    labels = np.array(here.labels) / 2
    parts = (*labels[rows].T, *labels[columns].T, shift[rows, columns].real, shift[rows, columns].imag)
    return {name: part.tolist() for name, part in zip(ELEMENTS, parts, strict=True)}


def _columns(
    here: Manifold, shift: Complex, under: Dressed, sums: Diagonal, spread: Scattering, intensity: float
) -> tuple[dict[str, Column], dict[str, str]]:
    doubt, scale = sums.doubt, abs(shift_of(1.0, intensity))
    sigma, missing = uncertainty_columns(
        {
            "polarisability_uncertainty_a03": doubt.uncertainty,
            "shift_uncertainty_MHz": doubt.uncertainty * scale,
            "rayleigh_uncertainty_per_s": spread.uncertainty[0],
            "raman_uncertainty_per_s": spread.uncertainty[1],
        }
    )
    reason = "; ".join(doubt.reasons)
    missing = {name: reason if reason and "per_s" not in name else text for name, text in missing.items()}
    labels = np.array(here.labels) / 2
    beside = np.abs(shift - np.diag(np.diag(shift))).max(axis=1, initial=0.0)
    columns: dict[str, Column] = {
        "F": labels[:, 0],
        "m": labels[:, 1],
        "polarisability_a03": sums.polarisability_a03,
        "polarisability_uncertainty_a03": sigma["polarisability_uncertainty_a03"],
        "shift_MHz": np.diag(shift).real,
        "shift_uncertainty_MHz": sigma["shift_uncertainty_MHz"],
        "coupling_MHz": beside,
        "dressed_shift_MHz": under.shift_mhz,
        "overlap": under.overlap,
        "rayleigh_per_s": spread.rayleigh,
        "rayleigh_uncertainty_per_s": sigma["rayleigh_uncertainty_per_s"],
        "raman_per_s": spread.raman,
        "raman_uncertainty_per_s": sigma["raman_uncertainty_per_s"],
        "elsewhere_per_s": spread.total - spread.rayleigh - spread.raman,
        "excited": sums.excited,
    }
    return columns, missing


def _cautions(under: Dressed, sums: Diagonal, here: Manifold) -> list[str]:
    texts = []
    vague = np.nonzero(under.ambiguous())[0]
    if vague.size:
        names = ", ".join(format_sublevel(*here.labels[k]) for k in vague[:4])
        texts.append(
            f"the light mixes sublevels: the labels of {names} and perhaps others say little (overlap below 0.5)"
        )
    worst = float(sums.excited.max())
    if worst > NOTABLE_EXCITATION:
        texts.append(f"the light keeps up to {worst:.2g} of an atom excited: too close or too strong for a mere shift")
    return texts


QUESTION = Question(
    name="lightshift",
    path="/v1/atoms/{atom}/lightshift",
    asked=LightshiftAsked,
    answered=LightshiftAnswered,
    ask=answer_lightshift,
    summary="Light shift, scattering and trap of every sublevel",
    example="/v1/atoms/87Rb/lightshift?level=5s_2S1/2&wavelength=1064&polarisation=pi&field=1&power=1W&waist=50um",
    tag="light",
    heavy=True,
)
