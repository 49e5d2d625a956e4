"""How many photons an atom scatters before it leaves the cycle, and where it goes.

The cycle is everything but the exits: lower hyperfine levels that no beam addresses within some natural widths, levels
that only decays reach, and decays to levels that the catalogue does not hold. Off-resonant hyperfine components,
polarisation impurity (as given by the beams) and branching are all in. The expected number is exact for the model: the
scattering integrated until the atom is gone (`transients.residence`).
"""

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import ArrayLike, NDArray

from levels.beams import Scheme, with_beam
from levels.bloch import Bloch, Jump
from levels.driven import Drive
from levels.errors import OutsideValidity
from levels.notation import format_half
from levels.pumping import Light, prepare
from levels.rates import Rates
from levels.structure import Structure
from levels.transients import residence, residence_of_rates

Array = NDArray[np.float64]
ADDRESSED_WIDTHS = 20.0
LARGEST_GRID = 2000


@dataclass(frozen=True, slots=True)
class Exit:
    """One way out of the cycle and its share of the losses."""

    name: str
    share: float


@dataclass(frozen=True, slots=True, eq=False)
class Cycling:
    """Photons before an atom leaves. `photons` is None when nothing leaves; `reason` then says why.

    `time_us` is the mean time until it leaves, `per_photon` the chance of leaving per photon.
    """

    model: str
    photons: float | None
    time_us: float | None
    exits: tuple[Exit, ...]
    reason: str

    @property
    def per_photon(self) -> float | None:
        """The mean loss probability per scattered photon."""
        return None if not self.photons else 1.0 / self.photons


def exits_of(drive: Drive, linewidths: float = ADDRESSED_WIDTHS) -> NDArray[np.bool_]:
    """Mark the sublevels outside the cycle: lower hyperfine levels that no beam addresses, and undriven levels."""
    structure = drive.structure
    inside = np.zeros(structure.size, dtype=np.bool_)
    for item in drive.couplings:
        inside[item.upper] = True
        near = (np.abs(item.detuning_mhz) <= linewidths * item.width_mhz) & (item.rabi_mhz != 0)
        held = structure.twice_F[item.lower]
        inside[item.lower] |= np.isin(held, held[near.any(axis=0)])
    return ~inside


def photons_before_leaving(
    scheme: Scheme, *, model: str = "auto", start: ArrayLike | None = None, linewidths: float = ADDRESSED_WIDTHS
) -> Cycling:
    """Count the photons an atom scatters before it leaves the cycle.

    `start` gives populations of all sublevels; by default all lower sublevels of the cycle equally. Spontaneous photons
    of every line inside the cycle count, the last one included.
    """
    light = prepare(scheme, model)
    out = exits_of(light.drive, linewidths)
    keep = np.flatnonzero(~out)
    begin = _start(light.drive, out, start)[keep]
    structure = light.structure
    leaving = _leaving(structure, keep, np.flatnonzero(out))
    if not any(rate.any() for rate in leaving.values()):
        return Cycling(light.model, None, None, (), "closed: no decay leads out of the levels that the beams address")
    held = _held(light, keep, begin)
    if held is None:
        return Cycling(light.model, None, None, (), "some atoms go dark in the cycle and neither scatter nor leave")
    total = np.array([decay.total_per_s * 1e-6 for decay in structure.decays])[structure.level_index[keep]]
    amounts = {name: float(rate @ held) for name, rate in leaving.items() if rate.any()}
    whole = sum(amounts.values())
    exits = tuple(Exit(name, part / whole) for name, part in sorted(amounts.items(), key=lambda item: -item[1]))
    return Cycling(light.model, float(total @ held), float(held.sum()), exits, "")


def _start(drive: Drive, out: NDArray[np.bool_], start: ArrayLike | None) -> Array:
    structure = drive.structure
    if start is not None:
        populations = np.asarray(start, dtype=np.float64)
        if populations.shape != (structure.size,) or abs(populations[~out].sum() - 1.0) > 1e-6:
            raise OutsideValidity(
                "populations", f"{populations.size} values", "one per sublevel, all in the cycle, sum 1"
            )
        return populations
    lower = np.zeros(structure.size, dtype=np.bool_)
    for item in drive.couplings:
        lower[item.lower] = True
    inside = lower & ~out & (structure.width_mhz < 1e-3)
    if not inside.any():
        raise OutsideValidity("beams", "no resonance", "a beam within reach of a component; set its frequency nearer")
    populations = inside.astype(np.float64)
    return populations / float(populations.sum())


def _held(light: Light, keep: NDArray[np.int64], begin: Array) -> Array | None:
    if light.model == "bloch":
        return residence(restricted(light.bloch, keep), begin)
    matrix = light.rates.matrix[np.ix_(keep, keep)]
    inside = Rates(matrix, light.rates.emission[np.ix_(keep, keep)], -matrix.sum(axis=0))
    return residence_of_rates(inside, begin)


def restricted(bloch: Bloch, keep: NDArray[np.int64]) -> Bloch:
    """Return the equations of some sublevels; what goes to others is lost, light to others is left out."""
    place = np.full(bloch.size, -1, dtype=np.int64)
    place[keep] = np.arange(keep.size)
    jumps = []
    arriving = np.zeros(bloch.size)
    for jump in bloch.jumps:
        inside = (place[jump.end] >= 0) & (place[jump.start] >= 0)
        jumps.append(Jump(place[jump.end[inside]], place[jump.start[inside]], jump.amplitude[inside]))
        np.add.at(arriving, jump.start[inside], jump.amplitude[inside] ** 2)
    end, start, rate = bloch.hops
    inside = (place[end] >= 0) & (place[start] >= 0)
    np.add.at(arriving, start[inside], rate[inside])
    return replace(
        bloch,
        energy=bloch.energy[keep],
        coupling=bloch.coupling[np.ix_(keep, keep)],
        decay=bloch.decay[keep],
        coherence_decay=bloch.coherence_decay[np.ix_(keep, keep)],
        jumps=tuple(jump for jump in jumps if jump.end.size),
        hops=(place[end[inside]], place[start[inside]], rate[inside]),
        lost=np.maximum(bloch.decay - arriving, 0.0)[keep],
        group=bloch.group[keep],
    )


def _leaving(structure: Structure, keep: NDArray[np.int64], out: NDArray[np.int64]) -> dict[str, Array]:
    """Return, per way out, the rate per us at which each kept sublevel decays there."""
    rates: dict[str, Array] = {}
    for line in structure.lines:
        lower, upper = structure.slice_of(line.lower), structure.slice_of(line.upper)
        whole = np.zeros((structure.size, structure.size))
        rate = structure.decays[structure.index_of(line.upper)].rate_of(line) * 1e-6
        whole[lower, upper] = rate * structure.amplitudes[line.name].T ** 2
        held = structure.twice_F
        for F in np.unique(held[lower]):
            ends = out[(out >= lower.start) & (out < lower.stop) & (held[out] == F)]
            if ends.size:
                kind = "F" if line.lower.twice_I else "J"
                name = f"{line.lower.name} {kind}={format_half(int(F))}"
                rates[name] = rates.get(name, np.zeros(keep.size)) + whole[np.ix_(ends, keep)].sum(axis=0)
    if structure.lost_per_s.any():
        rates["levels outside the catalogue"] = structure.lost_per_s[keep] * 1e-6
    return rates


def against_detuning(scheme: Scheme, beam_name: str, offsets_mhz: Sequence[float]) -> list[Cycling]:
    """Count photons before leaving over the offset of one beam."""
    if not 1 <= len(offsets_mhz) <= LARGEST_GRID:
        raise OutsideValidity("grid", len(offsets_mhz), f"from 1 to {LARGEST_GRID} points")
    return [photons_before_leaving(with_beam(scheme, beam_name, offset_mhz=float(x))) for x in offsets_mhz]
