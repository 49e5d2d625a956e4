"""What a checked scheme is answered with: records and columns made of the library's results."""

from collections.abc import Sequence
from typing import Any

import numpy as np

from levels.beams import Beam, reference_rabi_mhz, saturation_intensity
from levels.cycling import Cycling
from levels.darkstates import DarkState, stationary_dark
from levels.decays import driven_decay
from levels.driven import Coupling, Driven, other_lines
from levels.findings import Finding
from levels.notation import format_half, format_polarisation
from levels.pumping import Light, Outcome, Pumping
from levels.records import Atom
from levels.scheme import Verdict, held_in
from levels.setup import Optics
from levels.structure import Structure
from service.answers import finite
from service.polarised import (
    AS_SET,
    NOT_PROPAGATED,
    columns,
    first_axes,
    joined,
    light_members,
    plain,
    sublevel_columns,
    xyz,
)


def beam_record(atom: Atom, coupling: Coupling, driven: Driven, optics: Optics, linewidths: float) -> dict[str, Any]:
    """One beam as it was taken."""
    beam, line = coupling.beam, coupling.beam.line
    decay, axis = driven_decay(atom, line), first_axes(beam, optics)
    centroid = line.centroid
    frequency = None if centroid is None else (centroid.value + beam.offset_mhz) * 1e-6
    return {
        "name": beam.name,
        "line": line.name,
        "lower_level": line.lower.name,
        "upper_level": line.upper.name,
        "offset": plain(beam.offset_mhz, "MHz", AS_SET),
        "frequency": plain(frequency, "THz", AS_SET if centroid else "the line's frequency is not in the catalogue"),
        "intensity": plain(beam.intensity_mw_per_cm2, "mW/cm2", AS_SET),
        "saturation": plain(beam.intensity_mw_per_cm2 / saturation_intensity(line, decay), "1"),
        "rabi": plain(reference_rabi_mhz(line, decay, beam.intensity_mw_per_cm2), "MHz"),
        **light_members(coupling.resolved, axis @ beam.polarisation),
        **xyz("first_axis", axis[0]),
        "wanted": _wanted(beam),
        "unwanted_near": int(driven.unwanted_within(linewidths).size),
    }


def _wanted(beam: Beam) -> str:
    parts = []
    if beam.wanted_F is not None:
        parts.append(f"{format_half(beam.wanted_F[0])}-{format_half(beam.wanted_F[1])}")
    if beam.wanted_q is not None:
        parts.append(format_polarisation(beam.wanted_q))
    return " ".join(parts)


def component_columns(driven: Driven, linewidths: float) -> dict[str, Any]:
    """Every component that a beam drives."""
    rows, line = driven.q.size, driven.beam.line
    return {
        "beam": [driven.beam.name] * rows,
        "line": [line.name] * rows,
        "lower_level": [line.lower.name] * rows,
        "lower_F": driven.lower_twice_F / 2,
        "lower_m": driven.lower_twice_m / 2,
        "upper_level": [line.upper.name] * rows,
        "upper_F": driven.upper_twice_F / 2,
        "upper_m": driven.upper_twice_m / 2,
        "polarisation": [format_polarisation(q) for q in driven.q.tolist()],
        "detuning_MHz": driven.detuning_mhz,
        "detuning_linewidths": driven.linewidths,
        "rabi_MHz": driven.rabi_mhz,
        "saturation": driven.saturation,
        "scattering_per_s": driven.scattering_per_s,
        "wanted": driven.wanted.tolist(),
        "near": (driven.linewidths <= linewidths).tolist(),
    }


def other_line_columns(structure: Structure, beam: Beam) -> dict[str, Any]:
    """Other lines that a beam drives from the levels of the scheme."""
    found = other_lines(structure.atom, beam, [level.name for level in structure.levels])
    return {
        "beam": [beam.name] * len(found),
        "line": [item.line.name for item in found],
        "lower_level": [item.line.lower.name for item in found],
        "upper_level": [item.line.upper.name for item in found],
        "detuning_GHz": [item.detuning_mhz * 1e-3 for item in found],
        "rabi_MHz": [item.rabi_mhz for item in found],
        "scattering_per_s": [item.scattering_per_s for item in found],
    }


def population_columns(outcome: Outcome) -> dict[str, Any]:
    structure = outcome.light.structure
    return columns(
        {**sublevel_columns(structure), "energy_MHz": structure.energy_mhz, "population": outcome.populations}
    )


def line_columns(outcome: Outcome) -> dict[str, Any]:
    """Spontaneous photons by line."""
    return columns({"line": list(outcome.by_line), "photons_per_s": list(outcome.by_line.values())})


def manifold_records(verdict: Verdict) -> list[dict[str, Any]]:
    """Every lower hyperfine level with what light does there."""
    return [
        {
            "name": manifold.text(),
            "sublevels": manifold.size,
            "beams": list(manifold.names),
            "pump": plain(manifold.pump_per_us * 1e6, "s-1"),
            "dark_states": len(manifold.dark),
        }
        for manifold in verdict.manifolds
    ]


def dark_records(verdict: Verdict) -> list[dict[str, Any]]:
    """Every dark state, numbered through."""
    return [
        {
            "state": number,
            "manifold": text,
            "text": state.text(),
            "held": plain(held_in(verdict.outcome, state), "1"),
            "mixing": plain(state.mixing_mhz, "MHz"),
            "residual": plain(state.residual_per_us * 1e6, "s-1"),
            "stationary": state.is_stationary,
        }
        for number, (text, state) in enumerate(_dark_states(verdict), 1)
    ]


def _dark_states(verdict: Verdict) -> list[tuple[str, DarkState]]:
    return [(manifold.text(), state) for manifold in verdict.manifolds for state in manifold.dark]


def dark_columns(verdict: Verdict) -> dict[str, Any]:
    """The amplitudes of the dark states of hyperfine levels."""
    structure = verdict.light.structure
    parts = [
        _amplitudes(structure, number, [structure.position(state.level, label) for label in state.labels], state.vector)
        for number, (_, state) in enumerate(_dark_states(verdict), 1)
    ]
    return joined(parts, AMPLITUDES)


def shared_columns(light: Light) -> dict[str, Any]:
    """The amplitudes of the dark states that all lasers have together."""
    shared = stationary_dark(light.drive, light.frame) if light.model == "bloch" else []
    parts = [
        _amplitudes(light.structure, number, state.positions.tolist(), state.vector)
        for number, state in enumerate(shared, 1)
    ]
    return joined(parts, AMPLITUDES)


AMPLITUDES = ("state", "level", "F", "m", "amplitude_re", "amplitude_im")


def _amplitudes(structure: Structure, number: int, at: list[int], vector: Any) -> dict[str, Any]:
    return {
        "state": [number] * len(at),
        **sublevel_columns(structure, np.array(at)),
        "amplitude_re": vector.real + 0.0,
        "amplitude_im": vector.imag + 0.0,
    }


def pumping_record(pumping: Pumping, asked: bool) -> dict[str, Any]:
    """Optical pumping to one sublevel."""
    structure, populations = pumping.outcome.light.structure, pumping.outcome.populations
    fullest = int(np.argmax(populations))
    still = "" if pumping.mean_time_us is not None else "the share in the target does not change"
    large = "" if pumping.slowest_us is not None else "too many equations, or nothing changes"
    weightless = "" if pumping.heating_uk is not None else "the mass is not in the catalogue"
    return {
        "target": structure.name(pumping.target),
        "asked": asked,
        "purity": plain(pumping.purity, "1"),
        "mean_time": plain(pumping.mean_time_us, "us", still or NOT_PROPAGATED),
        "slowest_time": plain(pumping.slowest_us, "us", large or NOT_PROPAGATED),
        "photons": plain(pumping.photons, "1"),
        "recoils": plain(pumping.recoil_energies, "1"),
        "heating": plain(pumping.heating_uk, "uK", weightless or NOT_PROPAGATED),
        "fullest": structure.name(fullest),
        "fullest_share": plain(float(populations[fullest]), "1"),
    }


def cycling_record(cycling: Cycling | None, reason: str) -> dict[str, Any]:
    """Photons before an atom leaves the cycle, or why there is no such number."""
    if cycling is not None and cycling.photons is None:
        reason = cycling.reason
    photons = None if cycling is None else cycling.photons
    why = NOT_PROPAGATED if photons is not None else reason
    exits = () if cycling is None else cycling.exits
    return {
        "photons": plain(photons, "1", why),
        "per_photon": plain(None if cycling is None else cycling.per_photon, "1", why),
        "time": plain(None if cycling is None else cycling.time_us, "us", why),
        "exits": columns({"name": [way.name for way in exits], "share": [way.share for way in exits]}),
    }


def finding_records(findings: Sequence[Finding]) -> list[dict[str, Any]]:
    """The findings, worst first."""
    return [
        {
            "code": item.code,
            "severity": item.severity,
            "about": item.about,
            "text": item.text,
            "value": None if item.value is None else finite(item.value),
            "unit": item.unit,
            "change": item.change,
        }
        for item in findings
    ]
