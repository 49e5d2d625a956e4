"""What each beam drives: every component with its detuning and Rabi frequency, and other lines of the atom.

Detunings are laser minus component, in MHz; Rabi frequencies and widths are over 2 pi, in MHz. The scattering rate is
that of low saturation, Omega^2 Gamma/(Gamma^2 + 4 Delta^2), for an atom that sits in the lower sublevel; the laser's
linewidth adds to Gamma in the profile.
"""

from collections.abc import Iterable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from levels.beams import Beam, Scheme, reference_rabi_mhz
from levels.decays import decay_of, frequency_mhz_of
from levels.errors import OutsideValidity
from levels.geometry import Axes, Resolved, axes_of, resolve
from levels.records import Atom, Line
from levels.structure import Structure, structure_of

Array = NDArray[np.float64]
PER_US = 2 * np.pi  # MHz to rad/us
LARGEST_BEAMS = 24
FARTHEST_SHARE = 0.2  # of the frequency: beyond it the rotating-wave approximation says little


@dataclass(frozen=True, slots=True, eq=False)
class Coupling:
    """One beam on its line: matrices have shape (upper sublevels, lower sublevels)."""

    beam: Beam
    resolved: Resolved
    lower: slice
    upper: slice
    rabi_mhz: NDArray[np.complex128]
    detuning_mhz: Array
    width_mhz: Array  # of the profile: natural widths of both ends and the laser's

    @property
    def pump_per_us(self) -> Array:
        """Absorption rate of each component in 1/us, the same as its stimulated emission."""
        square = np.abs(self.rabi_mhz) ** 2
        rate: Array = PER_US * square * self.width_mhz / (self.width_mhz**2 + 4 * self.detuning_mhz**2)
        return rate

    @property
    def saturation(self) -> Array:
        """2 Omega^2/(Gamma^2 + 4 Delta^2) of each component."""
        result: Array = 2 * np.abs(self.rabi_mhz) ** 2 / (self.width_mhz**2 + 4 * self.detuning_mhz**2)
        return result


@dataclass(frozen=True, slots=True, eq=False)
class Drive:
    """A scheme with everything its light does, component by component."""

    scheme: Scheme
    axes: Axes
    structure: Structure
    couplings: tuple[Coupling, ...]


@dataclass(frozen=True, slots=True, eq=False)
class Driven:
    """The components that one beam drives, strongest first; all columns have shape (c,).

    `linewidths` is |detuning| in natural widths of the upper level; labels are doubled.
    """

    beam: Beam
    lower_twice_F: NDArray[np.int64]
    lower_twice_m: NDArray[np.int64]
    upper_twice_F: NDArray[np.int64]
    upper_twice_m: NDArray[np.int64]
    q: NDArray[np.int64]
    detuning_mhz: Array
    rabi_mhz: Array
    saturation: Array
    scattering_per_s: Array
    linewidths: Array
    wanted: NDArray[np.bool_]

    def unwanted_within(self, linewidths: float) -> NDArray[np.int64]:
        """Rows of the unwanted components whose detuning is at most so many natural widths."""
        return np.flatnonzero(~self.wanted & (self.linewidths <= linewidths))


@dataclass(frozen=True, slots=True)
class OtherLine:
    """Another line that a beam drives off resonance, for a component of unit strength."""

    line: Line
    detuning_mhz: float
    rabi_mhz: float
    scattering_per_s: float


def drive_of(scheme: Scheme, structure: Structure | None = None) -> Drive:
    """Work out what every beam of a scheme drives; a structure solved before (same lines and field) saves time."""
    if not 1 <= len(scheme.beams) <= LARGEST_BEAMS:
        raise OutsideValidity("beams", len(scheme.beams), f"from 1 to {LARGEST_BEAMS} beams")
    axes = axes_of(scheme.field_gauss)
    if structure is None:
        structure = structure_of(scheme.atom, [beam.line for beam in scheme.beams], axes.magnitude_gauss)
    return Drive(scheme, axes, structure, tuple(_couple(beam, axes, structure) for beam in scheme.beams))


def _couple(beam: Beam, axes: Axes, structure: Structure) -> Coupling:
    line = beam.line
    lower, upper = structure.slice_of(line.lower), structure.slice_of(line.upper)
    resolved = resolve(beam.direction, beam.polarisation, axes, line.multipole)
    q = (structure.twice_m[upper][:, None] - structure.twice_m[lower][None, :]) // 2
    amplitude = structure.amplitudes[line.name]
    inside = np.abs(q) <= line.rank
    geometry = np.where(inside, resolved.amplitudes[np.where(inside, q + line.rank, 0)], 0.0)
    geometry[np.abs(geometry) < 1e-12] = 0.0
    decay = structure.decays[structure.index_of(line.upper)]
    rabi = np.asarray(reference_rabi_mhz(line, decay, beam.intensity_mw_per_cm2) * geometry * amplitude, np.complex128)
    at = structure.energy_mhz[upper][:, None] - structure.energy_mhz[lower][None, :]
    width = structure.width_mhz[upper][:, None] + structure.width_mhz[lower][None, :] + beam.linewidth_mhz
    return Coupling(beam, resolved, lower, upper, rabi, beam.offset_mhz - at, width)


def components_driven(drive: Drive, beam_name: str) -> Driven:
    """List the components that a beam drives with what it does to each."""
    coupling = next((item for item in drive.couplings if item.beam.name == beam_name), None)
    if coupling is None:
        names = ", ".join(item.beam.name for item in drive.couplings)
        raise OutsideValidity("beam", beam_name, f"one of {names}")
    structure, beam = drive.structure, coupling.beam
    rate = coupling.pump_per_us * 1e6
    up, low = np.nonzero(coupling.rabi_mhz)
    order = np.argsort(-rate[up, low], kind="stable")
    up, low = up[order], low[order]
    at_low, at_up = low + coupling.lower.start, up + coupling.upper.start
    F, m = structure.twice_F, structure.twice_m
    q = (m[at_up] - m[at_low]) // 2
    detuning = coupling.detuning_mhz[up, low]
    return Driven(
        beam,
        F[at_low],
        m[at_low],
        F[at_up],
        m[at_up],
        q,
        detuning,
        np.abs(coupling.rabi_mhz[up, low]),
        coupling.saturation[up, low],
        rate[up, low],
        np.abs(detuning) / structure.width_mhz[at_up],
        _wanted(beam, q, F[at_low], F[at_up]),
    )


def _wanted(beam: Beam, q: NDArray[np.int64], low: NDArray[np.int64], up: NDArray[np.int64]) -> NDArray[np.bool_]:
    wanted = np.ones(q.size, dtype=np.bool_)
    if beam.wanted_q is not None:
        wanted &= q == beam.wanted_q
    if beam.wanted_F is not None:
        wanted &= (low == beam.wanted_F[0]) & (up == beam.wanted_F[1])
    return wanted


def other_lines(atom: Atom, beam: Beam, lower_levels: Iterable[str] | None = None) -> list[OtherLine]:
    """List the other lines of the atom that a beam drives off resonance, strongest first.

    With `lower_levels` only lines from these levels. Lines without a rate or further than a fifth of the laser's
    frequency are left out: there the rotating-wave approximation fails and the light shift tables are the better tool.
    """
    laser = frequency_mhz_of(beam.line) + beam.offset_mhz
    allowed = None if lower_levels is None else set(lower_levels)
    found = []
    for line in atom.lines:
        if line.name == beam.line.name or line.photons != 1 or line.multipole != "E1":
            continue
        decay = decay_of(atom, line.upper)
        if (allowed is not None and line.lower.name not in allowed) or not decay.is_timed or decay.rate_of(line) <= 0.0:
            continue
        detuning = laser - frequency_mhz_of(line)
        if abs(detuning) > FARTHEST_SHARE * laser:
            continue
        rabi = reference_rabi_mhz(line, decay, beam.intensity_mw_per_cm2)
        rate = 2e6 * np.pi * rabi**2 * decay.width_mhz / (decay.width_mhz**2 + 4 * detuning**2)
        found.append(OtherLine(line, detuning, rabi, float(rate)))
    return sorted(found, key=lambda item: -item.scattering_per_s)
