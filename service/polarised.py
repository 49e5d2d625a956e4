"""Polarisations along the field as columns, and numbers that are settings or have no uncertainty."""

from collections.abc import Iterable, Mapping, Sequence
from typing import Any

import numpy as np

from levels.beams import Beam
from levels.geometry import Axes, Resolved, best_jones, transverse_basis
from levels.jones import ellipse_of, plates_for
from levels.notation import format_polarisation
from levels.setup import Optics
from levels.structure import Structure
from service.answers import scalar
from service.formats import Column, Table, check_finite

NOT_PROPAGATED = "uncertainties are not propagated through the steady state"
AS_SET = "a setting of the laboratory, taken as exact"
GEOMETRY = "follows from directions and polarisations, which are taken as exact"
TINY = 1e-9
NO_AXIS = "circular light has no long axis"


def plain(value: float | None, unit: str, reason: str = NOT_PROPAGATED) -> dict[str, Any]:
    """A computed number without an uncertainty, and why it has none (or why there is no number)."""
    return scalar(value, None, unit, reason)


def columns(given: Mapping[str, Column]) -> dict[str, list[Any]]:
    """Columns as lists, checked to be finite."""
    check_finite(Table(given))
    return {name: column.tolist() if isinstance(column, np.ndarray) else list(column) for name, column in given.items()}


def joined(parts: Sequence[Mapping[str, Column]], names: Iterable[str]) -> dict[str, list[Any]]:
    """The columns of several parts, one after the other."""
    return columns({name: [cell for part in parts for cell in list(part[name])] for name in names})


def field_record(axes: Axes) -> dict[str, Any]:
    x, y, z = axes.direction.tolist()
    return {"magnitude": plain(axes.magnitude_gauss, "G", AS_SET), "x": x, "y": y, "z": z}


def first_axes(beam: Beam, optics: Optics) -> Any:
    """The transverse axes that a beam's polarisation is described on."""
    return transverse_basis(beam.direction, None if optics.reference is None else np.array(optics.reference))


def light_members(resolved: Resolved, jones: Any) -> dict[str, Any]:
    """Angle to the field, helicity and ellipse of a beam."""
    ellipse, helicity = ellipse_of(jones), float(np.clip(resolved.helicity, -1.0, 1.0))
    circular = 1.0 - abs(helicity) < TINY
    return {
        "angle_to_field": plain(resolved.angle_deg, "deg", GEOMETRY),
        "helicity": plain(helicity, "1", GEOMETRY),
        "ellipticity": plain(ellipse.ellipticity_deg, "deg", GEOMETRY),
        "azimuth": plain(None if circular else ellipse.azimuth_deg, "deg", NO_AXIS if circular else GEOMETRY),
    }


def xyz(name: str, vector: Any) -> dict[str, float]:
    """The components of a vector as members."""
    return dict(zip((f"{name}_x", f"{name}_y", f"{name}_z"), (vector + 0.0).tolist(), strict=True))


def polarisation_columns(name: str, resolved: Resolved, direction: Any, axes: Axes, optics: Optics) -> dict[str, Any]:
    """Fractions, amplitudes, and what is attainable with which wave plates after the beam's polariser."""
    qs = range(-resolved.rank, resolved.rank + 1)
    settings = [_plates(direction, axes, q, resolved, optics) for q in qs]
    return {
        "beam": [name] * len(qs),
        "q": list(qs),
        "polarisation": [format_polarisation(q) for q in qs],
        "fraction": resolved.fractions,
        "amplitude_re": resolved.amplitudes.real + 0.0,
        "amplitude_im": resolved.amplitudes.imag + 0.0,
        "attainable": resolved.attainable,
        "half_wave_deg": [half for half, _ in settings],
        "quarter_wave_deg": [quarter for _, quarter in settings],
    }


def _plates(
    direction: Any, axes: Axes, q: int, resolved: Resolved, optics: Optics
) -> tuple[float | None, float | None]:
    if resolved.attainable[q + resolved.rank] < TINY:
        return None, None
    reference = None if optics.reference is None else np.array(optics.reference)
    best = best_jones(direction, axes, q, resolved.multipole, reference)
    setting = plates_for(best, optics.polariser_deg or 0.0)
    return setting.half_wave_deg, setting.quarter_wave_deg


def sublevel_columns(structure: Structure, at: Any = slice(None)) -> dict[str, Any]:
    """The labels of sublevels."""
    names = np.array([level.name for level in structure.levels], dtype=object)
    return {
        "level": names[structure.level_index[at]].tolist(),
        "F": structure.twice_F[at] / 2,
        "m": structure.twice_m[at] / 2,
    }
