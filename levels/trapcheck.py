"""Does a magneto-optical trap trap, and does it cool: the force of the actual beams, line by line and axis by axis.

The force on an atom at rest or moving is the sum over beams of hbar k times the net absorption rate, with the steady
populations of the rate equations in the field at that place: every sublevel, every beam, any F - F', so that the
handedness follows from the signs of both g factors without a rule. The field of the coils is
B = gradient (z along the axis, minus half of it across), plus the scheme's own field. Displacements and velocities are
small enough to stay linear: a tenth of a natural width of Zeeman or Doppler shift.

Left out are coherences between sublevels, hence sub-Doppler forces and, for F' <= F ("type II"), dark superpositions:
there only the upper level's Zeeman shift and the mixing by the other beams make a force, as Tarbutt, New J. Phys. 17,
015007 (2015) found with such rate equations, real traps are weaker still, and red detuning heats below the Doppler
limit.
"""

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import ArrayLike, NDArray

from levels.beams import Beam, Scheme
from levels.constants import MU_B_MHZ_PER_GAUSS, C, H, U
from levels.cycling import exits_of
from levels.decays import driven_decay, frequency_mhz_of
from levels.driven import Drive, drive_of
from levels.errors import NotPublished, OutsideValidity
from levels.geometry import as_direction
from levels.quantity import in_unit
from levels.rates import Rates, rates_of, steady_populations

Array = NDArray[np.float64]
SMALL_SHIFT_WIDTHS = 0.1
SMALLEST_GRADIENT, LARGEST_GRADIENT = 1e-6, 1e4  # G/cm
NOTABLE_SHARE = 1e-3  # of all beams' pushes per natural width of shift; below it a force is called zero


@dataclass(frozen=True, slots=True, eq=False)
class AxisCheck:
    """One axis: beams along it with their helicities, spring constant and damping per mass, and what they mean.

    `frequency_per_s2` is the acceleration per displacement (positive: restoring), `damping_per_s` the acceleration per
    velocity (positive: cooling). `if_reversed_per_s2` is the spring with the handedness of this axis' beams reversed.
    """

    axis: Array
    gradient_gauss_per_cm: float
    helicities: dict[str, float]
    frequency_per_s2: float
    damping_per_s: float
    if_reversed_per_s2: float
    traps: bool
    traps_reversed: bool
    cools: bool

    @property
    def advice(self) -> str:
        """What would make this axis trap and cool."""
        if not self.cools:
            return "tune the light to the other side of the resonance, then check the trapping again"
        if self.traps:
            return ""
        if self.traps_reversed:
            return "reverse the handedness of the beams along this axis, or the coil current"
        return "no restoring force with either handedness on this line"


@dataclass(frozen=True, slots=True, eq=False)
class TrapCheck:
    """All axes, and what the model leaves out."""

    axes: tuple[AxisCheck, ...]
    traps: bool
    cools: bool
    warnings: tuple[str, ...]


def coil_field(axis: ArrayLike, gradient_gauss_per_cm: float, position_cm: ArrayLike) -> Array:
    """Return the quadrupole field of two coils at a place; the gradient is that along the coils' axis, signed."""
    n, r = as_direction("coil axis", axis), np.asarray(position_cm, dtype=np.float64)
    field: Array = gradient_gauss_per_cm * (1.5 * (r @ n) * n - 0.5 * r)
    return field


def acceleration(scheme: Scheme, velocity_m_per_s: Array, *, ideal_repump: bool = True) -> Array:
    """Compute the acceleration in m/s2 of an atom with a velocity, in the scheme's field, from rate equations.

    With `ideal_repump` atoms that decay to levels no beam addresses come back at once; else they stay and feel nothing.
    """
    total: Array = beam_accelerations(scheme, velocity_m_per_s, ideal_repump).sum(axis=0)
    return total


def beam_accelerations(scheme: Scheme, velocity_m_per_s: Array, ideal_repump: bool) -> Array:
    """Compute what each beam adds to the acceleration, shape (beams, 3)."""
    beams = tuple(_shifted(beam, velocity_m_per_s) for beam in scheme.beams)
    drive = drive_of(replace(scheme, beams=beams))
    rates = rates_of(drive)
    keep = np.arange(rates.size)
    if ideal_repump:
        keep = np.flatnonzero(~exits_of(drive))
        matrix = rates.matrix[np.ix_(keep, keep)]
        rates = Rates(matrix, rates.emission[np.ix_(keep, keep)], np.maximum(-matrix.sum(axis=0), 0.0))
    populations = np.zeros(drive.structure.size)
    populations[keep] = steady_populations(rates, np.full(keep.size, 1.0 / keep.size))[0]
    return _pushes(drive, populations)


def _shifted(beam: Beam, velocity_m_per_s: Array) -> Beam:
    doppler = -float(beam.direction @ velocity_m_per_s) / C * frequency_mhz_of(beam.line)
    return replace(beam, offset_mhz=beam.offset_mhz + doppler)


def _pushes(drive: Drive, populations: Array) -> Array:
    mass = drive.structure.atom.isotope.mass
    if mass is None:
        raise NotPublished("mass", drive.structure.atom.isotope.name)
    kilograms = in_unit(mass, "u").value * U
    pushes = []
    for item in drive.couplings:
        gap = populations[item.lower][None, :] - populations[item.upper][:, None]
        photons_per_s = float(np.sum(item.pump_per_us * gap)) * 1e6
        pushes.append(H * frequency_mhz_of(item.beam.line) * 1e6 / C * photons_per_s / kilograms * item.beam.direction)
    return np.array(pushes)


def check_trap(
    scheme: Scheme, gradient_gauss_per_cm: float, coil_axis: ArrayLike = (0.0, 0.0, 1.0), *, ideal_repump: bool = True
) -> TrapCheck:
    """Check a magneto-optical trap: every axis along which beams run, for trapping and cooling.

    The gradient is d(B along the coil axis)/d(position along it), its sign that of the coils' current sense.
    """
    if not SMALLEST_GRADIENT <= abs(gradient_gauss_per_cm) <= LARGEST_GRADIENT:
        allowed = f"from {SMALLEST_GRADIENT:g} to {LARGEST_GRADIENT:g} G/cm in size"
        raise OutsideValidity("gradient", gradient_gauss_per_cm, allowed)
    trap = _Trap(
        scheme, gradient_gauss_per_cm, as_direction("coil axis", coil_axis), ideal_repump, _scales(scheme, ideal_repump)
    )
    axes = tuple(_check_axis(trap, axis) for axis in _axes_of(scheme.beams))
    return TrapCheck(axes, all(a.traps for a in axes), all(a.cools for a in axes), _omissions(scheme))


def _axes_of(beams: tuple[Beam, ...]) -> list[Array]:
    """List the axes with beams, opposite directions as one."""
    found: list[Array] = []
    for beam in beams:
        if not any(abs(abs(float(beam.direction @ axis)) - 1.0) < 1e-3 for axis in found):
            found.append(beam.direction)
    return found


@dataclass(frozen=True, slots=True)
class _Scales:
    """Natural width and MHz per m/s of Doppler shift of the first beam's line; all beams' pushes added up in size."""

    width_mhz: float
    wave_mhz: float
    pushes_m_per_s2: float


@dataclass(frozen=True, slots=True, eq=False)
class _Trap:
    scheme: Scheme
    gradient: float
    coil_axis: Array
    ideal_repump: bool
    scales: _Scales

    def push(self, field: Array, velocity: Array, axis: Array) -> float:
        moved = replace(self.scheme, field_gauss=self.scheme.field_gauss + field)
        return float(acceleration(moved, velocity, ideal_repump=self.ideal_repump) @ axis)


def _scales(scheme: Scheme, ideal_repump: bool) -> _Scales:
    line = scheme.beams[0].line
    width = driven_decay(scheme.atom, line).width_mhz
    field = scheme.field_gauss + 0.5 * SMALL_SHIFT_WIDTHS * width / MU_B_MHZ_PER_GAUSS * scheme.beams[0].direction
    pushes = beam_accelerations(replace(scheme, field_gauss=field), np.zeros(3), ideal_repump)
    return _Scales(width, frequency_mhz_of(line) / C, float(np.linalg.norm(pushes, axis=1).sum()))


def _is_along(beam: Beam, axis: Array) -> bool:
    return abs(abs(float(beam.direction @ axis)) - 1.0) < 1e-3


def _check_axis(trap: _Trap, axis: Array) -> AxisCheck:
    scheme, scales = trap.scheme, trap.scales
    turned = tuple(
        replace(beam, polarisation=beam.polarisation.conj()) if _is_along(beam, axis) else beam for beam in scheme.beams
    )
    spring, damping = _spring(trap, axis), _damping(trap, axis)
    reversed_spring = _spring(replace(trap, scheme=replace(scheme, beams=turned)), axis)
    weak_spring = NOTABLE_SHARE * scales.pushes_m_per_s2 * MU_B_MHZ_PER_GAUSS * abs(trap.gradient) / scales.width_mhz
    return AxisCheck(
        axis,
        float(coil_field(trap.coil_axis, trap.gradient, axis) @ axis),
        {beam.name: helicity_of(beam) for beam in scheme.beams if _is_along(beam, axis)},
        spring,
        damping,
        reversed_spring,
        spring > 1e2 * weak_spring,
        reversed_spring > 1e2 * weak_spring,
        damping > NOTABLE_SHARE * scales.pushes_m_per_s2 * scales.wave_mhz / scales.width_mhz,
    )


def helicity_of(beam: Beam) -> float:
    """Return the mean photon spin along the beam, from -1 to 1."""
    return float((1j * np.cross(beam.polarisation, beam.polarisation.conj()) @ beam.direction).real)


def _spring(trap: _Trap, axis: Array) -> float:
    """Return minus the slope of the acceleration over the position, in 1/s2, by a symmetric difference."""
    step_cm = SMALL_SHIFT_WIDTHS * trap.scales.width_mhz / (MU_B_MHZ_PER_GAUSS * abs(trap.gradient))
    field = coil_field(trap.coil_axis, trap.gradient, step_cm * axis)
    still = np.zeros(3)
    return -(trap.push(field, still, axis) - trap.push(-field, still, axis)) / (2e-2 * step_cm)


def _damping(trap: _Trap, axis: Array) -> float:
    """Return minus the slope of the acceleration over the velocity, in 1/s.

    A field of a twentieth of a natural width along the axis defines the sublevels.
    """
    width = trap.scales.width_mhz
    velocity = SMALL_SHIFT_WIDTHS * width / trap.scales.wave_mhz * axis
    field = 0.5 * SMALL_SHIFT_WIDTHS * width / MU_B_MHZ_PER_GAUSS * axis
    change = trap.push(field, velocity, axis) - trap.push(field, -velocity, axis)
    return -change / (2 * float(np.linalg.norm(velocity)))


def _omissions(scheme: Scheme) -> tuple[str, ...]:
    """Name resonant components F' <= F, where the model is weakest."""
    drive = drive_of(scheme)
    structure = drive.structure
    type_two = set()
    for item in drive.couplings:
        near = (np.abs(item.detuning_mhz) < 5 * item.width_mhz) & (item.rabi_mhz != 0)
        up, low = np.nonzero(near)
        F, F_up = structure.twice_F[item.lower][low], structure.twice_F[item.upper][up]
        type_two |= {item.beam.name for a, b in zip(F, F_up, strict=True) if b <= a}
    if not type_two:
        return ()
    return (
        f"beams {', '.join(sorted(type_two))} drive F' <= F: dark superpositions, which these rate equations leave out,"
        " weaken the force, and red detuning heats below the Doppler limit while blue detuning cools",
    )
