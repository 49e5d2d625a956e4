"""From a described scheme to the library's: names found in the catalogue, units taken off, provenance collected."""

from collections.abc import Iterable
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from levels.beams import Scheme
from levels.errors import OutsideValidity, UnknownName
from levels.geometry import axes_of, direction_from_angles
from levels.jones import WAVES, Plate
from levels.multiplet import caution
from levels.quantity import Quantity
from levels.records import Level
from levels.setup import BeamSetup, Optics, Setup, Share, Triple, Tuning, build
from levels.structure import Label, Structure, structure_of
from service import beams as asked_for
from service.context import Context
from service.inputs import level_inputs

THZ = 1e6


@dataclass(frozen=True)
class Laboratory:
    """A scheme as it was asked for, with the records it names."""

    setup: Setup
    target: tuple[Level, Label] | None = None
    initial: tuple[Share, ...] = ()

    @cached_property
    def scheme(self) -> Scheme:
        """The library's scheme."""
        return build(self.setup)

    @cached_property
    def structure(self) -> Structure:
        """All sublevels that light and decays reach."""
        lines = [beam.line for beam in self.setup.beams]
        return structure_of(self.setup.atom, lines, float(np.linalg.norm(self.setup.field_gauss)))


def laboratory(context: Context, asked: asked_for.LightAsked) -> Laboratory:
    """Find every name of a described scheme."""
    atom = context.atom(asked.atom)
    beams = tuple(_beam(context, asked.atom, beam, place) for place, beam in enumerate(asked.beams))
    setup = Setup(atom, beams, field_gauss(asked.field))
    if not isinstance(asked, asked_for.SchemeAsked):
        return Laboratory(setup)
    target = None
    if asked.target is not None:
        target = (context.level(asked.atom, asked.target.level), asked.target.sublevel)
    shares = (Share(context.level(asked.atom, one.level), one.sublevel, one.share) for one in asked.initial)
    return Laboratory(setup, target, tuple(shares))


def field_gauss(asked: asked_for.FieldVector) -> Triple:
    """The field as a laboratory vector in gauss."""
    if (asked.vector is None) == (asked.magnitude is None):
        given = "nothing" if asked.vector is None else "both"
        raise OutsideValidity("field", given, "either three components or a magnitude with polar and azimuth")
    if asked.vector is not None:
        return (asked.vector[0], asked.vector[1], asked.vector[2])
    direction = direction_from_angles(axes_of((0.0, 0.0, 1.0)), asked.polar, asked.azimuth)
    x, y, z = (float(part) for part in (asked.magnitude or 0.0) * direction)
    return (x, y, z)


def triple(given: list[float] | None) -> Triple | None:
    """Three numbers as the library takes them."""
    return None if given is None else (given[0], given[1], given[2])


def optics_of(asked: asked_for.Polarisation) -> Optics:
    """A polarisation as the library takes it."""
    return Optics(
        jones=None if asked.jones is None else (asked.jones[0], asked.jones[1]),
        vector=None if asked.vector is None else (asked.vector[0], asked.vector[1], asked.vector[2]),
        linear_deg=asked.linear,
        ellipticity_deg=asked.ellipticity,
        azimuth_deg=asked.azimuth,
        handedness=asked.handedness,
        convention=asked.convention,
        polariser_deg=asked.polariser,
        plates=tuple(_plate(one) for one in asked.plates),
        best_q=asked.best_for,
        impurity=asked.impurity,
        phase_deg=asked.phase,
        reference=triple(asked.reference),
    )


def _plate(asked: asked_for.Plate) -> Plate:
    if (asked.kind is None) == (asked.waves is None):
        raise OutsideValidity("plates", "nothing" if asked.kind is None else "both", "either kind or waves")
    return Plate(WAVES[asked.kind] if asked.kind is not None else float(asked.waves or 0.0), asked.angle)


def _beam(context: Context, atom: str, asked: asked_for.BeamAsked, place: int) -> BeamSetup:
    try:
        line = context.line(atom, asked.line)
    except UnknownName as error:
        raise UnknownName(f"beams.{place}.line", error.given, error.nearest, error.hint) from None
    try:
        optics = optics_of(asked.polarisation)
    except OutsideValidity as error:
        raise OutsideValidity(f"beams.{place}.polarisation.{error.parameter}", error.given, error.allowed) from None
    frequency = None if asked.frequency is None else asked.frequency * THZ
    return BeamSetup(
        asked.name,
        line,
        optics,
        Tuning(asked.detuning, asked.component, asked.lower, asked.upper, frequency),
        triple(asked.direction),
        asked.angle_to_field,
        asked.around_field,
        asked.intensity,
        asked.saturation,
        asked.power,
        asked.waist,
        asked.linewidth,
        asked.wanted,
        asked.wanted_component,
    )


def used_by(structure: Structure) -> list[tuple[str, Quantity]]:
    """The curated inputs of everything that happens on these levels: constants, frequencies, lifetimes, branchings."""
    used = [item for level in structure.levels for item in (*level_inputs(level), *_decay_inputs(level))]
    for line in structure.lines:
        named = (
            ("centroid", line.centroid),
            ("branching", line.branching),
            ("Einstein A", line.einstein_A if line.branching is None else None),
        )
        used += [(f"{name} of {line.name}", value) for name, value in named if value is not None]
    mass = structure.atom.isotope.mass
    return used if mass is None else [*used, (f"mass of {structure.atom.isotope.name}", mass)]


def _decay_inputs(level: Level) -> Iterable[tuple[str, Quantity]]:
    if level.lifetime is not None:
        yield f"lifetime of {level.name}", level.lifetime
    elif level.width is not None:
        yield f"width of {level.name}", level.width


def stretched(structure: Structure) -> list[str]:
    """Where the model of the levels is stretched at this field."""
    field = structure.magnitude_gauss
    return list(dict.fromkeys(text for level in structure.levels for text in caution(level, field)))


def without_uncertainty(used: Iterable[tuple[str, Quantity]]) -> list[str]:
    """The inputs that state no uncertainty."""
    return [name for name, quantity in used if quantity.uncertainty is None]
