"""Lasers on hyperfine levels: how fast each one excites, averaged over sublevels and polarisations.

The rate from F to F' is W = (Gamma/2) s (2J'+1)/(3(2J+1)) S(F,F') / (1 + 4 D^2/Gamma^2) with s = I/I_sat, S the share
of F' in the absorption from F and D the laser less the component; stimulated emission brings back W (2F+1)/(2F'+1). In
a field the same sums run over all Zeeman components with their own detunings. Neglected: coherences and the uneven
filling of sublevels, which a pumping calculation has (`rates`, `bloch`); other lines that the laser drives far off
resonance.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from levels.components import components
from levels.constants import C, H
from levels.decaygraph import Graph, State, hyperfine_shares, momenta
from levels.decays import frequency_mhz_of
from levels.errors import NotPublished, OutsideValidity, UnknownName
from levels.manifold import manifold
from levels.notation import format_half
from levels.records import Line

Array = NDArray[np.float64]
W_PER_M2 = 10.0  # 1 mW/cm2
NOMINAL_PER_S = 1e7  # stands for the rate of a level without a known lifetime, where only shares matter


@dataclass(frozen=True, slots=True)
class Laser:
    """One laser: its line, the hyperfine component it is tuned to (None: all of them), detuning and I/I_sat."""

    line: Line
    component: tuple[int, int] | None = None
    detuning_mhz: float = 0.0
    saturation: float = 1.0

    @property
    def name(self) -> str:
        """The laser as it is asked for: `780:2-3`."""
        if self.component is None:
            return self.line.name
        return f"{self.line.name}:{format_half(self.component[0])}-{format_half(self.component[1])}"


def make_laser(
    line: Line, component: tuple[int, int] | None = None, detuning_mhz: float = 0.0, saturation: float = 1.0
) -> Laser:
    """Check a laser's numbers and its component."""
    if line.photons != 1:
        raise OutsideValidity("drive", line.name, "a one-photon line")
    if not 0 < saturation <= 1e9:
        raise OutsideValidity("saturation", saturation, "above 0 and at most 1e9")
    if not abs(detuning_mhz) <= 1e7:
        raise OutsideValidity("detuning", detuning_mhz, "from -1e7 to 1e7 MHz")
    if component is not None:
        allowed = [
            f"{format_half(F)}-{format_half(F_up)}"
            for F in momenta(line.lower)
            for F_up in momenta(line.upper)
            if abs(F - F_up) <= 2 * line.rank <= F + F_up
        ]
        given = f"{format_half(component[0])}-{format_half(component[1])}"
        if given not in allowed:
            raise UnknownName("component", given, allowed[:8], f"F-F' of {line.atom} {line.name}")
    return Laser(line, component, detuning_mhz, saturation)


def saturation_of_intensity(graph: Graph, line: Line, intensity_mw_per_cm2: float) -> float:
    """Return s = I/I_sat with I_sat = pi h c Gamma^2/(3 lambda^3 A), A being the line's part of the rate Gamma."""
    branching = graph.branchings[line.upper.name]
    share = next((channel.share for channel in branching.channels if channel.line.name == line.name), 0.0)
    if branching.total_per_s is None or share <= 0:
        hint = "give the saturation instead, or supply it by a lab overlay"
        raise NotPublished("Einstein A (or lifetime and branching)", f"{line.atom} {line.name}", hint)
    wavelength_m = C / (frequency_mhz_of(line) * 1e6)
    saturating = np.pi * H * C * branching.total_per_s / (3 * wavelength_m**3 * share)
    return float(intensity_mw_per_cm2 * W_PER_M2 / saturating)


def excitation(graph: Graph, laser: Laser, field_gauss: float = 0.0) -> Array:
    """Compute the rates in s-1 from each lower state (rows) to each upper state (columns) of the laser's line."""
    line = laser.line
    total = graph.branchings[line.upper.name].total_per_s
    if total is None and graph.resolved and laser.component is not None:
        raise NotPublished("lifetime", f"{line.atom} {line.upper.name}", "off-resonant excitation needs it")
    gamma = NOMINAL_PER_S if total is None else total
    peak = gamma / 2 * laser.saturation * (line.upper.twice_J + 1) / (3 * (line.lower.twice_J + 1))
    width_mhz = gamma / (2e6 * np.pi)
    if not graph.resolved:
        return np.full((1, 1), peak / (1 + 4 * (laser.detuning_mhz / width_mhz) ** 2))
    if laser.component is None:
        shares = hyperfine_shares(line.lower.twice_J, line.upper.twice_J, line.lower.twice_I, line.rank)
        return np.asarray(peak * shares)
    if field_gauss:
        return peak * _in_field(laser, field_gauss, width_mhz)
    return peak * _at_zero_field(laser, width_mhz)


def _at_zero_field(laser: Laser, width_mhz: float) -> Array:
    line = laser.line
    shares = hyperfine_shares(line.lower.twice_J, line.upper.twice_J, line.lower.twice_I, line.rank)
    at = manifold(line.upper).energy_mhz[None, :] - manifold(line.lower).energy_mhz[:, None]
    result: Array = shares / (1 + 4 * ((_frequency_mhz(laser) - at) / width_mhz) ** 2)
    return result


def _frequency_mhz(laser: Laser) -> float:
    """Return the laser's offset from the line's centroid: its zero-field component plus the detuning."""
    line, component = laser.line, laser.component
    if component is None:
        return laser.detuning_mhz
    low, up = manifold(line.lower), manifold(line.upper)
    at = up.energy_mhz[up.index_of((component[1], None))] - low.energy_mhz[low.index_of((component[0], None))]
    return float(at + laser.detuning_mhz)


def _in_field(laser: Laser, field_gauss: float, width_mhz: float) -> Array:
    line = laser.line
    found = components(line, field_gauss)
    detuning = _frequency_mhz(laser) - found.offset_mhz[0]
    strength = found.strength[0] * (line.lower.twice_J + 1) / (line.upper.twice_J + 1)
    lows, ups = momenta(line.lower), momenta(line.upper)
    table = np.zeros((len(lows), len(ups)))
    ends = ((found.lower_twice_F - lows[0]) // 2, (found.upper_twice_F - ups[0]) // 2)
    np.add.at(table, ends, strength / (1 + 4 * (detuning / width_mhz) ** 2) / (found.lower_twice_F + 1))
    return table


def resonant_states(graph: Graph, laser: Laser) -> list[State]:
    """List the lower states that a laser is meant to excite."""
    span = graph.spans[laser.line.lower.name]
    states = [graph.states[k] for k in span]
    if laser.component is None or not graph.resolved:
        return states
    return [state for state in states if state.twice_F == laser.component[0]]
