"""What to know of a repumper before building it: frequency, offset from the driven laser, reach, power, dark states.

`REACH` says which modulator makes an offset from the driven laser: common practice, not a law. The relative power is
that which saturates the repumping line over that which saturates the cooling line in the same beam, I_sat being pi h c
Gamma^2/(3 lambda^3 A). A component F -> F' keeps 2F+1 - (2F'+1) sublevels dark for any one polarisation when F' < F,
and one when F' = F (for linear light only where F is a whole number).
"""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from levels import air
from levels.components import components as zeeman_components
from levels.constants import MHZ_NM
from levels.decaygraph import Graph, momenta
from levels.decays import frequency_mhz_of
from levels.errors import NotPublished
from levels.features import has_own_centroid, natural_width_mhz
from levels.lasers import Laser
from levels.manifold import Manifold, manifold
from levels.notation import format_half
from levels.positions import Place, difference_spread, own_spread, place_between, place_of_centroid
from levels.racah import six_j_square
from levels.records import Line
from levels.repumpers import Component, Repumper

REACH = (("acousto-optic", 1.0e3), ("electro-optic", 2.5e4))  # up to so many MHz
OTHER_LASER = "another laser"


@dataclass(frozen=True, slots=True)
class Setting:
    """One frequency of a repumper, its offset from the driven laser and how far it lies from the first; in MHz.

    None where a constant is not published.
    """

    component: Component | None
    frequency_mhz: float | None
    frequency_uncertainty_mhz: float | None
    offset_mhz: float | None
    offset_uncertainty_mhz: float | None
    sideband_mhz: float | None


@dataclass(frozen=True, slots=True)
class Facts:
    """What a repumper needs; `missing` says what keeps a number away."""

    settings: tuple[Setting, ...]
    vacuum_nm: float | None
    air_nm: float | None
    reach: str
    relative_power: float | None
    zeeman_spread_mhz: float | None
    notes: tuple[str, ...]
    missing: str


def facts_of(
    graph: Graph, repumpers: Sequence[Repumper], lasers: tuple[Laser, ...], field_gauss: float = 0.0
) -> list[Facts]:
    """Collect what to know of each repumper; the first laser is the driven one."""
    solved: dict[str, Manifold] = {}
    return [_facts(graph, one, lasers, field_gauss, solved) for one in repumpers]


def _facts(
    graph: Graph, repumper: Repumper, lasers: tuple[Laser, ...], field_gauss: float, solved: dict[str, Manifold]
) -> Facts:
    line, driven = repumper.line, lasers[0]
    components = components_of(graph, repumper)
    reference, missing = _place(driven.line, driven.component, solved)
    settings: list[Setting] = []
    for component in components:
        one, why = _place(line, component, solved)
        missing = missing or why
        settings.append(_setting(component, one, reference, driven.detuning_mhz, settings))
    main = settings[0]
    vacuum = None if main.frequency_mhz is None else MHZ_NM / main.frequency_mhz
    in_air = vacuum is not None and air.SHORTEST_NM <= vacuum <= air.LONGEST_NM
    return Facts(
        tuple(settings),
        vacuum,
        air.air_of_vacuum(vacuum) if vacuum is not None and in_air else None,
        reach_of(main.offset_mhz, line.name == driven.line.name),
        _relative_power(graph, line, driven.line),
        _zeeman_spread(line, components[0], field_gauss),
        tuple(_notes(graph, repumper, components, lasers, field_gauss)),
        missing,
    )


def components_of(graph: Graph, repumper: Repumper) -> tuple[Component | None, ...]:
    """List the components a repumper drives; between whole levels the strongest from each F that they have."""
    line = repumper.line
    if graph.resolved:
        return repumper.components
    if line.lower.twice_I == 0:
        return (None,)
    return tuple((F, strongest_upper(line, F)) for F in momenta(line.lower) if _uppers(line, F))


def _uppers(line: Line, twice_F: int) -> list[int]:
    return [up for up in momenta(line.upper) if abs(up - twice_F) <= 2 * line.rank <= up + twice_F]


def strongest_upper(line: Line, twice_F: int) -> int:
    """Return the F' with the largest share in the absorption from F; the lowest of equals."""
    lower, upper = line.lower, line.upper

    def share(up: int) -> float:
        square = six_j_square(lower.twice_J, upper.twice_J, 2 * line.rank, up, twice_F, lower.twice_I)
        return float((up + 1) * square)

    return max(_uppers(line, twice_F), key=lambda up: (round(share(up), 12), -up))


def _place(line: Line, component: Component | None, solved: dict[str, Manifold]) -> tuple[Place | None, str]:
    try:
        if component is None:
            found = place_of_centroid(line)
        else:
            for level in (line.lower, line.upper):
                if level.name not in solved:
                    solved[level.name] = manifold(level)
            ends = (solved[line.lower.name], solved[line.upper.name])
            found = place_between(line, *ends, [(component[0], None)], [(component[1], None)])
    except NotPublished as error:
        return None, str(error)
    return found, "" if line.centroid is not None else f"the frequency of {line.name} is not in the catalogue"


def _setting(
    component: Component | None, one: Place | None, reference: Place | None, detuning_mhz: float, before: list[Setting]
) -> Setting:
    first = before[0].frequency_mhz if before else None
    if one is None or one.line.centroid is None:
        return Setting(component, None, None, None, None, None)
    same = reference is not None and one.line.name == reference.line.name
    offset = spread = None
    if reference is not None and (same or reference.line.centroid is not None):
        gap = 0.0 if same else one.centroid_mhz - reference.centroid_mhz
        offset = gap + one.offset_mhz - reference.offset_mhz - detuning_mhz
        spread = difference_spread(one, reference)
    sideband = 0.0 if not before else None if first is None else one.frequency_mhz - first
    return Setting(component, one.frequency_mhz, own_spread(one), offset, spread, sideband)


def reach_of(offset_mhz: float | None, same_line: bool) -> str:
    """Say what makes light at an offset from the driven laser."""
    if offset_mhz is None:
        return "electro-optic" if same_line else OTHER_LASER
    return next((name for name, reach in REACH if abs(offset_mhz) <= reach), OTHER_LASER)


def _relative_power(graph: Graph, line: Line, driven: Line) -> float | None:
    """Return I_sat of a line over that of the driven line; None without lifetimes and branching."""
    pair = [_saturation(graph, one) for one in (line, driven)]
    return None if pair[0] is None or pair[1] is None else pair[0] / pair[1]


def _saturation(graph: Graph, line: Line) -> float | None:
    """Return Gamma/(lambda^3 share), which the saturation intensity is proportional to."""
    branching = graph.branchings[line.upper.name]
    share = next((c.share for c in branching.channels if c.line.name == line.name), 0.0)
    if branching.total_per_s is None or share <= 0 or branching.unknown[1] > 0.5:
        return None
    return branching.total_per_s / share * frequency_mhz_of(line) ** 3


def _zeeman_spread(line: Line, component: Component | None, field_gauss: float) -> float | None:
    """Return the strength-weighted spread (rms) that a field gives one component; None without a field."""
    if not field_gauss:
        return None
    try:
        found = zeeman_components(line, field_gauss)
    except NotPublished:
        return None
    keep = np.ones(found.q.size, dtype=np.bool_)
    if component is not None:
        keep = (found.lower_twice_F == component[0]) & (found.upper_twice_F == component[1])
    weight, shift = found.strength[0][keep], found.shift_mhz[0][keep]
    if weight.sum() <= 0:
        return None
    mean = float(weight @ shift / weight.sum())
    return float(np.sqrt(max(weight @ (shift - mean) ** 2 / weight.sum(), 0.0)))


def _notes(
    graph: Graph,
    repumper: Repumper,
    components: tuple[Component | None, ...],
    lasers: tuple[Laser, ...],
    field_gauss: float,
) -> list[str]:
    line = repumper.line
    notes = [text for text in (_dark_note(line, component) for component in components) if text]
    if notes:
        turn = "the field turns them only if it is not along the polarisation" if field_gauss else "apply a field"
        notes.append(f"dark states are emptied by turning the polarisation or by Larmor precession: {turn}")
    shared = [laser.name for laser in lasers if laser.line.upper.name == line.upper.name]
    if shared and any(laser.line.lower.name != line.lower.name for laser in lasers if laser.name in shared):
        notes.append(
            f"shares {line.upper.name} with {', '.join(shared)}: coherent dark resonance where both detunings are "
            "equal; detune one against the other"
        )
    if line.centroid is not None and not has_own_centroid(line):
        owner = line.centroid_isotope
        whose = f"mass number {owner}" if owner.isdigit() else "the natural mixture of isotopes"
        notes.append(f"the frequency is that of {whose}: isotope shifts of some GHz are possible")
    if line.multipole != "E1":
        notes.append(f"a {line.multipole} line: weak, it needs intense light")
    width = natural_width_mhz(line)
    if width is None:
        notes.append(f"the lifetime of {line.upper.name} is not in the catalogue: how fast it repumps is not known")
    return notes


def _dark_note(line: Line, component: Component | None) -> str:
    """Say how many sublevels stay dark for any one polarisation."""
    if line.rank != 1:
        return ""
    low, up = (line.lower.twice_J, line.upper.twice_J) if component is None else component
    name = f"{'J' if component is None else 'F'} = {format_half(low)} to {format_half(up)}"
    if up < low:
        return f"{name}: two dark states for any one polarisation"
    if up == low:
        if low == 0:
            return ""
        whole = low % 2 == 0
        return f"{name}: one dark state for {'any one polarisation' if whole else 'pure circular light'}"
    return ""
