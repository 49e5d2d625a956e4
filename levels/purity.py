"""How clean the polarisation and how straight the field must be for optical pumping.

The impurity is the share of one beam's intensity in the orthogonal polarisation; the misalignment is an angle by which
the field leaves its direction, about an axis across it. A circular beam along the field with impurity e and misaligned
by theta drives the wrong sigma with e + theta^4/16 and pi with theta^2/2 of its intensity, for small ones.
"""

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import ArrayLike, NDArray

from levels.beams import Beam, Scheme, with_field
from levels.errors import OutsideValidity
from levels.geometry import axes_of
from levels.pumping import prepare, solve
from levels.records import Level
from levels.remedies import orthogonal
from levels.structure import Label

Array = NDArray[np.float64]
LARGEST_GRID = 2000


@dataclass(frozen=True, slots=True, eq=False)
class Purity:
    """Share of the atoms in the target over impurities (rows) and misalignments (columns), and their scattering."""

    impurities: Array
    misalignments_deg: Array
    purity: Array
    scattering_per_s: Array


def with_impurity(beam: Beam, impurity: float) -> Beam:
    """Return the beam with a share of its intensity in the orthogonal polarisation, in phase with its own."""
    if not 0.0 <= impurity <= 1.0:
        raise OutsideValidity("impurity", impurity, "a share of the intensity from 0 to 1")
    mixed = np.sqrt(1.0 - impurity) * beam.polarisation + np.sqrt(impurity) * orthogonal(beam)
    return replace(beam, polarisation=mixed)


def tilted(field_gauss: ArrayLike, angle_deg: float) -> Array:
    """Return the field turned by an angle, towards x' of its own frame (`geometry.axes_of`)."""
    axes = axes_of(field_gauss)
    angle = np.radians(angle_deg)
    turned: Array = axes.magnitude_gauss * (np.cos(angle) * axes.frame[2] + np.sin(angle) * axes.frame[0])
    return turned


def purity_against(
    scheme: Scheme,
    level: Level,
    target: Label,
    impurities: Sequence[float],
    misalignments_deg: Sequence[float],
    beam_name: str | None = None,
) -> Purity:
    """Predict the share of atoms in a sublevel over impurity of one beam (all, when not named) and misalignment.

    The sublevel is that along the turned field: atoms follow a field that turns slowly.
    """
    rows, columns = np.array(impurities, dtype=np.float64), np.array(misalignments_deg, dtype=np.float64)
    if not 1 <= rows.size * columns.size <= LARGEST_GRID:
        raise OutsideValidity("grid", f"{rows.size} x {columns.size}", f"from 1 to {LARGEST_GRID} points")
    purity, scattering = np.empty((rows.size, columns.size)), np.empty((rows.size, columns.size))
    for k, impurity in enumerate(rows):
        beams = tuple(
            with_impurity(beam, float(impurity)) if beam_name in (None, beam.name) else beam for beam in scheme.beams
        )
        for n, angle in enumerate(columns):
            changed = with_field(replace(scheme, beams=beams), tilted(scheme.field_gauss, float(angle)))
            outcome = solve(prepare(changed))
            purity[k, n] = outcome.populations[outcome.light.structure.position(level, target)]
            scattering[k, n] = outcome.scattering_per_s
    return Purity(rows, columns, purity, scattering)
