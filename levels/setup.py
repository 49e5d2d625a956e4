"""A scheme as a laboratory describes it: beams by angles, wave plates, powers and detunings.

Everything a beam needs can be said in several ways. `build` takes exactly one of each and makes the `beams.Scheme`.
Angles from the field, best polarisations and Zeeman components refer to the field of the setup.
"""

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from levels.beams import (
    Beam,
    Scheme,
    intensity_of_power,
    intensity_of_saturation,
    make_beam,
    make_scheme,
    offset_of_component,
    offset_of_hyperfine,
)
from levels.errors import NotPublished, OutsideValidity, UnknownName
from levels.geometry import (
    Axes,
    Complex,
    Vector,
    as_direction,
    as_polarisation,
    axes_of,
    best_jones,
    direction_from_angles,
    polarisation_vector,
    transverse_basis,
)
from levels.jones import Plate, circular, elliptical, linear, through_plates, with_impurity
from levels.notation import format_half
from levels.pumping import populations_in
from levels.records import Atom, Level, Line
from levels.structure import Label, Structure

Triple = tuple[float, float, float]
POLARISED_BY = {
    "jones": "jones",
    "vector": "vector",
    "linear_deg": "linear",
    "ellipticity_deg": "ellipticity",
    "handedness": "handedness",
    "polariser_deg": "polariser",
    "best_q": "best_for",
}


@dataclass(frozen=True, slots=True)
class Optics:
    """How a beam's polarisation is made, in one of the ways of `POLARISED_BY`; angles as in `jones`.

    `impurity` is the share of the intensity in the orthogonal polarisation, with `phase_deg` to the rest. `reference`
    is the vector that the transverse axes are laid by (`geometry.transverse_basis`).
    """

    jones: tuple[complex, complex] | None = None
    vector: tuple[complex, complex, complex] | None = None
    linear_deg: float | None = None
    ellipticity_deg: float | None = None
    azimuth_deg: float = 0.0
    handedness: str | None = None
    convention: str = "helicity"
    polariser_deg: float | None = None
    plates: tuple[Plate, ...] = ()
    best_q: int | None = None
    impurity: float = 0.0
    phase_deg: float = 0.0
    reference: Triple | None = None


@dataclass(frozen=True, slots=True)
class Tuning:
    """Where a laser is: detuned from one of a hyperfine component F - F' without field (doubled), a Zeeman component
    (lower, upper) at the setup's field, or an absolute frequency; else from the line's centroid."""

    detuning_mhz: float = 0.0
    component: tuple[int, int] | None = None
    lower: Label | None = None
    upper: Label | None = None
    frequency_mhz: float | None = None


@dataclass(frozen=True, slots=True)
class BeamSetup:
    """One beam. Direction by vector or by angles from the field; brightness by intensity, saturation, or power and
    waist. What it is meant to drive (`wanted_q`, `wanted_F`) follows from the tuning where it is not said."""

    name: str
    line: Line
    optics: Optics
    tuning: Tuning = Tuning()
    direction: Triple | None = None
    angle_to_field_deg: float | None = None
    around_field_deg: float = 0.0
    intensity_mw_per_cm2: float | None = None
    saturation: float | None = None
    power_mw: float | None = None
    waist_mm: float | None = None
    linewidth_mhz: float = 0.0
    wanted_q: int | None = None
    wanted_F: tuple[int, int] | None = None


@dataclass(frozen=True, slots=True)
class Setup:
    """Beams on one atom in a field (a laboratory vector in gauss)."""

    atom: Atom
    beams: tuple[BeamSetup, ...]
    field_gauss: Triple


def build(setup: Setup) -> Scheme:
    """Make the scheme of a setup; what is wrong with a beam is told with the beam's place, as `beams.0.direction`."""
    axes = axes_of(setup.field_gauss)
    return make_scheme(setup.atom, [build_at(setup, k, axes) for k in range(len(setup.beams))], setup.field_gauss)


def build_at(setup: Setup, place: int, axes: Axes) -> Beam:
    """Make one beam of a setup, in the frame of its field."""
    try:
        return build_beam(setup.atom, setup.beams[place], axes)
    except OutsideValidity as error:
        raise OutsideValidity(f"beams.{place}.{error.parameter}", error.given, error.allowed) from error
    except UnknownName as error:
        raise UnknownName(f"beams.{place}.{error.kind}", error.given, error.nearest, error.hint) from error


def build_beam(atom: Atom, beam: BeamSetup, axes: Axes) -> Beam:
    """Make a beam of its description."""
    direction = direction_of(beam.direction, beam.angle_to_field_deg, beam.around_field_deg, axes)
    jones = jones_of(beam.optics, direction, axes, beam.line.multipole)
    wanted_q, wanted_F = _wanted(beam)
    return make_beam(
        beam.name,
        beam.line,
        direction,
        polarisation_vector(direction, (jones[0], jones[1]), beam.optics.reference),
        _offset(beam.line, beam.tuning, axes.magnitude_gauss),
        _intensity(atom, beam),
        linewidth_mhz=beam.linewidth_mhz,
        wanted_q=wanted_q,
        wanted_F=wanted_F,
    )


def direction_of(
    vector: Triple | None, angle_to_field_deg: float | None, around_field_deg: float, axes: Axes
) -> Vector:
    """Return a beam's direction as a unit vector, from a vector or from angles from the field."""
    if (vector is None) == (angle_to_field_deg is None):
        given = "nothing" if vector is None else "both"
        raise OutsideValidity("direction", given, "either a vector or an angle to the field")
    if angle_to_field_deg is not None:
        return direction_from_angles(axes, angle_to_field_deg, around_field_deg)
    return as_direction("direction", np.asarray(vector))


def jones_of(optics: Optics, direction: Vector, axes: Axes, multipole: str = "E1") -> Complex:
    """Return the Jones vector of a beam on its transverse axes, impurity included."""
    given = [spoken for name, spoken in POLARISED_BY.items() if getattr(optics, name) is not None]
    if len(given) != 1:
        allowed = f"exactly one of {', '.join(POLARISED_BY.values())}"
        raise OutsideValidity("polarisation", ", ".join(given) or "nothing", allowed)
    if optics.plates and optics.polariser_deg is None:
        raise OutsideValidity("polarisation", given[0], "a polariser in front of the wave plates")
    pure = _pure(optics, direction, axes, multipole)
    pure = pure / float(np.linalg.norm(pure))
    return with_impurity(pure, optics.impurity, optics.phase_deg) if optics.impurity else pure


def _pure(optics: Optics, direction: Vector, axes: Axes, multipole: str) -> Complex:
    if optics.linear_deg is not None:
        return linear(optics.linear_deg)
    if optics.ellipticity_deg is not None:
        return elliptical(optics.ellipticity_deg, optics.azimuth_deg)
    if optics.handedness is not None:
        return circular(optics.handedness, optics.convention)
    if optics.polariser_deg is not None:
        return through_plates(optics.polariser_deg, optics.plates)
    if optics.best_q is not None:
        return best_jones(direction, axes, optics.best_q, multipole, _array(optics.reference))
    basis = transverse_basis(direction, _array(optics.reference))
    if optics.vector is not None:
        vector: Complex = basis @ as_polarisation(direction, np.array(optics.vector))
        return vector
    pair = np.array(optics.jones, dtype=np.complex128)
    return np.asarray(basis @ polarisation_vector(direction, (pair[0], pair[1]), _array(optics.reference)))


def _array(triple: Triple | None) -> Vector | None:
    return None if triple is None else np.array(triple)


def _offset(line: Line, tuning: Tuning, magnitude_gauss: float) -> float:
    zeeman = tuning.lower is not None or tuning.upper is not None
    if (tuning.component is not None) + zeeman + (tuning.frequency_mhz is not None) > 1:
        raise OutsideValidity("detuning", "several references", "from a component, lower and upper, or a frequency")
    if tuning.component is not None:
        try:
            return offset_of_hyperfine(line, *tuning.component, tuning.detuning_mhz)
        except UnknownName as error:
            given = "-".join(format_half(twice) for twice in tuning.component)
            raise UnknownName("component", given, (), error.hint) from error
    if zeeman:
        if tuning.lower is None or tuning.upper is None:
            raise OutsideValidity("detuning", "one sublevel", "lower and upper sublevel together")
        return offset_of_component(line, tuning.lower, tuning.upper, magnitude_gauss, tuning.detuning_mhz)
    if tuning.frequency_mhz is None:
        return tuning.detuning_mhz
    if line.centroid is None:
        raise NotPublished("frequency", f"{line.atom} {line.name}", "give the detuning from a component instead")
    return tuning.frequency_mhz - line.centroid.value + tuning.detuning_mhz


def _intensity(atom: Atom, beam: BeamSetup) -> float:
    ways = (beam.intensity_mw_per_cm2, beam.saturation, beam.power_mw)
    if sum(way is not None for way in ways) != 1 or (beam.power_mw is None) != (beam.waist_mm is None):
        raise OutsideValidity("intensity", "", "exactly one of intensity, saturation, or power and waist")
    if beam.saturation is not None:
        return intensity_of_saturation(atom, beam.line, beam.saturation)
    if beam.power_mw is not None and beam.waist_mm is not None:
        return intensity_of_power(beam.power_mw, beam.waist_mm)
    return float(beam.intensity_mw_per_cm2 or 0.0)


def _wanted(beam: BeamSetup) -> tuple[int | None, tuple[int, int] | None]:
    tuning, q, F = beam.tuning, beam.wanted_q, beam.wanted_F
    if tuning.lower is not None and tuning.upper is not None:
        F = F or (tuning.lower[0], tuning.upper[0])
        q = (tuning.upper[1] - tuning.lower[1]) // 2 if q is None else q
    return q, F or tuning.component


@dataclass(frozen=True, slots=True)
class Share:
    """A share of the atoms to start with: in one sublevel, or spread evenly over a level."""

    level: Level
    label: Label | None
    share: float


def populations_of(structure: Structure, shares: Sequence[Share]) -> Vector | None:
    """Return the start populations that shares describe, or None for none: they must add up to 1."""
    if not shares:
        return None
    total = sum(item.share for item in shares)
    if abs(total - 1.0) > 1e-6 or min(item.share for item in shares) < 0.0:
        raise OutsideValidity("initial", f"a sum of {total:.6g}", "shares from 0 that add up to 1")
    populations = np.zeros(structure.size)
    for item in shares:
        if item.level.name not in {level.name for level in structure.levels}:
            names = ", ".join(level.name for level in structure.levels)
            raise OutsideValidity("initial", item.level.name, f"a level that light or decays reach: {names}")
        populations += item.share / total * populations_in(structure, item.level, item.label)
    return populations


def with_beam_setup(setup: Setup, place: int, beam: BeamSetup) -> Setup:
    """Return the setup with one beam described anew."""
    return replace(setup, beams=(*setup.beams[:place], beam, *setup.beams[place + 1 :]))
