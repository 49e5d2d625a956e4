"""Where light takes the atoms: steady state, evolution and optical pumping of a scheme, by the better model.

Optical Bloch equations are used wherever one rotating frame holds all lasers and the coherences are not too many; rate
equations otherwise, with the reason. The outcome says which, and warns where the two would differ.
"""

from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np
from numpy.typing import ArrayLike, NDArray

from levels.beams import Scheme
from levels.bloch import Bloch, bloch_of, generator, index_table, reachable, to_real
from levels.constants import KB, C, H, U
from levels.darkstates import lower_manifolds
from levels.decays import frequency_mhz_of
from levels.driven import PER_US, Drive, drive_of
from levels.errors import OutsideValidity
from levels.evolution import Evolution, evolve_bloch, evolve_rates, slowest_us
from levels.frames import Frame, frame_of
from levels.quantity import in_unit
from levels.rates import Rates, closed_rates, rates_of, steady_populations
from levels.records import Level
from levels.steady import closed, steady_state
from levels.structure import Label, Structure
from levels.transients import settling, settling_of_rates

Array = NDArray[np.float64]
Complex = NDArray[np.complexfloating]
MODELS = ("auto", "bloch", "rate")
LARGEST_COHERENCES = 9000  # elements of the density matrix that can be non-zero
LARGEST_EIGEN = 700
NOTABLE_DIFFERENCE = 0.1


@dataclass(frozen=True, eq=False)
class Light:
    """A scheme ready to be solved. `model` is "bloch" or "rate", `reason` says why."""

    drive: Drive
    frame: Frame
    model: str
    reason: str

    @property
    def structure(self) -> Structure:
        """The sublevels."""
        return self.drive.structure

    @cached_property
    def bloch(self) -> Bloch:
        """The optical Bloch equations."""
        return bloch_of(self.drive, self.frame)

    @cached_property
    def rates(self) -> Rates:
        """The rate equations."""
        return rates_of(self.drive)


@dataclass(frozen=True, slots=True, eq=False)
class Outcome:
    """The steady state: populations of all sublevels (of the atoms still there), and what they scatter.

    `scattering_per_s` counts spontaneous photons per atom, `by_line` divides them. `rate_scattering_per_s` is what
    rate equations give where `model` is "bloch". `rho` is the density matrix in the rotating frame.
    """

    light: Light
    populations: Array
    rho: Complex | None
    unique: bool
    scattering_per_s: float
    by_line: dict[str, float]
    lost_per_s: float
    rate_scattering_per_s: float | None
    warnings: tuple[str, ...]


@dataclass(frozen=True, slots=True, eq=False)
class Pumping:
    """Optical pumping into one sublevel. Times in us; photons are those that the approach costs, per atom.

    `mean_time_us` is the integral of the missing population over its start, `slowest_us` the longest time constant.
    `recoil_energies` counts one recoil energy for each absorption (from balanced beams) and one for each emission;
    `heating_uk` is two thirds of that energy over kB. Photons that the final state still scatters come on top.
    """

    outcome: Outcome
    target: int
    purity: float
    mean_time_us: float | None
    slowest_us: float | None
    photons: float
    recoil_energies: float
    heating_uk: float | None


def prepare(scheme: Scheme, model: str = "auto", structure: Structure | None = None) -> Light:
    """Choose the model for a scheme; asking for "bloch" where it is impossible is refused with the reason."""
    if model not in MODELS:
        raise OutsideValidity("model", model, f"one of {', '.join(MODELS)}")
    drive = drive_of(scheme, structure)
    frame = frame_of(drive)
    if model == "rate":
        return Light(drive, frame, "rate", "asked for")
    obstacle = frame.reason
    light = Light(drive, frame, "bloch", "all lasers stand still in one rotating frame")
    if not obstacle:
        elements = int(np.count_nonzero(reachable(light.bloch)))
        if elements <= LARGEST_COHERENCES:
            return light
        obstacle = f"{elements} elements of the density matrix can be non-zero, more than {LARGEST_COHERENCES}"
    if model == "bloch":
        raise OutsideValidity("model", model, f"rate equations here: {obstacle}")
    return Light(drive, frame, "rate", obstacle)


def populations_in(structure: Structure, level: Level | None = None, label: Label | None = None) -> Array:
    """Make start populations: one sublevel, all of a level equally, or all of the lowest level equally."""
    populations = np.zeros(structure.size)
    if level is not None and label is not None:
        populations[structure.position(level, label)] = 1.0
        return populations
    part = structure.slices[0] if level is None else structure.slice_of(level)
    populations[part] = 1.0 / (part.stop - part.start)
    return populations


def as_populations(structure: Structure, initial: ArrayLike | None) -> Array:
    """Check start populations: one number per sublevel, none negative, sum 1; all in the lowest level by default."""
    if initial is None:
        return populations_in(structure)
    populations = np.asarray(initial, dtype=np.float64)
    good = populations.shape == (structure.size,) and bool(np.all(np.isfinite(populations)))
    if not good or populations.min() < 0.0 or abs(populations.sum() - 1.0) > 1e-6:
        allowed = f"{structure.size} numbers from 0 that add up to 1"
        raise OutsideValidity("populations", f"{populations.size} values", allowed)
    return populations


def solve(light: Light, initial: ArrayLike | None = None) -> Outcome:
    """Solve the steady state of a prepared scheme; `initial` decides only where there are several."""
    structure = light.structure
    start = as_populations(structure, initial)
    rho: Complex | None = None
    by_rates, unique = steady_populations(light.rates, start)
    populations = by_rates
    if light.model == "bloch":
        try:
            state = steady_state(light.bloch, start)
            rho, unique, populations = state.rho, state.unique, state.populations
        except OutsideValidity as limit:
            light = replace(light, model="rate", reason=str(limit))
    populations = np.maximum(populations, 0.0) / np.maximum(populations, 0.0).sum()  # rounding may leave -1e-17
    by_line = _photons_by_line(structure, populations * 1e6)
    total = float(sum(by_line.values()))
    from_rates = float(sum(_photons_by_line(structure, by_rates * 1e6).values())) if rho is not None else None
    lost = float(structure.lost_per_s @ populations)
    warnings = (*structure.notes, *light.frame.notes, *_cautions(light, unique, total, from_rates, lost))
    return Outcome(light, populations, rho, unique, total, by_line, lost, from_rates, tuple(dict.fromkeys(warnings)))


def _photons_by_line(structure: Structure, residence_us: Array) -> dict[str, float]:
    """Count spontaneous photons of each line while sublevels are held for these times (leaks count as no line)."""
    photons = {}
    for line in structure.lines:
        rate = structure.decays[structure.index_of(line.upper)].rate_of(line)
        photons[line.name] = float(residence_us[structure.slice_of(line.upper)].sum() * rate * 1e-6)
    return photons


def _cautions(
    light: Light, unique: bool, total_per_s: float, rates_per_s: float | None, lost_per_s: float
) -> tuple[str, ...]:
    found = []
    if not unique:
        found.append("the steady state depends on where the atoms start: manifolds that never exchange atoms exist")
    if lost_per_s > 0.0:
        found.append(f"atoms are lost at {lost_per_s:.3g} per second; the state is that of the atoms still there")
    if rates_per_s is not None and differ(rates_per_s, total_per_s):
        found.append(
            f"rate equations would mislead: they give {rates_per_s:.3g} photons per second instead of {total_per_s:.3g}"
        )
    if light.model == "rate":
        found += _what_rates_omit(light)
    return tuple(found)


def differ(one_per_s: float, other_per_s: float) -> bool:
    """Tell whether two scattering rates differ notably, and by more than a photon per second."""
    larger = max(one_per_s, other_per_s)
    return abs(one_per_s - other_per_s) > NOTABLE_DIFFERENCE * larger and larger > 1.0


def _what_rates_omit(light: Light) -> list[str]:
    """Name the dark superpositions that rate equations cannot see, with the two rates that decide about them."""
    omitted = []
    for manifold in lower_manifolds(light.drive):
        mixed = [state for state in manifold.dark if np.count_nonzero(np.abs(state.vector) > 1e-6) > 1]
        if mixed and mixed[0].mixing_mhz < 3 * manifold.pump_per_us / PER_US:
            omitted.append(
                f"rate equations leave out dark superpositions of {manifold.text()}, which the field turns at only"
                f" {mixed[0].mixing_mhz:.3g} MHz while light excites at up to {manifold.pump_per_us / PER_US:.3g} MHz"
            )
    return omitted


def evolve(light: Light, times_us: ArrayLike, initial: ArrayLike | None = None) -> Evolution:
    """Follow the populations in time, leaks included."""
    start = as_populations(light.structure, initial)
    if light.model == "bloch":
        return evolve_bloch(light.bloch, start, times_us)
    return evolve_rates(light.rates, start, times_us)


def best_target(outcome: Outcome) -> int:
    """Return the position of the sublevel that ends with most atoms: the best target of these beams."""
    return int(np.argmax(outcome.populations))


def pump(light: Light, target: int | None = None, initial: ArrayLike | None = None) -> Pumping:
    """Work out optical pumping into a sublevel (the fullest one by default): purity, time, photons, heating."""
    structure = light.structure
    start = as_populations(structure, initial)
    outcome = solve(light, start)
    at = best_target(outcome) if target is None else target
    if outcome.rho is not None:
        integral = settling(light.bloch, start, outcome.rho)
    else:
        integral = settling_of_rates(light.rates, start, outcome.populations)
    gained = float(outcome.populations[at] - start[at])
    mean = -float(integral[at]) / gained if abs(gained) > 1e-9 else None
    photons = _photons_by_line(structure, integral)
    recoils, heating = _heating(structure, photons)
    purity = float(outcome.populations[at])
    return Pumping(
        outcome, at, purity, mean, _slowest(outcome.light, start), float(sum(photons.values())), recoils, heating
    )


def _heating(structure: Structure, photons: dict[str, float]) -> tuple[float, float | None]:
    """Return energy in recoil energies of each photon's own line (two per photon) and as a temperature in uK."""
    mass = structure.atom.isotope.mass
    recoils = 2.0 * sum(photons.values())
    if mass is None:
        return recoils, None
    kilograms = in_unit(mass, "u").value * U
    energy = 0.0
    for line in structure.lines:
        momentum = H * frequency_mhz_of(line) * 1e6 / C
        energy += 2.0 * photons[line.name] * momentum**2 / (2 * kilograms)
    return recoils, 2.0 / 3.0 * energy / KB * 1e6


def _slowest(light: Light, start: Array) -> float | None:
    """Return the slowest time constant with leaks closed, or None where there are too many equations."""
    if light.model == "rate":
        return slowest_us(closed_rates(light.rates).matrix, start, np.arange(start.size))
    bloch = closed(light.bloch)
    table = index_table(reachable(bloch, start > 0))
    if int(table.max()) >= LARGEST_EIGEN:
        return None
    diagonal = np.diag(table)
    matrix = generator(bloch, table).toarray()
    return slowest_us(matrix, to_real(np.diag(start + 0j), table), diagonal[diagonal >= 0])
