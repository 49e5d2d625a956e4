"""Writes leaks, repumpers and sets of them as the records of an answer."""

from collections.abc import Iterable, Sequence
from typing import Any

from levels.decaygraph import Graph
from levels.lasers import Laser
from levels.leaks import CLOSED, Leaks, Reached, metastable_elsewhere
from levels.notation import format_half
from levels.records import Level
from levels.repump import Scheme, Search
from levels.repumpers import Repumper
from levels.repumpfacts import Facts
from service.answers import scalar

MOST_SETS = 24
BOUNDED = "unknown branching: see photons_at_most and unpublished"
NO_SPREAD = "a share that matters states no uncertainty, or only off-resonant excitation matters"
NOT_COMPUTED = "uncertainty not computed"
UNSTATED = "an input states no uncertainty"
NO_POWER = "lifetime or branching is not in the catalogue"


def content_of(graph: Graph, lasers: Sequence[Laser], found: Search, repumpers: Sequence[Any]) -> dict[str, Any]:
    """Everything that the answer says of the present drives and of what may be added to them."""
    leaks = found.leaks
    return {
        "atom": graph.atom.isotope.name,
        "resolution": "hyperfine" if graph.resolved else "level",
        "drives": [_drive(laser) for laser in lasers],
        **_numbers_of_leaks(leaks),
        "closure": leaks.closure,
        "unpublished": list(leaks.unknown),
        "leaks": [_leak(item) for item in leaks.reached],
        "repumpers": list(repumpers),
        "schemes": [_scheme(one, k + 1) for k, one in enumerate(found.sets[:MOST_SETS])],
        "elsewhere": [_elsewhere(graph, level) for level in metastable_elsewhere(leaks)],
        "search": [*found.bounds, *_cut(found)],
    }


def _cut(found: Search) -> list[str]:
    hidden = len(found.sets) - MOST_SETS
    return [f"{hidden} more sets were tried and rank below"] if hidden > 0 else []


def _photons(value: float | None, uncertainty: float | None = None, reason: str = "") -> dict[str, Any]:
    return scalar(value, uncertainty, "1", CLOSED if value is None else reason)


def _numbers_of_leaks(leaks: Leaks) -> dict[str, Any]:
    reason = "" if leaks.uncertainty is not None else BOUNDED if leaks.photons != leaks.most else NO_SPREAD
    loss = 0.0 if leaks.photons is None else 1.0 / leaks.photons
    spread = None
    if leaks.photons is not None and leaks.uncertainty is not None:
        spread = leaks.uncertainty / leaks.photons**2
    return {
        "photons_before_loss": _photons(leaks.photons, leaks.uncertainty, reason),
        "photons_at_most": _photons(leaks.most, None, "an upper bound"),
        "loss_per_photon": scalar(loss, spread, "1", "" if spread is not None else reason or CLOSED),
        "emitted_per_photon": scalar(leaks.emitted, None, "1", NOT_COMPUTED),
        "time_before_loss": scalar(leaks.seconds, None, "s", leaks.reason or NOT_COMPUTED),
    }


def _drive(laser: Laser) -> dict[str, Any]:
    return {
        "drive": laser.name,
        "lower_level": laser.line.lower.name,
        "upper_level": laser.line.upper.name,
        "detuning_MHz": laser.detuning_mhz,
        "saturation": laser.saturation,
    }


def _leak(item: Reached) -> dict[str, Any]:
    twice_F = item.state.twice_F
    known = item.lifetime_s is not None
    return {
        "level": item.state.level.name,
        "F": None if twice_F is None else twice_F / 2,
        "per_photon": scalar(item.at_least, None, "1", NOT_COMPUTED),
        "per_photon_at_most": scalar(item.at_most, None, "1", "an upper bound"),
        "cause": item.cause,
        "through": list(item.through),
        "fate": item.fate,
        "returns": scalar(item.returns, None, "1", NOT_COMPUTED),
        "lifetime": scalar(item.lifetime_s, None, "s", "see the level" if known else "not in the catalogue"),
    }


def _component_names(components: Iterable[tuple[int, int] | None]) -> list[str]:
    return [f"{format_half(part[0])}-{format_half(part[1])}" for part in components if part is not None]


def repumper_record(graph: Graph, found: Search, k: int, facts: Facts) -> dict[str, Any]:
    scheme = found.singles[k]
    """One repumper with its numbers."""
    one, line = scheme.repumpers[0], scheme.repumpers[0].line
    main = facts.settings[0]
    frequency = None if main.frequency_mhz is None else main.frequency_mhz * 1e-6
    spread = None if main.frequency_uncertainty_mhz is None else main.frequency_uncertainty_mhz * 1e-6
    vacuum, relative = facts.vacuum_nm, (None if not spread or not frequency else spread / frequency)
    unstated = facts.missing or ("" if spread is not None else UNSTATED)
    outside = "the dispersion of air is known from 230 to 1700 nm" if vacuum is not None else facts.missing
    air = facts.air_nm
    return {
        "rank": k + 1,
        "line": line.name,
        "empties": line.lower.name,
        "upper_level": line.upper.name,
        "multipole": line.multipole,
        "components": _component_names(part.component for part in facts.settings),
        "frequency": scalar(frequency, spread, "THz", unstated),
        "vacuum_wavelength": scalar(vacuum, _times(vacuum, relative), "nm", unstated),
        "air_wavelength": scalar(air, _times(air, relative), "nm", unstated if air is not None else outside),
        "offset": scalar(
            main.offset_mhz,
            main.offset_uncertainty_mhz,
            "MHz",
            facts.missing or ("" if main.offset_uncertainty_mhz is not None else UNSTATED),
        ),
        "sidebands_MHz": [part.sideband_mhz for part in facts.settings],
        "reach": facts.reach,
        **_photons_of(scheme),
        "photons_per_leak": scalar(scheme.per_leak, None, "1", NOT_COMPUTED),
        "relative_power": scalar(
            facts.relative_power,
            None,
            "1",
            "a planning figure"
            if facts.relative_power is not None
            else "lifetime or branching is not in the catalogue",
        ),
        "field_spread": scalar(facts.zeeman_spread_mhz, None, "MHz", "a spread, at the field asked for"),
        "opens": list(scheme.opens),
        "shares_upper_level": any(laser.line.upper.name == line.upper.name for laser in found.leaks.walk.lasers),
        "closure": graph.branchings[line.upper.name].closure,
        "notes": [*facts.notes, *_unknown(graph, one)],
    }


def _times(value: float | None, relative: float | None) -> float | None:
    return None if value is None or relative is None else value * relative


def _photons_of(scheme: Scheme) -> dict[str, Any]:
    return {
        "photons_before_loss": _photons(scheme.photons, None, NOT_COMPUTED),
        "photons_at_most": _photons(scheme.most, None, "an upper bound"),
        "closes": scheme.is_closed,
        "repump_photons": scalar(scheme.per_photon, None, "1", NOT_COMPUTED),
    }


def _unknown(graph: Graph, one: Repumper) -> list[str]:
    branching = graph.branchings[one.line.upper.name]
    if not branching.possible:
        return [branching.note] if branching.note else []
    names = ", ".join(level.name for level in branching.possible)
    return [f"{branching.level.name}: {branching.note}; its decays may go to {names}"]


def _scheme(one: Scheme, rank: int) -> dict[str, Any]:
    return {
        "rank": rank,
        "lasers": [_laser_name(part) for part in one.repumpers],
        **_photons_of(one),
        "opens": list(one.opens),
    }


def _laser_name(one: Repumper) -> str:
    names = _component_names(one.components)
    return f"{one.line.name}:{'+'.join(names)}" if names else one.line.name


def _elsewhere(graph: Graph, level: Level) -> dict[str, Any]:
    rate = graph.branchings[level.name].total_per_s
    return {
        "level": level.name,
        "lifetime": scalar(
            1.0 / rate if rate else None, None, "s", "see the level" if rate else "not in the catalogue"
        ),
        "lines": [
            f"{line.name} to {line.upper.name}"
            for line in graph.atom.lines
            if line.lower.name == level.name and line.photons == 1
        ],
    }
