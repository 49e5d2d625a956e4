"""A scheme over a grid of up to three parameters: the points, the changed schemes, and a row of numbers for each.

Everything here is plain data and top-level functions, so that points can be solved in any process, in any order: the
rows of a chunk do not depend on how a scan is cut into chunks.
"""

import itertools
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from levels.beams import LARGEST_INTENSITY, LARGEST_OFFSET_MHZ, Beam, Scheme, with_beam, with_field
from levels.errors import OutsideValidity
from levels.geometry import axes_of, polarisation_vector, transverse_basis
from levels.jones import ellipse_of, elliptical
from levels.pumping import prepare, solve
from levels.purity import tilted, with_impurity
from levels.records import Level
from levels.structure import Label, Structure, structure_of
from levels.sublevels import LARGEST_FIELD_GAUSS

Array = NDArray[np.float64]
LARGEST_SCAN = 1_000_000
MOST_PARAMETERS = 3


@dataclass(frozen=True, slots=True)
class Kind:
    """One thing that can be scanned: its unit, whether it belongs to a beam, its range, what it does."""

    name: str
    unit: str
    of_beam: bool
    low: float
    high: float
    meaning: str


KINDS = {
    kind.name: kind
    for kind in (
        Kind("field", "G", False, 0.0, LARGEST_FIELD_GAUSS, "magnitude, in the direction of the scheme's field"),
        Kind("field_angle", "deg", False, -360.0, 360.0, "turns the field from its direction towards x' of its frame"),
        Kind("detuning", "MHz", True, -LARGEST_OFFSET_MHZ, LARGEST_OFFSET_MHZ, "added to the beam's offset"),
        Kind("intensity", "mW/cm2", True, 0.0, LARGEST_INTENSITY, "of the beam"),
        Kind("ellipticity", "deg", True, -45.0, 45.0, "of the beam, its long axis as it was"),
        Kind("azimuth", "deg", True, -360.0, 360.0, "of the beam's long axis from its first transverse axis"),
        Kind("impurity", "1", True, 0.0, 1.0, "share of the beam's intensity in the orthogonal polarisation"),
    )
}


@dataclass(frozen=True, slots=True)
class Parameter:
    """One axis of the grid: a kind of `KINDS`, its values, and the beam it belongs to (if to any)."""

    kind: str
    values: tuple[float, ...]
    beam: str = ""


@dataclass(frozen=True, slots=True, eq=False)
class Rows:
    """Results of some points, in their order: parameters (n, p), and one number per point in each column.

    `target` is the share of atoms in the wanted sublevel, an empty array when none is wanted.
    """

    values: Array
    scattering_per_s: Array
    excited: Array
    target: Array
    lost_per_s: Array
    models: tuple[str, ...]


def check_parameters(scheme: Scheme, parameters: Sequence[Parameter]) -> int:
    """Check a grid and return how many points it has."""
    if not 1 <= len(parameters) <= MOST_PARAMETERS:
        raise OutsideValidity("parameters", len(parameters), f"from 1 to {MOST_PARAMETERS} parameters")
    names = [beam.name for beam in scheme.beams]
    for item in parameters:
        kind = KINDS.get(item.kind)
        if kind is None:
            raise OutsideValidity("parameter", item.kind, f"one of {', '.join(KINDS)}")
        if kind.of_beam and item.beam not in names:
            raise OutsideValidity("beam", item.beam, f"one of {', '.join(names)}")
        wrong = next((value for value in item.values if not kind.low <= value <= kind.high), None)
        if wrong is not None or not item.values:
            allowed = f"at least one value from {kind.low:g} to {kind.high:g} {kind.unit}"
            raise OutsideValidity(item.kind, "none" if wrong is None else wrong, allowed)
    size = int(np.prod([len(item.values) for item in parameters], dtype=np.int64))
    if size > LARGEST_SCAN:
        raise OutsideValidity("grid", f"{size} points", f"at most {LARGEST_SCAN} points")
    return size


def points(parameters: Sequence[Parameter], first: int = 0, count: int | None = None) -> Iterator[tuple[float, ...]]:
    """Yield points of the grid in order, the last parameter fastest, from a first one on."""
    whole = itertools.product(*(item.values for item in parameters))
    return itertools.islice(whole, first, None if count is None else first + count)


def changed(scheme: Scheme, parameters: Sequence[Parameter], values: Sequence[float]) -> Scheme:
    """Return the scheme at one point of the grid."""
    for item, value in zip(parameters, values, strict=True):
        scheme = _changed(scheme, item, value)
    return scheme


def _changed(scheme: Scheme, item: Parameter, value: float) -> Scheme:
    if item.kind == "field":
        return with_field(scheme, value * axes_of(scheme.field_gauss).direction)
    if item.kind == "field_angle":
        return with_field(scheme, tilted(scheme.field_gauss, value))
    beam = next(beam for beam in scheme.beams if beam.name == item.beam)
    if item.kind == "detuning":
        return with_beam(scheme, item.beam, offset_mhz=beam.offset_mhz + value)
    if item.kind == "intensity":
        return with_beam(scheme, item.beam, intensity_mw_per_cm2=value)
    if item.kind == "impurity":
        return with_beam(scheme, item.beam, polarisation=with_impurity(beam, value).polarisation)
    return with_beam(scheme, item.beam, polarisation=_reshaped(beam, item.kind, value))


def _reshaped(beam: Beam, kind: str, value: float) -> NDArray[np.complex128]:
    basis = transverse_basis(beam.direction)
    ellipse = ellipse_of(basis @ beam.polarisation)
    shape = replace(ellipse, **{f"{kind}_deg": value})
    return polarisation_vector(beam.direction, tuple(elliptical(shape.ellipticity_deg, shape.azimuth_deg)))


def solve_points(
    scheme: Scheme,
    parameters: Sequence[Parameter],
    chunk: Sequence[Sequence[float]],
    *,
    target: tuple[Level, Label] | None = None,
    model: str = "auto",
) -> Rows:
    """Solve the steady state at some points of the grid; sublevels are solved once per field magnitude."""
    found = np.zeros((len(chunk), 4))
    models = []
    solved: dict[float, Structure] = {}
    for row, values in enumerate(chunk):
        here = changed(scheme, parameters, values)
        magnitude = axes_of(here.field_gauss).magnitude_gauss
        if magnitude not in solved:
            solved = {magnitude: structure_of(here.atom, [beam.line for beam in here.beams], magnitude)}
        outcome = solve(prepare(here, model, solved[magnitude]))
        structure = outcome.light.structure
        uppers = np.concatenate(
            [np.arange(part.upper.start, part.upper.stop) for part in outcome.light.drive.couplings]
        )
        wanted = 0.0 if target is None else outcome.populations[structure.position(*target)]
        excited = outcome.populations[np.unique(uppers)].sum()
        found[row] = outcome.scattering_per_s, excited, wanted, outcome.lost_per_s
        models.append(outcome.light.model)
    held = found[:, 2] if target is not None else np.empty(0)
    return Rows(np.array(chunk, dtype=np.float64), found[:, 0], found[:, 1], held, found[:, 3], tuple(models))
